//! What the data can tell about parameters: Fisher information, and what priors leave for them to tell.

use nalgebra::{DMatrix, DVector, SymmetricEigen};

use crate::survey::SurveyLikelihood;
use crate::triangle::dot;

impl SurveyLikelihood {
    /// F = JᵀC⁻¹J for J of n_d rows, a column a parameter (∂prediction/∂parameter). Computed as (L⁻¹J)ᵀ(L⁻¹J), so
    /// symmetric and without a negative eigenvalue beyond rounding. Known covariance; for noise from mocks multiply
    /// by [`NoiseModel::weight`](crate::NoiseModel::weight).
    pub fn fisher_information(&self, jacobian: &DMatrix<f64>) -> DMatrix<f64> {
        let whitened = self.whiten(jacobian);
        whitened.tr_mul(&whitened)
    }

    /// ⟨g₁, g₂⟩ = g₁ᵀC⁻¹g₂ of two directions in the space of predictions, n_d numbers each: √⟨g, g⟩ is the
    /// signal-to-noise of g, and ⟨g₁, g₂⟩/√(⟨g₁, g₁⟩⟨g₂, g₂⟩) how far the data confuse the two.
    pub fn projection(&self, first: &[f64], second: &[f64]) -> f64 {
        assert_eq!(first.len(), self.rows(), "a number for each row");
        assert_eq!(second.len(), self.rows(), "a number for each row");
        dot(&self.whiten_slice(first), &self.whiten_slice(second))
    }
}

/// Information of the data and of priors that cannot be combined.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum FisherError {
    /// Different sizes.
    #[error(
        "the data's information is {fisher} × {fisher} and the priors' {prior} × {prior}; both need a row and a column for each parameter"
    )]
    Size {
        /// Parameters of the data's.
        fisher: usize,
        /// Parameters of the priors'.
        prior: usize,
    },
    /// An entry that is no number.
    #[error("the {of} information about parameter {parameter} must be finite, found {value}")]
    NotFinite {
        /// `data's` or `priors'`.
        of: &'static str,
        /// Position of the parameter, from 1.
        parameter: usize,
        /// The entry.
        value: f64,
    },
    /// Information below zero.
    #[error("the {of} information must have no negative eigenvalue, found {eigenvalue:.3e} of the largest")]
    Negative {
        /// `data's` or `priors'`.
        of: &'static str,
        /// Smallest eigenvalue, scaled to unit diagonal.
        eigenvalue: f64,
    },
}

/// F + P, scaled to a unit diagonal and diagonalised, with the directions that neither informs set aside.
struct Combined {
    scale: DVector<f64>,
    eigen: SymmetricEigen<f64, nalgebra::Dyn>,
    informed: Vec<usize>,
}

/// Eigenvalues (of a matrix with unit diagonal) below n times this are rounding.
const ROUNDING: f64 = 16.0 * f64::EPSILON;

impl Combined {
    fn new(fisher: &DMatrix<f64>, prior: &DMatrix<f64>) -> Result<Self, FisherError> {
        let size = fisher.nrows();
        if prior.nrows() != size {
            return Err(FisherError::Size { fisher: size, prior: prior.nrows() });
        }
        check("data's", fisher)?;
        check("priors'", prior)?;
        let total = fisher + prior;
        let scale = unit_diagonal(&total);
        let eigen = SymmetricEigen::new(scaled(&total, &scale));
        let smallest = size as f64 * ROUNDING;
        let informed = (0..size).filter(|mode| eigen.eigenvalues[*mode] > smallest).collect();
        Ok(Self { scale, eigen, informed })
    }
}

/// 1/√(diagonal), and 0 where a parameter has no information at all.
fn unit_diagonal(matrix: &DMatrix<f64>) -> DVector<f64> {
    matrix.diagonal().map(|entry| if entry > 0.0 { entry.sqrt().recip() } else { 0.0 })
}

fn scaled(matrix: &DMatrix<f64>, scale: &DVector<f64>) -> DMatrix<f64> {
    DMatrix::from_fn(matrix.nrows(), matrix.ncols(), |i, j| matrix[(i, j)] * scale[i] * scale[j])
}

fn check(of: &'static str, matrix: &DMatrix<f64>) -> Result<(), FisherError> {
    for (j, column) in matrix.column_iter().enumerate() {
        if let Some(value) = column.iter().find(|value| !value.is_finite()) {
            return Err(FisherError::NotFinite { of, parameter: j + 1, value: *value });
        }
    }
    let eigenvalues = scaled(matrix, &unit_diagonal(matrix)).symmetric_eigenvalues();
    let largest_diagonal = matrix.diagonal().amax();
    let negative_diagonal = matrix.diagonal().iter().copied().fold(0.0, f64::min);
    let smallest = eigenvalues
        .iter()
        .copied()
        .fold(negative_diagonal / largest_diagonal.max(f64::MIN_POSITIVE), f64::min);
    // 1e-9: a precision matrix that was inverted from a covariance may carry rounding; more is a mistake.
    match smallest < -1e-9 {
        true => Err(FisherError::Negative { of, eigenvalue: smallest }),
        false => Ok(()),
    }
}

/// The number of parameters that the data, rather than the priors, determine: trace F (F + P)⁻¹, between 0 and the
/// number of parameters (Spiegelhalter et al. 2002, JRSS B 64, 583: their p_D for a normal likelihood and prior).
///
/// `fisher` is the data's information F, `prior` the precision matrix P of the priors, both symmetric and without
/// negative eigenvalues; a flat prior is a row and a column of zeros. Where F + P is singular, the directions that
/// neither informs are left out: the data determine nothing of them, so they count 0. They are told from rounding
/// after scaling F + P to a unit diagonal, which makes parameters of different units comparable.
///
/// # Errors
/// Sizes that differ, entries that are not finite, a negative eigenvalue.
pub fn effective_parameters(fisher: &DMatrix<f64>, prior: &DMatrix<f64>) -> Result<f64, FisherError> {
    let combined = Combined::new(fisher, prior)?;
    let scaled_fisher = scaled(fisher, &combined.scale);
    let share = |mode: &usize| {
        let direction = combined.eigen.eigenvectors.column(*mode);
        direction.dot(&(&scaled_fisher * direction)) / combined.eigen.eigenvalues[*mode]
    };
    Ok(combined.informed.iter().map(share).sum())
}

/// The posterior standard deviation that each parameter would have in the normal approximation:
/// √[(F + P)⁻¹]ᵢᵢ, infinite for a parameter that has a part in a direction that neither data nor priors inform.
///
/// # Errors
/// As [`effective_parameters`].
pub fn expected_standard_deviations(
    fisher: &DMatrix<f64>,
    prior: &DMatrix<f64>,
) -> Result<Vec<f64>, FisherError> {
    let Combined { scale, eigen, informed } = Combined::new(fisher, prior)?;
    let deviation = |parameter: usize| {
        let part = |mode: &usize| eigen.eigenvectors[(parameter, *mode)].powi(2);
        let known: f64 = informed.iter().map(part).sum();
        // Eigenvectors are orthonormal to about 1e-15; a millionth of a direction is more than that can feign.
        if scale[parameter] == 0.0 || known < 1.0 - 1e-6 {
            return f64::INFINITY;
        }
        let variance: f64 = informed.iter().map(|mode| part(mode) / eigen.eigenvalues[*mode]).sum();
        scale[parameter] * variance.sqrt()
    };
    Ok((0..scale.len()).map(deviation).collect())
}
