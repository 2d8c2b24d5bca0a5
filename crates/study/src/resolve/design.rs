//! Rules for how a survey is made: `[survey.design]` and `design` of its bins.

use oddwell_likelihood::LengthUnit;

use super::checker::Checker;
use crate::fault::Fault;
use crate::file::{BinDesignSection, BinSection, DesignSection, Located, Origin, SurveySection};

/// The whole sky in square degrees, 4π (180/π)².
const WHOLE_SKY: f64 = 41_252.961_249_419_27;

/// Checks what a survey says of how it is made.
pub(super) fn check(survey: &SurveySection, checker: &mut Checker<'_>) {
    let name = &survey.name.value;
    let Some(design) = &survey.design else {
        if let Some((bin, given)) =
            survey.bins.iter().find_map(|bin| bin.design.as_ref().map(|given| (bin, given)))
        {
            let way_out = "say in which shells the bins are measured, or remove it";
            needs(
                checker,
                given.origin,
                &format!("{name}.{}.design", bin.name.value),
                "[survey.design]",
                way_out,
            );
        }
        return;
    };
    if survey.unit.value == LengthUnit::Megaparsec {
        let (rule, value) = ("\"Mpc/h\" where there is a design", "\"Mpc\"".to_owned());
        let way_out = "give the design in Mpc/h, and remove it";
        let fault = Fault::OutOfRange { name: format!("{name}.unit"), rule, value, way_out };
        checker.fault(survey.unit.origin, "unit", fault);
    }
    if let Some(area) = &design.area {
        let (rule, way_out) = ("above 0 and at most the whole sky, 41253", "give it in square degrees");
        in_range(
            checker,
            area,
            &format!("{name}.design.area"),
            |area| area > 0.0 && area <= WHOLE_SKY,
            rule,
            way_out,
        );
    }
    for bin in &survey.bins {
        match &bin.design {
            Some(given) => check_bin(design, bin, given, &format!("{name}.{}", bin.name.value), checker),
            None => {
                let way_out = "say how much of each bin is seen, as design = { volume = 2.0e9, first_density = 8.0e-4, second_density = 3.0e-3 }";
                needs(
                    checker,
                    bin.name.origin,
                    "[survey.design]",
                    &format!("{name}.{}.design", bin.name.value),
                    way_out,
                );
            }
        }
    }
}

fn check_bin(
    design: &DesignSection,
    bin: &BinSection,
    given: &BinDesignSection,
    path: &str,
    checker: &mut Checker<'_>,
) {
    let above_zero = |value: f64| value > 0.0;
    for (key, density) in [("first_density", &given.first_density), ("second_density", &given.second_density)]
    {
        let way_out = "it is a number density in (h/Mpc)^3, as in 8.0e-4";
        in_range(checker, density, &format!("{path}.design.{key}"), above_zero, "above 0", way_out);
    }
    if let Some(volume) = &given.volume {
        let way_out = "it is a volume in (Mpc/h)^3, as in 2.0e9";
        in_range(checker, volume, &format!("{path}.design.volume"), above_zero, "above 0", way_out);
    }
    let Some(redshifts) = &given.redshifts else { return };
    let name = format!("{path}.design.redshifts");
    if design.area.is_none() {
        let way_out = "say how many square degrees were seen, or give the volume";
        needs(checker, redshifts.origin, &name, "area", way_out);
    }
    let (low, high) = redshifts.value;
    if !(low < high) {
        let way_out = "swap or change them";
        return checker.fault(redshifts.origin, &name.clone(), Fault::Inverted { name, low, high, way_out });
    }
    let mean = bin.redshift();
    if !(low >= 0.0 && low <= mean && mean <= high && high.is_finite()) {
        let (rule, value) =
            ("0 or above, with the bin's redshift between them", format!("[{low:?}, {high:?}]"));
        let way_out = "a bin's redshift is the pair-weighted mean of what lies between its edges";
        checker.fault(redshifts.origin, &name.clone(), Fault::OutOfRange { name, rule, value, way_out });
    }
}

fn needs(checker: &mut Checker<'_>, origin: Origin, key: &str, other: &str, way_out: &'static str) {
    let fault = Fault::NeedsOther { key: key.to_owned(), other: other.to_owned(), way_out };
    checker.fault(origin, key, fault);
}

fn in_range(
    checker: &mut Checker<'_>,
    given: &Located<f64>,
    name: &str,
    holds: impl Fn(f64) -> bool,
    rule: &'static str,
    way_out: &'static str,
) {
    if !holds(given.value) {
        let (owned, value) = (name.to_owned(), format!("{:?}", given.value));
        checker.fault(given.origin, name, Fault::OutOfRange { name: owned, rule, value, way_out });
    }
}
