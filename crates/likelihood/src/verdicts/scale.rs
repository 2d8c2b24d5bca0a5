//! Whether the covariance is in the units of the measurements.

use nalgebra::{DVector, SymmetricEigen};

use super::comparison::{Comparison, VerdictError};
use crate::goodness::tails;
use crate::triangle::LowerTriangle;

/// The factor by which the noise's covariance should be multiplied.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CovarianceScale {
    /// ln s at its most probable, for noise sN and the expectation's own spread.
    pub log_factor: f64,
    /// Its standard deviation, from the curvature there.
    pub log_error: f64,
    /// The probability, were s = 1, of residuals at least as large or at least as small as these: twice the smaller tail.
    pub p_value: f64,
}

impl CovarianceScale {
    /// s.
    pub fn factor(&self) -> f64 {
        self.log_factor.exp()
    }
}

/// Farther than this from 0, ln s is not searched: 10^±26.
const FARTHEST: f64 = 60.0;

/// Estimates s where residuals are drawn from N(0, sN + JΣJᵀ).
///
/// In the basis in which N is unity and JΣJᵀ diagonal (λ_i, residuals y_i), −2 ln L = Σ ln(s + λ_i) + y_i²/(s + λ_i): directions
/// that the expectation leaves open say nothing of s, and the rest say how large noise is. ln s is good to √(2/n) for n rows of
/// which noise dominates. p-value from the slope at s = 1, Σ w_i y_i²/(1 + λ_i) with w_i = 1/(1 + λ_i), a sum of χ² with as many
/// degrees of freedom as (Σw)²/Σw² (Satterthwaite 1946, Biometrics Bull. 2, 110), by F where N comes from mocks.
///
/// `None` where no row is left once flat templates are taken out.
///
/// # Errors
/// A covariance that is not definite.
pub fn covariance_scale(comparison: &Comparison) -> Result<Option<CovarianceScale>, VerdictError> {
    let factored = comparison.factored()?;
    if factored.degrees_of_freedom() < 1.0 {
        return Ok(None);
    }
    let factor: LowerTriangle = comparison.noise().factor()?;
    let mut spread = comparison.spread();
    // Flat templates: a spread so wide that their directions say nothing.
    for shape in comparison.flat_shapes() {
        let mut whitened = shape.as_slice().to_vec();
        factor.solve_in_place(&mut whitened);
        let square: f64 = whitened.iter().map(|entry| entry * entry).sum();
        if square > 0.0 {
            spread.ger(1e8 / square, shape, shape, 1.0);
        }
    }
    for _ in 0..2 {
        for mut column in spread.column_iter_mut() {
            factor.solve_in_place(column.as_mut_slice());
        }
        spread.transpose_mut();
    }
    let symmetric = (&spread + spread.transpose()) * 0.5;
    let eigen = SymmetricEigen::new(symmetric);
    let mut residual = comparison.residual();
    factor.solve_in_place(residual.as_mut_slice());
    let squares = eigen.eigenvectors.tr_mul(&residual).map(|y| y * y);
    let widths = eigen.eigenvalues.map(|width| width.max(0.0));
    let badness = |log_factor: f64| {
        let s = log_factor.exp();
        squares
            .iter()
            .zip(widths.iter())
            .map(|(square, width)| (s + width).ln() + square / (s + width))
            .sum::<f64>()
    };
    let log_factor = minimum(badness);
    let s = log_factor.exp();
    let information: f64 = widths.iter().map(|width| 0.5 * (s / (s + width)).powi(2)).sum();
    let p_value = two_sided(&squares, &widths, factored.noise_mocks);
    Ok(Some(CovarianceScale { log_factor, log_error: information.sqrt().recip(), p_value }))
}

fn two_sided(squares: &DVector<f64>, widths: &DVector<f64>, mocks: Option<f64>) -> f64 {
    let weight = |width: &f64| 1.0 / (1.0 + width);
    let sum: f64 = widths.iter().map(weight).sum();
    let sum_of_squares: f64 = widths.iter().map(|width| weight(width).powi(2)).sum();
    let statistic: f64 = squares.iter().zip(widths.iter()).map(|(y, width)| weight(width).powi(2) * y).sum();
    let degrees = sum * sum / sum_of_squares;
    tails(statistic * degrees / sum, degrees, mocks)
        .map_or(f64::NAN, |(lower, upper)| (2.0 * lower.min(upper)).min(1.0))
}

/// The lowest point between ±60: a grid, since there may be two valleys, then golden sections (Kiefer 1953).
fn minimum(badness: impl Fn(f64) -> f64) -> f64 {
    let grid = |step: i32| FARTHEST * f64::from(step) / 120.0;
    let lowest = (-120..=120).min_by(|a, b| badness(grid(*a)).total_cmp(&badness(grid(*b)))).unwrap_or(0);
    let (mut low, mut high) = (grid(lowest - 1), grid(lowest + 1));
    let ratio = 0.5 * (5.0_f64.sqrt() - 1.0);
    // Each step leaves 0.618 of the interval; 50 of them 10⁻¹⁰.
    for _ in 0..50 {
        let (left, right) = (high - ratio * (high - low), low + ratio * (high - low));
        match badness(left) < badness(right) {
            true => high = right,
            false => low = left,
        }
    }
    0.5 * (low + high)
}
