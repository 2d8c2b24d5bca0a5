//! χ² of measurements about what is expected of them.

use super::comparison::{Comparison, VerdictError};
use crate::goodness::{tails, upper_tail_of_sum};

/// How far measurements lie from their expectation.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Goodness {
    /// (d − p)ᵀ(N + JΣJᵀ)⁻¹(d − p).
    pub chi_squared: f64,
    /// Rows less flat templates.
    pub degrees_of_freedom: f64,
    /// The probability of a χ² at least this large; `None` where there are fewer mocks than rows.
    pub p_value: Option<f64>,
    /// The mocks behind the noise, if any; of surveys with different numbers, an effective one.
    pub mocks: Option<f64>,
}

/// χ² and p-value of all rows of a comparison; of a part by [`Comparison::select`].
///
/// With a known covariance, p is exactly uniform for sound data under normal priors. With one from n mocks, the rows of which
/// the noise dominates, ν = tr(N C⁻¹) in number (C = N + JΣJᵀ), follow F(ν, n − ν) (Hotelling 1931), the others plain χ²: exact
/// where JΣJᵀ vanishes; otherwise a p of 5 % comes out in 4.4 to 5.0 % of clean data, for 1.5 times as many mocks as rows or more.
///
/// # Errors
/// A covariance that is not definite.
pub fn goodness(comparison: &Comparison) -> Result<Goodness, VerdictError> {
    let factored = comparison.factored()?;
    let chi_squared = factored.chi_squared(&comparison.residual());
    let (degrees_of_freedom, mocks) = (factored.degrees_of_freedom(), factored.noise_mocks);
    let p_value = match mocks {
        None => tails(chi_squared, degrees_of_freedom, None).map(|(_, upper)| upper),
        Some(mocks) => {
            let noise_rows = factored.noise_rows;
            upper_tail_of_sum(chi_squared, noise_rows, mocks, degrees_of_freedom - noise_rows)
        }
    };
    Ok(Goodness { chi_squared, degrees_of_freedom, p_value, mocks })
}
