//! Several surveys that share no volume: their likelihoods multiply.

use nalgebra::DMatrix;

use crate::compressed::CompressedLikelihood;
use crate::survey::{LikelihoodError, SurveyLikelihood};

/// Surveys whose rows follow each other in one vector of predictions. Surveys that share volume are one
/// [`SurveyLikelihood`], with one covariance and one mock count.
#[derive(Clone, Debug, Default)]
pub struct SurveySet {
    surveys: Vec<SurveyLikelihood>,
}

impl SurveySet {
    /// Surveys in the order of the predictions.
    pub fn new(surveys: Vec<SurveyLikelihood>) -> Self {
        Self { surveys }
    }

    /// The surveys.
    pub fn surveys(&self) -> &[SurveyLikelihood] {
        &self.surveys
    }

    /// Measured numbers of all surveys.
    pub fn rows(&self) -> usize {
        self.surveys.iter().map(SurveyLikelihood::rows).sum()
    }

    /// Each survey with the position of its first row.
    pub fn with_offsets(&self) -> impl Iterator<Item = (usize, &SurveyLikelihood)> {
        self.surveys.iter().scan(0, |first, survey| {
            let offset = *first;
            *first += survey.rows();
            Some((offset, survey))
        })
    }

    /// Sum of the surveys' χ²; see [`SurveyLikelihood::chi_squared`].
    pub fn chi_squared(&self, prediction: &[f64], scratch: &mut Vec<f64>) -> f64 {
        self.sum(prediction, |survey, rows| survey.chi_squared(rows, scratch))
    }

    /// Sum of the surveys' log-likelihoods; see [`SurveyLikelihood::log_likelihood`].
    pub fn log_likelihood(&self, prediction: &[f64], scratch: &mut Vec<f64>) -> f64 {
        self.sum(prediction, |survey, rows| survey.log_likelihood(rows, scratch))
    }

    fn sum(&self, prediction: &[f64], mut term: impl FnMut(&SurveyLikelihood, &[f64]) -> f64) -> f64 {
        assert_eq!(prediction.len(), self.rows(), "a predicted number for each row");
        self.with_offsets()
            .map(|(first, survey)| term(survey, &prediction[first..first + survey.rows()]))
            .sum()
    }

    /// JᵀC⁻¹J summed over surveys, `jacobian` with a row for each measured number; see
    /// [`SurveyLikelihood::fisher_information`].
    pub fn fisher_information(&self, jacobian: &DMatrix<f64>) -> DMatrix<f64> {
        assert_eq!(jacobian.nrows(), self.rows(), "a row for each measured number");
        let zero = DMatrix::zeros(jacobian.ncols(), jacobian.ncols());
        self.with_offsets().fold(zero, |sum, (first, survey)| {
            sum + survey.fisher_information(&jacobian.rows(first, survey.rows()).into_owned())
        })
    }

    /// Compresses every survey with its rows of the kernels. A coefficient costs a survey time only where its
    /// kernel has an entry in that survey's rows.
    ///
    /// # Errors
    /// As [`CompressedLikelihood::new`].
    pub fn compress(&self, kernels: &DMatrix<f64>) -> Result<CompressedSet, LikelihoodError> {
        if kernels.nrows() != self.rows() {
            return Err(LikelihoodError::KernelRows { expected: self.rows(), found: kernels.nrows() });
        }
        let compress = |(first, survey): (usize, &SurveyLikelihood)| {
            CompressedLikelihood::new(survey, &kernels.rows(first, survey.rows()).into_owned())
        };
        Ok(CompressedSet { surveys: self.with_offsets().map(compress).collect::<Result<_, _>>()? })
    }
}

/// Compressed surveys that take the same coefficients.
#[derive(Clone, Debug)]
pub struct CompressedSet {
    surveys: Vec<CompressedLikelihood>,
}

impl CompressedSet {
    /// The surveys.
    pub fn surveys(&self) -> &[CompressedLikelihood] {
        &self.surveys
    }

    /// Sum of the surveys' χ².
    pub fn chi_squared(&self, coefficients: &[f64]) -> f64 {
        self.surveys.iter().map(|survey| survey.chi_squared(coefficients)).sum()
    }

    /// Sum of the surveys' log-likelihoods; allocates nothing.
    pub fn log_likelihood(&self, coefficients: &[f64]) -> f64 {
        self.surveys.iter().map(|survey| survey.log_likelihood(coefficients)).sum()
    }

    /// Sum of the surveys' information; see [`CompressedLikelihood::fisher_information`].
    pub fn fisher_information(&self, coefficient_jacobian: &DMatrix<f64>) -> DMatrix<f64> {
        let parameters = coefficient_jacobian.ncols();
        self.surveys.iter().fold(DMatrix::zeros(parameters, parameters), |sum, survey| {
            sum + survey.fisher_information(coefficient_jacobian)
        })
    }
}
