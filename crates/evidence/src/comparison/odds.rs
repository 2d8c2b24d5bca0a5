//! From log evidences and prior odds to odds and probabilities.

use serde::{Deserialize, Serialize};

/// What one hypothesis comes to.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Odds {
    /// Against the reference: weight · evidence over weight · evidence.
    pub odds: f64,
    /// Standard error of the odds' logarithm.
    pub log_error: f64,
    /// Among all that are compared.
    pub probability: f64,
}

/// Odds against the hypothesis at place `reference`, and probabilities among all: P ∝ weight · Z.
///
/// `evidences`: log evidence, its standard error, prior weight above 0. `None` where there is none to compare with.
pub fn odds(evidences: &[(f64, f64, f64)], reference: usize) -> Option<Vec<Odds>> {
    let posterior: Vec<f64> = evidences.iter().map(|(log, _, weight)| log + weight.ln()).collect();
    let total = crate::numbers::log_sum_exp(&posterior);
    let base = *posterior.get(reference)?;
    let odds = posterior.iter().zip(evidences).enumerate().map(|(place, (log, (_, error, _)))| Odds {
        odds: (log - base).exp(),
        log_error: if place == reference { 0.0 } else { error.hypot(evidences[reference].1) },
        probability: (log - total).exp(),
    });
    Some(odds.collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn probabilities_follow_evidences_and_weights() {
        let found = odds(&[(-1000.0, 0.3, 1.0), (-1000.0 + 3f64.ln(), 0.4, 2.0)], 0).unwrap();
        assert!((found[1].odds - 6.0).abs() < 1e-9 && found[0].odds == 1.0);
        assert!((found[1].probability - 6.0 / 7.0).abs() < 1e-12);
        assert!((found[1].log_error - 0.5).abs() < 1e-12 && found[0].log_error == 0.0);
        assert!(odds(&[], 0).is_none());
    }
}
