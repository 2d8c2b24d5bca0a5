//! Whether parts of the data ask for the same departure.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};
use statrs::distribution::{ChiSquared, ContinuousCDF};

/// A hypothesis that was weighed and sampled.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Fitted {
    /// Log evidence.
    pub log_evidence: f64,
    /// Its standard error.
    pub error: f64,
    /// Posterior mean of the log likelihood.
    pub mean_log_likelihood: f64,
    /// Posterior variance of the log likelihood.
    pub variance_log_likelihood: f64,
    /// Effective draws behind the two.
    pub draws: f64,
}

/// One departure for all against one each.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Consistency {
    /// ln R: evidence of one for all over that of one each. Moves with the prior's width.
    pub log_evidence_ratio: f64,
    /// Its standard error.
    pub error: f64,
    /// ln S = ln R − ln I: the same without the reward for fewer parameters. Does not move with the prior's width.
    pub suspiciousness: f64,
    /// Its standard error.
    pub suspiciousness_error: f64,
    /// d: how many more directions of the parameters the data determine with one each.
    pub degrees_of_freedom: f64,
    /// Probability of a suspiciousness as low, were there one departure for all; `None` where one each adds nothing that
    /// the data determine.
    pub tail_probability: Option<f64>,
}

/// Evidence ratio and suspiciousness (Handley & Lemos 2019, Phys. Rev. D 100, 043504, eqs. 8–11).
///
/// ln S = ⟨ln L⟩_one − ⟨ln L⟩_each, since ln Z = ⟨ln L⟩ − D with D the information; the dimensionalities are 2 Var ln L
/// (Handley & Lemos 2019, Phys. Rev. D 100, 023512, eq. 14). d − 2 ln S is χ² with d degrees of freedom where the posteriors
/// are normal.
pub fn consistency(one: &Fitted, each: &Fitted) -> Consistency {
    let suspiciousness = one.mean_log_likelihood - each.mean_log_likelihood;
    let variance = |fitted: &Fitted| fitted.variance_log_likelihood / fitted.draws.max(1.0);
    let degrees = 2.0 * (each.variance_log_likelihood - one.variance_log_likelihood);
    let tail_probability = ChiSquared::new(degrees)
        .ok()
        .filter(|_| degrees > 0.1)
        .map(|chi_squared| chi_squared.sf((degrees - 2.0 * suspiciousness).max(0.0)));
    Consistency {
        log_evidence_ratio: one.log_evidence - each.log_evidence,
        error: one.error.hypot(each.error),
        suspiciousness,
        suspiciousness_error: (variance(one) + variance(each)).sqrt(),
        degrees_of_freedom: degrees,
        tail_probability,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Two measurements of one number, errors 1, at ±a, prior flat and wide. One for all: posterior N(0, ½), ln L = −a² − x²,
    /// mean −a² − ½, variance ½. One each: mean −1, variance 1. So ln S = ½ − a², d = 1 and d − 2 ln S = 2a²: the χ² of the
    /// difference 2a over its error √2.
    #[test]
    fn two_measurements_of_one_number() {
        for a in [0.3f64, 1.0, 2.5] {
            let one = Fitted {
                log_evidence: 0.0,
                error: 0.0,
                mean_log_likelihood: -a * a - 0.5,
                variance_log_likelihood: 0.5,
                draws: 1e4,
            };
            let each = Fitted { mean_log_likelihood: -1.0, variance_log_likelihood: 1.0, ..one };
            let found = consistency(&one, &each);
            assert!((found.degrees_of_freedom - 1.0).abs() < 1e-12);
            let expected = statrs::function::erf::erfc(a);
            assert!((found.tail_probability.unwrap() / expected - 1.0).abs() < 1e-9);
        }
    }
}
