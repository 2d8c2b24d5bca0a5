//! The likelihood of one survey's measurements, for a prediction given number by number.

use std::sync::Arc;

use nalgebra::{DMatrix, DVector};

use crate::covariance::{Covariance, CovarianceError};
use crate::goodness::chi_squared_p_value;
use crate::noise::{NoiseChoice, NoiseError, NoiseModel};
use crate::templates::{AmplitudePrior, Marginal, TemplateError, orthonormal, project_out};
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
    /// A template to integrate out is.
    #[error(transparent)]
    Template(#[from] TemplateError),
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
    pub(crate) marginal: Option<Arc<Marginal>>,
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
        Ok(Self { data, covariance, factor, log_determinant, choice: *noise, noise: model, marginal: None })
    }

    /// The same measurements with another noise model; the factor is kept where there are no templates.
    ///
    /// # Errors
    /// A mock count that is missing or too small; noise that is not normal where templates are integrated out.
    pub fn with_noise(mut self, noise: &NoiseChoice) -> Result<Self, NoiseError> {
        if let Some(marginal) = &self.marginal {
            return marginal.base.as_ref().clone().with_noise(noise)?.with_templates_of(marginal);
        }
        self.noise = noise.build(self.rows(), self.log_determinant)?;
        self.choice = *noise;
        Ok(self)
    }

    /// The same survey with other measured values (a simulated one, say). As many as before.
    pub fn with_data(mut self, data: DVector<f64>) -> Self {
        assert_eq!(data.len(), self.rows(), "a value for each row");
        if let Some(marginal) = &mut self.marginal {
            let base = Box::new(marginal.base.as_ref().clone().with_data(data.clone()));
            *marginal = Arc::new(Marginal { base, ..marginal.as_ref().clone() });
        }
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

    /// Their covariance: as given, or with templates of normal amplitude in it ([`Self::with_templates`]).
    pub fn covariance(&self) -> &Covariance {
        &self.covariance
    }

    /// The covariance of the noise alone, without templates.
    pub fn noise_covariance(&self) -> &Covariance {
        self.marginal.as_ref().map_or(&self.covariance, |marginal| &marginal.base.covariance)
    }

    /// ln det C.
    pub fn log_determinant(&self) -> f64 {
        self.log_determinant
    }

    /// The noise model.
    pub fn noise(&self) -> &dyn NoiseModel {
        self.noise.as_ref()
    }

    pub(crate) fn choice(&self) -> &NoiseChoice {
        &self.choice
    }

    pub(crate) fn set_noise(&mut self, noise: Arc<dyn NoiseModel>) {
        self.noise = noise;
    }

    pub(crate) fn factor(&self) -> &LowerTriangle {
        &self.factor
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
        if let Some(marginal) = &self.marginal {
            scratch.iter_mut().zip(&marginal.shift).for_each(|(residual, shift)| *residual -= shift);
        }
        self.whiten_in_place(scratch);
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
        let data = self.centred_data();
        let mut residual: Vec<f64> =
            positions.iter().map(|position| data[*position] - prediction[*position]).collect();
        factor.solve_in_place(&mut residual);
        let flat = self.templates().iter().filter(|template| template.prior == AmplitudePrior::Flat);
        let (projected, _) = orthonormal(&factor, flat, positions.len(), Some(positions))?;
        project_out(&projected, &mut residual);
        Ok(dot(&residual, &residual))
    }

    /// L⁻¹ M for a matrix of n_d rows: columns become directions in which the noise has unit variance and no
    /// correlation. Directions of flat templates are taken out.
    pub fn whiten(&self, matrix: &DMatrix<f64>) -> DMatrix<f64> {
        assert_eq!(matrix.nrows(), self.rows(), "a matrix row for each measured number");
        let mut whitened = matrix.clone();
        for mut column in whitened.column_iter_mut() {
            self.whiten_in_place(column.as_mut_slice());
        }
        whitened
    }

    /// L⁻¹ v for n_d numbers.
    pub(crate) fn whiten_slice(&self, values: &[f64]) -> Vec<f64> {
        let mut whitened = values.to_vec();
        self.whiten_in_place(&mut whitened);
        whitened
    }

    fn whiten_in_place(&self, values: &mut [f64]) {
        self.factor.solve_in_place(values);
        if let Some(marginal) = &self.marginal {
            project_out(&marginal.projected, values);
        }
    }

    /// The measured numbers less the templates at their prior means.
    pub(crate) fn centred_data(&self) -> Vec<f64> {
        let mut data = self.data.as_slice().to_vec();
        if let Some(marginal) = &self.marginal {
            data.iter_mut().zip(&marginal.shift).for_each(|(value, shift)| *value -= shift);
        }
        data
    }

    /// What connects rows: the covariance, and flat templates as if they were in it.
    pub(crate) fn connections(&self) -> DMatrix<f64> {
        let mut matrix = self.covariance.matrix().clone();
        for template in self.templates().iter().filter(|template| template.prior == AmplitudePrior::Flat) {
            let touched: Vec<usize> = (0..self.rows()).filter(|row| template.shape[*row] != 0.0).collect();
            for (i, j) in touched.iter().flat_map(|i| touched.iter().map(move |j| (*i, *j))) {
                matrix[(i, j)] = 1.0;
            }
        }
        matrix
    }
}
