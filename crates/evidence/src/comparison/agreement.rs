//! Whether independent estimates of one evidence agree, and the number that they come down to.

use crate::estimate::Estimate;
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// Estimates agree where they differ by no more than this many of their combined standard errors …
///
/// Five hypotheses with four voting estimators each make thirty pairs; were errors normal, some pair of sound ones would
/// differ by more once in 500 studies.
pub const TOLERATED_ERRORS: f64 = 4.0;

/// … and this much, which no verdict hangs on.
pub const TOLERATED_NATS: f64 = 0.02;

/// Two estimates that differ by more than their errors allow.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Disagreement {
    /// The estimators.
    pub between: [String; 2],
    /// Difference of their log evidences.
    pub difference: f64,
    /// Its standard error.
    pub error: f64,
}

/// What a comparison of estimates says.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Agreement {
    /// Whether all that vote agree, and at least one does.
    pub agree: bool,
    /// Pairs that do not.
    pub disagreements: Vec<Disagreement>,
}

/// Compares all pairs of estimates that vote.
///
/// An estimate of nested sampling whose insertion indices are not uniform counts against agreement, although it does not
/// vote: its error bar is wrong by an unknown amount.
pub fn agreement(estimates: &[(&str, &Estimate)]) -> Agreement {
    let voting: Vec<_> = estimates.iter().filter(|(_, estimate)| estimate.votes).collect();
    let mut disagreements = Vec::new();
    for (index, (name, one)) in voting.iter().enumerate() {
        for (other_name, other) in &voting[index + 1..] {
            let difference = one.log_evidence - other.log_evidence;
            let error = one.error.hypot(other.error);
            // NaN does not agree with anything.
            if !(difference.abs() <= TOLERATED_ERRORS * error + TOLERATED_NATS) {
                let between = [(*name).to_owned(), (*other_name).to_owned()];
                disagreements.push(Disagreement { between, difference, error });
            }
        }
    }
    let sound = estimates.iter().all(|(_, estimate)| {
        estimate.insertion_p_value.is_none_or(|p| p >= crate::LEAST_INSERTION_PROBABILITY)
    });
    Agreement { agree: disagreements.is_empty() && !voting.is_empty() && sound, disagreements }
}

/// The log evidence that estimates come down to, with its standard error: the closed form where there is one; else the mean
/// of nested sampling and stepping stones, weighted by inverse variances; else any other that votes.
///
/// Only those two are independent of each other: the density ratio leans on the evidence of another hypothesis.
pub fn chosen(estimates: &[(&str, &Estimate)]) -> Option<(f64, f64)> {
    let of = |wanted: &[&str]| -> Vec<(f64, f64)> {
        estimates
            .iter()
            .filter(|(name, estimate)| {
                wanted.contains(name) && estimate.votes && estimate.log_evidence.is_finite()
            })
            .map(|(_, estimate)| (estimate.log_evidence, estimate.error.max(1e-9)))
            .collect()
    };
    for wanted in [&["closed_form"][..], &["nested", "stepping"], &["density_ratio"], &["laplace"]] {
        let found = of(wanted);
        if found.is_empty() {
            continue;
        }
        let weight: f64 = found.iter().map(|(_, error)| error.powi(-2)).sum();
        let mean = found.iter().map(|(value, error)| value * error.powi(-2)).sum::<f64>() / weight;
        return Some((mean, weight.sqrt().recip()));
    }
    None
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn agreement_is_by_errors_and_only_of_those_who_vote() {
        let (near, far) = (Estimate::new(1.0, 0.05, 0), Estimate::new(1.5, 0.05, 0));
        let silent = far.clone().doubted("for a test".to_owned());
        assert!(agreement(&[("nested", &near), ("laplace", &silent)]).agree);
        let found = agreement(&[("nested", &near), ("stepping", &far)]);
        assert!(!found.agree);
        assert_eq!(found.disagreements[0].between, ["nested", "stepping"]);
        assert!(!agreement(&[("laplace", &silent)]).agree);
        let mut broken = near.clone();
        broken.insertion_p_value = Some(1e-9);
        assert!(!agreement(&[("stepping", &near), ("nested", &broken)]).agree);
        let unknown = Estimate::new(f64::NAN, 0.05, 0);
        assert!(!agreement(&[("nested", &near), ("stepping", &unknown)]).agree);
    }

    #[test]
    fn the_chosen_number_weighs_by_variance_and_prefers_the_closed_form() {
        let (sharp, blunt) = (Estimate::new(1.0, 0.1, 0), Estimate::new(2.0, 0.2, 0));
        let (value, error) = chosen(&[("nested", &sharp), ("stepping", &blunt)]).unwrap();
        assert!((value - 1.2).abs() < 1e-12 && (error - 0.2 / 5f64.sqrt()).abs() < 1e-12);
        let exact = Estimate::new(1.1, 1e-9, 0);
        assert_eq!(chosen(&[("nested", &sharp), ("closed_form", &exact)]).unwrap().0, 1.1);
        assert!(chosen(&[]).is_none());
    }
}
