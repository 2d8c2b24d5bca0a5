//! Rules for held values, and for what must stand beside what.

use super::Entry;
use super::checker::Checker;
use super::design;
use super::redshifts;
use crate::fault::Fault;
use crate::file::{Quantity, StudyFile};
use crate::nearest::Nearest;

/// The range of a quantity: a test, the rule in words, the way out. A held number outside is an error of the study; where
/// a prior reaches outside, there is no prediction.
#[derive(Clone, Copy, Debug)]
pub(crate) struct QuantityRule {
    /// Dotted name.
    pub(crate) name: &'static str,
    pub(crate) holds: fn(f64) -> bool,
    pub(crate) rule: &'static str,
    pub(crate) way_out: &'static str,
}

const fn above_zero(name: &'static str, way_out: &'static str) -> QuantityRule {
    QuantityRule { name, holds: |value| value > 0.0, rule: "above 0", way_out }
}

const fn not_negative(name: &'static str, way_out: &'static str) -> QuantityRule {
    QuantityRule { name, holds: |value| value >= 0.0, rule: "0 or above", way_out }
}

const RULES: [QuantityRule; 7] = [
    above_zero("background.omega_m", "a universe without matter has no structure, as in 0.31"),
    above_zero("background.omega_b", "the transfer function needs baryons, as in 0.049"),
    QuantityRule {
        name: "background.h",
        holds: |value| value > 0.0 && value < 10.0,
        rule: "above 0 and below 10",
        way_out: "it is H0 in 100 km/s/Mpc, as in 0.68",
    },
    above_zero("background.sigma8", "it is the rms of matter in 8 Mpc/h, as in 0.81"),
    not_negative("prediction.damping", "it is a length in Mpc/h, as in 0.5"),
    not_negative("prediction.smearing", "it is a length in Mpc/h, as in 5.0, or 0 for none"),
    above_zero("prediction.clock_distance", "it is a length in Mpc/h, as in 50.0"),
];

/// The rule of a quantity's dotted name; most may be any finite number.
pub(crate) fn rule_of(name: &str) -> Option<QuantityRule> {
    RULES.iter().find(|rule| rule.name == name).copied()
}

/// Checks every held quantity of the file.
pub(super) fn check_quantities(entries: &[Entry], checker: &mut Checker<'_>) {
    for entry in entries {
        let name = entry.name.clone();
        match &entry.given.value {
            Quantity::Held(value) => {
                let broken = rule_of(&name).filter(|rule| !(rule.holds)(*value));
                if let Some(QuantityRule { rule, way_out, .. }) = broken {
                    let fault = Fault::OutOfRange { name, rule, value: format!("{value:?}"), way_out };
                    checker.fault(entry.given.origin, &entry.name, fault);
                }
            }
            given if name == "prediction.clock_distance" => {
                let fault = Fault::MustBeHeld { name, found: given.to_string() };
                checker.fault(entry.given.origin, &entry.name, fault);
            }
            _ => {}
        }
    }
    let held = |name: &str| {
        let entry = entries.iter().find(|entry| entry.name == name)?;
        match entry.given.value {
            Quantity::Held(value) => Some((value, entry.given.origin)),
            _ => None,
        }
    };
    if let (Some((omega_m, _)), Some((omega_b, origin))) =
        (held("background.omega_m"), held("background.omega_b"))
        && omega_m > 0.0
        && omega_b >= omega_m
    {
        checker.fault(origin, "background.omega_b", Fault::BaryonsExceedMatter { omega_b, omega_m });
    }
}

/// Checks what the surveys say besides quantities.
pub(super) fn check_surveys(file: &StudyFile, checker: &mut Checker<'_>) {
    for survey in &file.surveys {
        let needs_other = |key: &str, other: &str, way_out| Fault::NeedsOther {
            key: key.to_owned(),
            other: other.to_owned(),
            way_out,
        };
        redshifts::check(survey, checker);
        design::check(survey, checker);
        let way_out =
            "the window's columns are predicted rows: give the table that names them, and the matrix";
        match (&survey.window, &survey.window_rows) {
            (Some(window), None) => {
                checker.fault(window.origin, "window", needs_other("window", "window_rows", way_out));
            }
            (None, Some(rows)) => {
                checker.fault(rows.origin, "window_rows", needs_other("window_rows", "window", way_out));
            }
            _ => {}
        }
        for keep in &survey.keep {
            let Some(bins) = &keep.bins else { continue };
            let known = || survey.bins.iter().map(|bin| bin.name.value.as_str());
            for name in bins.value.iter().filter(|name| known().all(|bin| bin != name.as_str())) {
                let nearest = Nearest::find(name, known());
                let fault = Fault::UnknownChoice { what: "bin", value: name.clone(), nearest };
                checker.fault(bins.origin, "bins", fault);
            }
        }
        for (range, name) in survey
            .keep
            .iter()
            .flat_map(|keep| [(&keep.separation, "separation"), (&keep.wavenumber, "wavenumber")])
        {
            let Some(range) = range.as_ref().filter(|range| range.value.0 < 0.0) else {
                continue;
            };
            let value = format!("{:?}", range.value.0);
            let (name, rule, way_out) = (name.to_owned(), "0 or above at its low end", "raise its low end");
            checker.fault(range.origin, &name.clone(), Fault::OutOfRange { name, rule, value, way_out });
        }
        for bin in &survey.bins {
            let path = format!("{}.{}", survey.name.value, bin.name.value);
            let (rate, slope) = (format!("{path}.growth_rate"), format!("{path}.growth_slope"));
            let way_out = "a bin's growth is given by f and df/dln a together, or not at all";
            match (&bin.growth_rate, &bin.growth_slope) {
                (Some(given), None) => {
                    checker.fault(given.origin, &rate, needs_other(&rate, "growth_slope", way_out))
                }
                (None, Some(given)) => {
                    checker.fault(given.origin, &slope, needs_other(&slope, "growth_rate", way_out));
                }
                _ => {}
            }
        }
    }
}
