//! A multivariate normal over several dimensions: `[[joint_prior]]` of a study file.

use super::PriorError;
use super::special::LN_SQRT_TWO_PI;
use nalgebra::{Cholesky, DMatrix, DVector};
use rand::Rng;
use rand_distr::{Distribution, StandardNormal};

/// Joint normal prior: ln p = −½ (x−μ)ᵀ C⁻¹ (x−μ) − ½ ln det(2πC) over the dimensions `of`.
#[derive(Debug, Clone)]
pub struct JointNormal {
    of: Vec<usize>,
    mean: DVector<f64>,
    covariance: DMatrix<f64>,
    lower: DMatrix<f64>,
    /// Inverse of the lower Cholesky factor, row-major, lower triangle packed: whitens without working memory.
    whitening: Vec<f64>,
    precision: DMatrix<f64>,
    constant: f64,
}

impl JointNormal {
    /// A joint prior over dimensions `of`, with `mean[i]` and `covariance[i][j]` in their order.
    ///
    /// # Errors
    /// Lengths that do not fit ([`PriorError::JointShape`]); numbers that are not finite; a covariance that is not
    /// symmetric to a relative 1e-10 of √(Cᵢᵢ Cⱼⱼ), or not positive definite, such as [[1, 2], [2, 1]]; a dimension
    /// named twice.
    pub fn new(of: Vec<usize>, mean: &[f64], covariance: &[Vec<f64>]) -> Result<Self, PriorError> {
        let n = of.len();
        let ragged = covariance.iter().map(Vec::len).find(|columns| *columns != n);
        if mean.len() != n || covariance.len() != n || ragged.is_some() || n == 0 {
            return Err(PriorError::JointShape {
                of: n,
                mean: mean.len(),
                rows: covariance.len(),
                columns: ragged.unwrap_or(n),
            });
        }
        if let Some((row, value)) = mean.iter().enumerate().find(|(_, value)| !value.is_finite()) {
            return Err(PriorError::JointNotFinite { part: "mean", position: (row, 0), value: *value });
        }
        for (i, dimension) in of.iter().enumerate() {
            if of[..i].contains(dimension) {
                return Err(PriorError::TwoPriors { dimension: *dimension });
            }
        }
        let matrix = DMatrix::from_fn(n, n, |row, column| covariance[row][column]);
        check_symmetric(&matrix)?;
        let factor = Cholesky::new(matrix.clone()).ok_or_else(|| indefinite(&matrix))?;
        let lower = factor.l();
        let inverse =
            lower.solve_lower_triangular(&DMatrix::identity(n, n)).ok_or_else(|| indefinite(&matrix))?;
        let mut whitening = Vec::with_capacity(n * (n + 1) / 2);
        for row in 0..n {
            whitening.extend((0..=row).map(|column| inverse[(row, column)]));
        }
        let ln_determinant_half: f64 = (0..n).map(|i| lower[(i, i)].ln()).sum();
        Ok(Self {
            of,
            mean: DVector::from_column_slice(mean),
            precision: inverse.transpose() * &inverse,
            covariance: matrix,
            lower,
            whitening,
            constant: -(n as f64) * LN_SQRT_TWO_PI - ln_determinant_half,
        })
    }

    /// The dimensions it covers.
    pub fn of(&self) -> &[usize] {
        &self.of
    }

    /// Mean, in the order of [`JointNormal::of`].
    pub fn mean(&self) -> &DVector<f64> {
        &self.mean
    }

    /// Covariance, in the order of [`JointNormal::of`].
    pub fn covariance(&self) -> &DMatrix<f64> {
        &self.covariance
    }

    /// Inverse covariance, in the order of [`JointNormal::of`].
    pub fn precision(&self) -> &DMatrix<f64> {
        &self.precision
    }

    /// Normalised log density at a point of the whole space; allocates nothing.
    pub fn log_density(&self, point: &[f64]) -> f64 {
        let mut squares = 0.0;
        let mut entries = self.whitening.iter();
        for row in 0..self.of.len() {
            let mut whitened = 0.0;
            for (column, entry) in (0..=row).zip(entries.by_ref()) {
                whitened += entry * (point[self.of[column]] - self.mean[column]);
            }
            squares += whitened * whitened;
        }
        self.constant - 0.5 * squares
    }

    /// Draws the dimensions it covers into a point of the whole space.
    pub fn sample(&self, rng: &mut dyn Rng, point: &mut [f64]) {
        let normals: Vec<f64> = (0..self.of.len()).map(|_| StandardNormal.sample(rng)).collect();
        self.colour(&normals, point);
    }

    /// Writes μ + L z into the dimensions it covers; `normals` in their order.
    pub(crate) fn colour(&self, normals: &[f64], point: &mut [f64]) {
        for (row, dimension) in self.of.iter().enumerate() {
            let correlated: f64 = (0..=row).map(|column| self.lower[(row, column)] * normals[column]).sum();
            point[*dimension] = self.mean[row] + correlated;
        }
    }
}

fn check_symmetric(matrix: &DMatrix<f64>) -> Result<(), PriorError> {
    for row in 0..matrix.nrows() {
        for column in 0..matrix.ncols() {
            let value = matrix[(row, column)];
            if !value.is_finite() {
                return Err(PriorError::JointNotFinite {
                    part: "covariance",
                    position: (row, column),
                    value,
                });
            }
            let mirrored = matrix[(column, row)];
            let scale = (matrix[(row, row)] * matrix[(column, column)]).abs().sqrt();
            if column < row && (value - mirrored).abs() > 1e-10 * scale {
                return Err(PriorError::JointAsymmetric { row, column, value, mirrored });
            }
        }
    }
    Ok(())
}

fn indefinite(matrix: &DMatrix<f64>) -> PriorError {
    let eigenvalues = matrix.clone().symmetric_eigenvalues();
    PriorError::JointIndefinite { smallest: eigenvalues.min(), largest: eigenvalues.max() }
}
