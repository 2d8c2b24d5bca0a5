//! The covariance of noise and expectation together, factored.

use nalgebra::{DMatrix, DVector};

use crate::templates::project_out;
use crate::triangle::{LowerTriangle, dot};

/// N + JΣJᵀ = L Lᵀ, flat templates projected out.
#[derive(Clone, Debug)]
pub(super) struct Factored {
    pub(super) factor: LowerTriangle,
    pub(super) projected: Vec<Vec<f64>>,
    /// The mocks behind it, as [`Comparison::effective_mocks`] counts them.
    pub(super) mocks: Option<f64>,
    /// The mocks behind N alone, and tr(N C⁻¹): the rows of which the noise dominates.
    pub(super) noise_mocks: Option<f64>,
    pub(super) noise_rows: f64,
}

impl Factored {
    /// L⁻¹ v, less its part along flat templates.
    pub(super) fn whiten(&self, values: &DVector<f64>) -> Vec<f64> {
        let mut whitened = values.as_slice().to_vec();
        self.factor.solve_in_place(&mut whitened);
        project_out(&self.projected, &mut whitened);
        whitened
    }

    pub(super) fn whiten_matrix(&self, matrix: &DMatrix<f64>) -> DMatrix<f64> {
        let mut whitened = matrix.clone();
        for mut column in whitened.column_iter_mut() {
            self.factor.solve_in_place(column.as_mut_slice());
            project_out(&self.projected, column.as_mut_slice());
        }
        whitened
    }

    pub(super) fn chi_squared(&self, values: &DVector<f64>) -> f64 {
        let whitened = self.whiten(values);
        dot(&whitened, &whitened)
    }

    /// Rows less flat templates.
    pub(super) fn degrees_of_freedom(&self) -> f64 {
        (self.factor.size() - self.projected.len()) as f64
    }

    pub(super) fn log_determinant(&self) -> f64 {
        self.factor.log_determinant()
    }

    /// −2 ln L up to a constant, as a function of χ²: of normal noise, or of a covariance from mocks integrated out
    /// (Sellentin & Heavens 2016).
    pub(super) fn badness(&self, chi_squared: f64) -> f64 {
        match self.noise_mocks {
            None => chi_squared,
            Some(mocks) => mocks * (chi_squared / (mocks - 1.0)).ln_1p(),
        }
    }
}
