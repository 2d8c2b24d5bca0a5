//! Signal-to-noise of measurements, against nothing at all.

use super::comparison::{Comparison, VerdictError};
use super::deviate::deviate_of_p;
use super::goodness_of_fit::{Goodness, goodness};

/// How much is there, whatever it is.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Signal {
    /// χ² of the measurements about zero, with their noise alone.
    pub about_zero: Goodness,
    /// The standard normal deviate of its p-value: how surely there is anything at all.
    pub sigma: Option<f64>,
    /// √(sᵀN⁻¹s) of the true signal s, estimated as the root of χ² less its expectation for none, or 0.
    pub signal_to_noise: f64,
}

/// Signal-to-noise of the rows of a comparison (their expectation is not used).
///
/// χ² about zero has expectation sᵀN⁻¹s + ν where N is known; where it comes from n mocks, χ² (n−ν−2)/(n−1) has, of which
/// the estimate is made.
///
/// # Errors
/// A covariance that is not definite.
pub fn signal(comparison: &Comparison) -> Result<Signal, VerdictError> {
    let about_zero = goodness(&comparison.clone().about_zero())?;
    let Goodness { chi_squared, degrees_of_freedom, p_value, mocks } = about_zero;
    let unbiased = match mocks {
        None => chi_squared,
        Some(mocks) => chi_squared * (mocks - degrees_of_freedom - 2.0).max(0.0) / (mocks - 1.0),
    };
    Ok(Signal {
        about_zero,
        sigma: p_value.map(deviate_of_p),
        signal_to_noise: (unbiased - degrees_of_freedom).max(0.0).sqrt(),
    })
}
