//! Whether measurements prefer another prediction, fixed beforehand.

use nalgebra::DVector;

use super::comparison::{Comparison, VerdictError};

/// The expectation as given against another one.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Preference {
    /// −2 ln L of the other less that of the one given: below 0 where the data prefer the other.
    pub difference: f64,
    /// A bound on the probability of a difference this far below 0 where the one given is right: min(1, e^(difference/2)).
    pub p_value: f64,
    /// The squared distance of the two in units of noise and spread: what `difference` is expected to be where the one given is
    /// right (and minus which where the other is), covariance known. Near 0 the data cannot tell.
    pub expected: f64,
}

/// Compares the prediction with `alternative` (a number a row), both with the uncertainty of the one given.
///
/// The ratio of two probability densities of the data exceeds c with probability 1/c at most where the one below the line is
/// true, so p bounds the rate of false alarms of one alternative; of n, p times n does.
///
/// # Errors
/// A covariance that is not definite.
pub fn preference(comparison: &Comparison, alternative: &DVector<f64>) -> Result<Preference, VerdictError> {
    let factored = comparison.factored()?;
    let apart = comparison.prediction() - alternative;
    let badness = |comparison: &Comparison| factored.badness(factored.chi_squared(&comparison.residual()));
    let difference = badness(&comparison.clone().about(alternative.clone())) - badness(comparison);
    Ok(Preference {
        difference,
        p_value: (0.5 * difference).exp().min(1.0),
        expected: factored.chi_squared(&apart),
    })
}
