//! Rules for the redshifts of bins, and for the background that turned redshifts into distances.

use super::checker::Checker;
use crate::fault::Fault;
use crate::file::{BinSection, FiducialSection, SurveySection};

/// How far the weights of a bin's nodes may be from a sum of 1: what ten weights lose that are rounded to six digits. The
/// prediction would be off by as much, so it is divided out all the same; a larger difference is no rounding.
const WEIGHTS_SUM: f64 = 1e-5;

/// Checks the bins of a survey and its fiducial background.
pub(super) fn check(survey: &SurveySection, checker: &mut Checker<'_>) {
    for bin in &survey.bins {
        check_nodes(&survey.name.value, bin, checker);
    }
    if let Some(fiducial) = &survey.fiducial {
        check_fiducial(survey, fiducial, checker);
    }
}

fn check_nodes(survey: &str, bin: &BinSection, checker: &mut Checker<'_>) {
    let path = format!("{survey}.{}", bin.name.value);
    let nodes = &bin.nodes.value;
    let mut fault = |name: &str, rule, value: f64, way_out| {
        let value = format!("{value:?}");
        let fault = Fault::OutOfRange { name: format!("{path}.{name}"), rule, value, way_out };
        checker.fault(bin.nodes.origin, name, fault);
    };
    if let [(redshift, _)] = nodes[..]
        && redshift <= 0.0
    {
        return fault("redshift", "above 0", redshift, "give the pair-weighted mean redshift of the bin");
    }
    if let Some((redshift, _)) = nodes.iter().find(|(redshift, _)| *redshift <= 0.0) {
        return fault(
            "nodes",
            "of redshifts above 0",
            *redshift,
            "a node is [redshift, weight], in that order",
        );
    }
    if let Some((_, weight)) = nodes.iter().find(|(_, weight)| *weight <= 0.0) {
        return fault("nodes", "of weights above 0", *weight, "leave out a node that counts for nothing");
    }
    let sum: f64 = nodes.iter().map(|(_, weight)| weight).sum();
    if (sum - 1.0).abs() > WEIGHTS_SUM {
        fault("nodes", "of weights that sum to 1", sum, "divide each weight by that sum");
    }
}

fn check_fiducial(survey: &SurveySection, fiducial: &FiducialSection, checker: &mut Checker<'_>) {
    let path = format!("{}.fiducial", survey.name.value);
    let h = fiducial.h.as_ref().filter(|h| !(h.value > 0.0 && h.value < 10.0));
    if let Some(h) = h {
        let (rule, way_out) = ("above 0 and below 10", "it is H0 in 100 km/s/Mpc, as in 0.68");
        let fault =
            Fault::OutOfRange { name: format!("{path}.h"), rule, value: format!("{:?}", h.value), way_out };
        checker.fault(h.origin, "h", fault);
    }
    if fiducial.omega_m.value <= 0.0 {
        let (rule, value) = ("above 0", format!("{:?}", fiducial.omega_m.value));
        let way_out = "give the matter density that turned redshifts into distances, as in 0.30";
        let fault = Fault::OutOfRange { name: format!("{path}.omega_m"), rule, value, way_out };
        return checker.fault(fiducial.omega_m.origin, "omega_m", fault);
    }
    let redshifts = survey.bins.iter().flat_map(|bin| &bin.nodes.value).map(|(redshift, _)| *redshift);
    let distances = |redshift: f64| fiducial.background().and_then(|background| background.epoch(redshift));
    // Redshifts of 0 and below have been complained of.
    if let Some(Err(cause)) = redshifts.filter(|z| *z > 0.0).map(distances).find(Result::is_err) {
        let fault = Fault::Fiducial { survey: survey.name.value.clone(), cause };
        checker.fault(fiducial.origin, "fiducial", fault);
    }
}
