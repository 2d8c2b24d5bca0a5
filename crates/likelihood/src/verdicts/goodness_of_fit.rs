//! χ² of measurements about what is expected of them.

use super::comparison::{Comparison, VerdictError};
use crate::goodness::tails;

/// How far measurements lie from their expectation.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Goodness {
    /// (d − p)ᵀ(N + JΣJᵀ)⁻¹(d − p).
    pub chi_squared: f64,
    /// Rows less flat templates.
    pub degrees_of_freedom: f64,
    /// The probability of a χ² at least this large; `None` where there are fewer mocks than rows.
    pub p_value: Option<f64>,
    /// The mocks behind N + JΣJᵀ, if any: fewer for the rows of which the noise dominates.
    pub mocks: Option<f64>,
}

/// χ² and p-value of all rows of a comparison; of a part by [`Comparison::select`].
///
/// With a known covariance, p is exactly uniform for sound data under normal priors. With one from mocks it follows from
/// F (Hotelling 1931) for the effective number of mocks (Nel & van der Merwe 1986): exact where J Σ Jᵀ vanishes, and to
/// within a tenth of p otherwise for twice as many mocks as rows.
///
/// # Errors
/// A covariance that is not definite.
pub fn goodness(comparison: &Comparison) -> Result<Goodness, VerdictError> {
    let factored = comparison.factored()?;
    let chi_squared = factored.chi_squared(&comparison.residual());
    let (degrees_of_freedom, mocks) = (factored.degrees_of_freedom(), factored.mocks);
    let p_value = tails(chi_squared, degrees_of_freedom, mocks).map(|(_, upper)| upper);
    Ok(Goodness { chi_squared, degrees_of_freedom, p_value, mocks })
}
