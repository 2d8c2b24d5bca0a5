//! The likelihood of one survey's measurements, for a prediction given number by number.

use std::sync::Arc;

use nalgebra::{DMatrix, DVector};

use crate::covariance::{Covariance, CovarianceError};
use crate::goodness::chi_squared_p_value;
use crate::noise::{NoiseChoice, NoiseError, NoiseModel};
use crate::triangle::{LowerTriangle, dot};

/// Data, covariance and noise that do not make a likelihood.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum LikelihoodError {
    /// The covariance is at fault.
    #[error(transparent)]
    Covariance(#[from] CovarianceError),
    /// The noise model is.
    #[error(transparent)]
    Noise(#[from] NoiseError),
    /// A measured value that is no number.
    #[error("measured value {row} must be a finite number, found {value}; leave out what was not measured")]
    DataNotFinite {
        /// Position of the value, from 1.
        row: usize,
        /// The value.
        value: f64,
    },
    /// Kernels for other rows.
    #[error(
        "kernels must have a row for each of the {expected} measured numbers, found {found}; build both from the same rows"
    )]
    KernelRows {
        /// Measured numbers.
        expected: usize,
        /// Rows of the kernels.
        found: usize,
    },
    /// A kernel that is no number.
    #[error(
        "the kernel of coefficient {coefficient} at row {row} must be a finite number, found {value}; look for what made it in the model's terms"
    )]
    KernelNotFinite {
        /// Position of the row, from 1.
        row: usize,
        /// Position of the coefficient, from 1.
        coefficient: usize,
        /// The value.
        value: f64,
    },
    /// Coefficients that the data leave open.
    #[error(
        "{coefficients} coefficients cannot be solved for: the data determine {rank} of their combinations; hold some, or give priors"
    )]
    Undetermined {
        /// Number of coefficients.
        coefficients: usize,
        /// Combinations that the data determine.
        rank: usize,
    },
}

/// Measurements d with covariance C = L Lᵀ and a noise model.
///
/// χ² = |L⁻¹(d − prediction)|² by forward substitution. C⁻¹ is never formed: it would cost more and, for
/// correlations close to 1, lose as many digits again as the condition number takes from L.
#[derive(Clone, Debug)]
pub struct SurveyLikelihood {
    data: DVector<f64>,
    covariance: Covariance,
    factor: LowerTriangle,
    log_determinant: f64,
    choice: NoiseChoice,
    noise: Arc<dyn NoiseModel>,
}

impl SurveyLikelihood {
    /// Factors the covariance (n³/3 operations, once). `covariance` is as estimated: a noise model that rescales
    /// it does so itself. Rows go unnamed in messages; [`Self::from_covariance`] names them.
    ///
    /// # Errors
    /// A value that is not finite; a covariance of another size, not symmetric or not positive definite; a mock
    /// count that is missing or too small for the noise.
    pub fn new(
        data: DVector<f64>,
        covariance: DMatrix<f64>,
        noise: &NoiseChoice,
    ) -> Result<Self, LikelihoodError> {
        Self::from_covariance(data, Covariance::new(covariance, "covariance")?, noise)
    }

    /// As [`Self::new`], with a covariance that knows where it comes from and what its rows are called.
    ///
    /// # Errors
    /// As [`Self::new`].
    pub fn from_covariance(
        data: DVector<f64>,
        covariance: Covariance,
        noise: &NoiseChoice,
    ) -> Result<Self, LikelihoodError> {
        if data.len() != covariance.len() {
            return Err(CovarianceError::WrongSize {
                origin: covariance.origin().to_owned(),
                expected: data.len(),
                found: covariance.len(),
            }
            .into());
        }
        if let Some((row, value)) = data.iter().enumerate().find(|(_, value)| !value.is_finite()) {
            return Err(LikelihoodError::DataNotFinite { row: row + 1, value: *value });
        }
        let factor = covariance.factor()?;
        let log_determinant = factor.log_determinant();
        let model = noise.build(data.len(), log_determinant)?;
        Ok(Self { data, covariance, factor, log_determinant, choice: *noise, noise: model })
    }

    /// The same measurements with another noise model; the factor is kept.
    ///
    /// # Errors
    /// A mock count that is missing or too small.
    pub fn with_noise(mut self, noise: &NoiseChoice) -> Result<Self, NoiseError> {
        self.noise = noise.build(self.rows(), self.log_determinant)?;
        self.choice = *noise;
        Ok(self)
    }

    /// The same survey with other measured values (a simulated one, say). As many as before.
    pub fn with_data(mut self, data: DVector<f64>) -> Self {
        assert_eq!(data.len(), self.rows(), "a value for each row");
        self.data = data;
        self
    }

    /// n_d, the number of measured numbers.
    pub fn rows(&self) -> usize {
        self.data.len()
    }

    /// The measured numbers.
    pub fn data(&self) -> &DVector<f64> {
        &self.data
    }

    /// Their covariance, as given.
    pub fn covariance(&self) -> &Covariance {
        &self.covariance
    }

    /// ln det C.
    pub fn log_determinant(&self) -> f64 {
        self.log_determinant
    }

    /// The noise model.
    pub fn noise(&self) -> &dyn NoiseModel {
        self.noise.as_ref()
    }

    pub(crate) fn shared_noise(&self) -> Arc<dyn NoiseModel> {
        Arc::clone(&self.noise)
    }

    /// The mocks behind the covariance, where it was estimated.
    pub fn mock_count(&self) -> Option<usize> {
        self.choice.mock_count
    }

    /// χ² of a prediction, one number a row; ≥ 0, NaN where the prediction is. `scratch` is grown as needed and can
    /// be used again: with it, nothing is allocated. Costs n_d²/2 multiplications.
    pub fn chi_squared(&self, prediction: &[f64], scratch: &mut Vec<f64>) -> f64 {
        assert_eq!(prediction.len(), self.rows(), "a predicted number for each row");
        scratch.clear();
        scratch.extend(self.data.iter().zip(prediction).map(|(measured, predicted)| measured - predicted));
        self.factor.solve_in_place(scratch);
        dot(scratch, scratch)
    }

    /// Log-likelihood of a prediction, with the constants of the noise model.
    pub fn log_likelihood(&self, prediction: &[f64], scratch: &mut Vec<f64>) -> f64 {
        self.noise.log_likelihood(self.chi_squared(prediction, scratch))
    }

    /// p-value of χ² with ν degrees of freedom, by F where the covariance is from mocks
    /// ([`chi_squared_p_value`]).
    pub fn p_value(&self, chi_squared: f64, degrees_of_freedom: f64) -> Option<f64> {
        chi_squared_p_value(chi_squared, degrees_of_freedom, self.choice.mock_count)
    }

    /// χ² of some rows alone, by their own covariance (the others integrated out); what a bin or a multipole
    /// contributes to surprise. Parts do not add up to the whole where rows of different parts correlate.
    /// `positions` are below [`Self::rows`], none twice; no rows give 0.
    pub fn subset_chi_squared(
        &self,
        prediction: &[f64],
        positions: &[usize],
    ) -> Result<f64, LikelihoodError> {
        assert_eq!(prediction.len(), self.rows(), "a predicted number for each row");
        let factor = self.covariance.select(positions).factor()?;
        let mut residual: Vec<f64> =
            positions.iter().map(|position| self.data[*position] - prediction[*position]).collect();
        factor.solve_in_place(&mut residual);
        Ok(dot(&residual, &residual))
    }

    /// L⁻¹ M for a matrix of n_d rows: columns become directions in which the noise has unit variance and no
    /// correlation.
    pub fn whiten(&self, matrix: &DMatrix<f64>) -> DMatrix<f64> {
        assert_eq!(matrix.nrows(), self.rows(), "a matrix row for each measured number");
        let mut whitened = matrix.clone();
        for mut column in whitened.column_iter_mut() {
            self.factor.solve_in_place(column.as_mut_slice());
        }
        whitened
    }

    /// L⁻¹ v for n_d numbers.
    pub(crate) fn whiten_slice(&self, values: &[f64]) -> Vec<f64> {
        let mut whitened = values.to_vec();
        self.factor.solve_in_place(&mut whitened);
        whitened
    }
}
