//! The amplitude of one direction in the measurements, everything else marginalised.

use nalgebra::{DMatrix, DVector};

use super::comparison::{Comparison, VerdictError};
use super::deviate::deviate_of_t;
use super::factored::Factored;
use crate::triangle::dot;

/// An amplitude and how well it is known.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Amplitude {
    /// a: of the expectation p + a g.
    pub value: f64,
    /// Its standard deviation; of a covariance from mocks, the scale of its distribution.
    pub standard_deviation: f64,
    /// Of Student's t, where the covariance comes from mocks; `None` where a is normal.
    pub degrees_of_freedom: Option<f64>,
}

impl Amplitude {
    /// The standard normal deviate of the amplitude from another: how many standard deviations the value lies above it,
    /// with the same tail probability where it follows Student's t.
    pub fn sigma_from(&self, other: f64) -> f64 {
        let t = (self.value - other) / self.standard_deviation;
        self.degrees_of_freedom.map_or(t, |degrees| deviate_of_t(t, degrees))
    }
}

/// Generalised least squares for the amplitude a of `direction` g (a number a row), with residuals r = d − p:
///
///   a = gᵀC⁻¹r / gᵀC⁻¹g,   sd = 1/√(gᵀC⁻¹g),   C = N + JΣJᵀ.
///
/// The parameters are marginalised with their priors; one that is g itself must be held ([`Comparison::holding`]), or a is
/// what the data say beyond its prior. With p at no departure and g = ∂p/∂τ, a is τ; with p at no gravitational redshift
/// and g what it adds, a is 1 in general relativity; with p without odd signal and g the odd prediction, any odd signal.
///
/// For a covariance N from n mocks a is distributed as Student's t with m = n − tr(N C⁻¹) degrees of freedom and scale
/// √[(n − 1 + χ²)/m]/√(gᵀC⁻¹g), χ² = sᵀN⁻¹s that of the noise s = N C⁻¹(r − a g) that remains: exact where Σ vanishes (the
/// trace is n_d) and where it is wide (n_d less the number of parameters; Rao 1959, Biometrika 46, 49); in between a p-value of 5 % comes out in 4.1 to 5.0 % of clean
/// data.
///
/// # Errors
/// A direction of another length, not finite, or zero over the rows at hand; no more mocks than rows; a covariance that is
/// not definite.
pub fn amplitude(comparison: &Comparison, direction: &DVector<f64>) -> Result<Amplitude, VerdictError> {
    check_direction(comparison, direction)?;
    let factored = comparison.factored()?;
    let residual = factored.whiten(&comparison.residual());
    let (whitened, information) = whitened_direction(&factored, direction)?;
    let value = dot(&whitened, &residual) / information;
    let degrees_of_freedom = match factored.noise_mocks {
        None => None,
        Some(mocks) => {
            let rows = factored.noise_rows;
            // Half a mock more than none, since an effective number is rounded.
            if mocks < rows + 0.5 {
                let (least, mocks) = (rows.round() as usize, mocks.round() as usize);
                return Err(VerdictError::TooFewMocks { what: "an amplitude", least, mocks });
            }
            Some(mocks - rows)
        }
    };
    let inflation = match (factored.noise_mocks, degrees_of_freedom) {
        (Some(mocks), Some(degrees)) => {
            let rest: Vec<f64> = residual.iter().zip(&whitened).map(|(r, g)| r - value * g).collect();
            // C⁻¹(r − a g), and the noise in it: N times that.
            let all = factored.whiten_matrix(&DMatrix::identity(comparison.len(), comparison.len()));
            let weighted = all.tr_mul(&DVector::from_vec(rest));
            let noise = weighted.dot(&(comparison.noise().matrix() * &weighted));
            (mocks - 1.0 + noise) / degrees
        }
        _ => 1.0,
    };
    Ok(Amplitude { value, standard_deviation: (inflation / information).sqrt(), degrees_of_freedom })
}

/// The standard deviation that an amplitude is expected to have, from covariances and priors alone: 1/√(gᵀC⁻¹g) where C is
/// known, more by √[(n − 2)/(n − n_d − 1)] (with tr(N C⁻¹) for n_d) where it comes from n mocks (Dodelson & Schneider 2013; exact form of Taylor &
/// Joachimi 2014, MNRAS 442, 2728), infinite for no more mocks than rows and one.
///
/// # Errors
/// As [`amplitude`], mocks aside.
pub fn amplitude_error(comparison: &Comparison, direction: &DVector<f64>) -> Result<f64, VerdictError> {
    check_direction(comparison, direction)?;
    let factored = comparison.factored()?;
    let (_, information) = whitened_direction(&factored, direction)?;
    // (gᵀS⁻¹g)⁻¹ of n mocks is too small by (n − n_d)/(n − 1) on average.
    let inflation = match factored.noise_mocks {
        None => 1.0,
        Some(mocks) => {
            let spare = mocks - factored.noise_rows;
            let growth = (mocks - 2.0) / (spare - 1.0) * (mocks - 1.0) / spare;
            if spare > 1.0 + 1e-6 { growth } else { f64::INFINITY }
        }
    };
    Ok((inflation / information).sqrt())
}

fn check_direction(comparison: &Comparison, direction: &DVector<f64>) -> Result<(), VerdictError> {
    if direction.len() != comparison.len() {
        let (expected, found) = (comparison.len(), direction.len());
        return Err(VerdictError::Shape { what: "the direction", of: "rows", expected, found });
    }
    match direction.iter().find(|value| !value.is_finite()) {
        Some(value) => Err(VerdictError::NotFinite { what: "the direction", value: *value }),
        None => Ok(()),
    }
}

/// L⁻¹g and gᵀC⁻¹g.
fn whitened_direction(
    factored: &Factored,
    direction: &DVector<f64>,
) -> Result<(Vec<f64>, f64), VerdictError> {
    let whitened = factored.whiten(direction);
    let information = dot(&whitened, &whitened);
    match information > 0.0 {
        true => Ok((whitened, information)),
        false => Err(VerdictError::NoDirection { rows: direction.len() }),
    }
}
