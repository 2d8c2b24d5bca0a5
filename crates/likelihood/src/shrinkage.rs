//! A covariance from mocks, pulled towards a model of it.

use nalgebra::DMatrix;

use crate::covariance::{Covariance, CovarianceError};
use crate::mocks::MockSet;

/// A covariance between an estimate from mocks and a model.
#[derive(Clone, Debug, PartialEq)]
pub struct Shrunk {
    /// λ T + (1 − λ) S.
    pub covariance: Covariance,
    /// λ, the share of the model: 0 keeps the estimate, 1 the model.
    pub share: f64,
}

impl MockSet {
    /// λ T + (1 − λ) S of the sample covariance S of n_s mocks and a model T, with λ estimated from the mocks so that the
    /// expected squared distance from the truth is least:
    ///
    ///   λ = Σ_ij Var(S_ij) / Σ_ij (T_ij − S_ij)²,  clamped to [0, 1],
    ///   Var(S_ij) = n_s/(n_s − 1)³ Σ_k (W_kij − W̄_ij)²,  W_kij = (x_ki − x̄_i)(x_kj − x̄_j).
    ///
    /// Pope & Szapudi 2008, MNRAS 389, 766, Eqs. 8 to 12 (the model is held, so its covariance with S vanishes);
    /// Schäfer & Strimmer 2005. Rows are first divided by the model's standard deviations, so that multipoles of
    /// different units count alike: λ does not depend on units. Where the model is the truth, λ is near 1 (the
    /// denominator is all noise); where it is far off, λ goes to zero as 1/n_s.
    ///
    /// The sum is better conditioned than S, and definite for λ > 0 whatever n_s. It is not distributed as an estimate
    /// from n_s mocks: noise models that assume so are too cautious for it.
    ///
    /// # Errors
    /// A model with other rows; a row that is the same in every mock.
    pub fn shrunk(&self, model: &Covariance) -> Result<Shrunk, CovarianceError> {
        let size = self.rows();
        if model.len() != size {
            let (origin, expected, found) = (model.origin().to_owned(), size, model.len());
            return Err(CovarianceError::WrongSize { origin, expected, found });
        }
        let scales = model.standard_deviations();
        let mut deviations = self.deviations();
        for (mut column, scale) in deviations.column_iter_mut().zip(&scales) {
            column /= *scale;
        }
        let mocks = self.mock_count() as f64;
        let products = deviations.tr_mul(&deviations);
        let squared = deviations.map(|x| x * x);
        // Σ_k W_kij²; then Σ_k (W_kij − W̄_ij)² = Σ_k W_kij² − n_s W̄_ij².
        let squared_products = squared.tr_mul(&squared);
        let spread = (0..size * size)
            .map(|entry| (squared_products[entry] - products[entry] * products[entry] / mocks).max(0.0));
        let noise = mocks / (mocks - 1.0).powi(3) * spread.sum::<f64>();
        let estimate = products / (mocks - 1.0);
        let target = DMatrix::from_fn(size, size, |i, j| model.matrix()[(i, j)] / (scales[i] * scales[j]));
        let distance = (&target - &estimate).norm_squared();
        let share = if distance > noise { noise / distance } else { 1.0 };
        let mixed = target * share + estimate * (1.0 - share);
        let matrix = DMatrix::from_fn(size, size, |i, j| mixed[(i, j)] * scales[i] * scales[j]);
        let origin = format!("{} mocks shrunk towards {}", self.mock_count(), model.origin());
        Ok(Shrunk { covariance: Covariance::labelled(matrix, origin, self.labels().to_vec())?, share })
    }
}
