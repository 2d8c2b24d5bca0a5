//! The normal approximation around the best point: derivatives of the prediction, information, covariances.

use crate::assemble::{Posterior, PosteriorScratch};
use crate::run_error::RunError;
use nalgebra::DMatrix;
use oddwell_likelihood::{NoiseChoice, SurveyLikelihood, inverse_information};
use oddwell_sampler::{Chain, Target};

/// Derivatives are central differences over this share of a parameter's posterior standard deviation. The prediction is
/// a polynomial of low order in the parameters: the cubic term that this leaves is 1e-6 of a standard deviation's change,
/// rounding 1e-13 of the prediction over it.
const STEP: f64 = 1e-3;

/// What the summary needs besides the chain itself.
pub(crate) struct Analysis {
    /// The highest posterior density found.
    pub(crate) best: Vec<f64>,
    pub(crate) log_prior: f64,
    pub(crate) log_likelihood: f64,
    /// The prediction there.
    pub(crate) prediction: Vec<f64>,
    /// ∂prediction/∂parameter there, rows × parameters.
    pub(crate) jacobian: DMatrix<f64>,
    /// Fisher information of all data.
    pub(crate) fisher: DMatrix<f64>,
    /// Covariance of data and priors together.
    pub(crate) covariance: DMatrix<f64>,
    /// Covariance of the priors; a family without variance enters with the spread of its central 68 %.
    pub(crate) prior_covariance: DMatrix<f64>,
}

/// A point, and how far its coordinates spread around it.
#[derive(Clone, Debug)]
pub(crate) struct PointAndWidths {
    pub(crate) point: Vec<f64>,
    /// Posterior standard deviations; 0 where unknown.
    pub(crate) widths: Vec<f64>,
}

impl Analysis {
    pub(super) fn new(
        posterior: &Posterior,
        chain: &Chain,
        scratch: &mut PosteriorScratch,
    ) -> Result<Analysis, RunError> {
        let visited = &chain.best;
        let (mut best, mut log_prior, mut log_likelihood) =
            (visited.point.clone(), visited.log_prior, visited.log_likelihood);
        if let Some(peak) =
            chain.peak.as_ref().filter(|peak| peak.log_posterior >= log_prior + log_likelihood)
        {
            best.clone_from(&peak.point);
            (log_prior, log_likelihood) = (peak.log_prior, peak.log_likelihood);
        }
        let widths = chain.diagnostics.iter().map(|diagnostics| diagnostics.sd).collect();
        let found = Analysis::at(posterior, &PointAndWidths { point: best, widths }, scratch)?;
        Ok(Analysis { log_prior, log_likelihood, ..found })
    }

    /// Around a point that is taken for the best.
    pub(crate) fn at(
        posterior: &Posterior,
        best: &PointAndWidths,
        scratch: &mut PosteriorScratch,
    ) -> Result<Analysis, RunError> {
        let point = best.point.clone();
        let prediction = posterior.predict(&point, scratch)?;
        let jacobian = jacobian(posterior, best, scratch)?;
        let mut fisher = DMatrix::zeros(point.len(), point.len());
        for (first, survey) in posterior.data.with_offsets() {
            let rows: Vec<usize> = (0..survey.rows()).collect();
            fisher += information(survey, first, &rows, &prediction, &jacobian);
        }
        let prior = prior_precision(posterior, &point);
        let covariance = inverse_information(&(&fisher + &prior));
        let prior_covariance = prior_covariance(posterior);
        Ok(Analysis {
            log_prior: posterior.log_prior(&point),
            log_likelihood: posterior.log_likelihood(&point, scratch).unwrap_or(f64::NAN),
            best: point,
            prediction,
            jacobian,
            fisher,
            covariance,
            prior_covariance,
        })
    }

    /// The Fisher information of some rows of a survey (positions within it; `first` is its first row), by their own
    /// block of the covariance.
    pub(crate) fn part(&self, survey: &SurveyLikelihood, first: usize, rows: &[usize]) -> DMatrix<f64> {
        information(survey, first, rows, &self.prediction, &self.jacobian)
    }
}

fn information(
    survey: &SurveyLikelihood,
    first: usize,
    rows: &[usize],
    prediction: &[f64],
    jacobian: &DMatrix<f64>,
) -> DMatrix<f64> {
    let all = survey.rows();
    let mut residuals = Vec::new();
    let chi_squared = survey.chi_squared(&prediction[first..first + all], &mut residuals);
    let weight = survey.noise().weight(chi_squared);
    let selected: Vec<usize> = rows.iter().map(|row| first + row).collect();
    let part = jacobian.select_rows(&selected);
    if rows.len() == all {
        return survey.fisher_information(&part) * weight;
    }
    let data = survey.data().select_rows(rows);
    let covariance = survey.covariance().select(rows);
    // A block of a definite covariance is definite.
    SurveyLikelihood::from_covariance(data, covariance, &NoiseChoice::gaussian()).map_or_else(
        |_| DMatrix::zeros(part.ncols(), part.ncols()),
        |block| block.fisher_information(&part) * weight,
    )
}

fn jacobian(
    posterior: &Posterior,
    PointAndWidths { point: best, widths }: &PointAndWidths,
    scratch: &mut PosteriorScratch,
) -> Result<DMatrix<f64>, RunError> {
    let mut jacobian = DMatrix::zeros(posterior.data.rows(), posterior.dimension());
    for parameter in 0..posterior.dimension() {
        let sd = widths[parameter];
        let width = if sd > 0.0 { sd } else { posterior.priors.spread(parameter) };
        let (low, high) = posterior.priors.support(parameter);
        let step = STEP * width;
        let at = |offset: f64| (best[parameter] + offset).clamp(low, high);
        let (below, above) = (at(-step), at(step));
        let mut point = best.clone();
        point[parameter] = above;
        let upper = posterior.predict(&point, scratch)?;
        point[parameter] = below;
        let lower = posterior.predict(&point, scratch)?;
        for (row, (upper, lower)) in upper.iter().zip(&lower).enumerate() {
            jacobian[(row, parameter)] = (upper - lower) / (above - below);
        }
    }
    Ok(jacobian)
}

/// What the priors add to the information: their curvature, and nothing where they are not concave.
pub(super) fn prior_precision(posterior: &Posterior, point: &[f64]) -> DMatrix<f64> {
    let mut precision = posterior.priors.precision(point);
    for &parameter in posterior.priors.independent() {
        let curvature = precision[(parameter, parameter)];
        precision[(parameter, parameter)] = if curvature.is_finite() { curvature.max(0.0) } else { 0.0 };
    }
    precision
}

fn prior_covariance(posterior: &Posterior) -> DMatrix<f64> {
    let size = posterior.dimension();
    let mut covariance = DMatrix::zeros(size, size);
    for &parameter in posterior.priors.independent() {
        let sd = posterior.priors.standard_deviation(parameter);
        let sd = if sd.is_finite() { sd } else { posterior.priors.spread(parameter) };
        covariance[(parameter, parameter)] = sd * sd;
    }
    for block in posterior.priors.joint() {
        for (row, &i) in block.of().iter().enumerate() {
            for (column, &j) in block.of().iter().enumerate() {
                covariance[(i, j)] = block.covariance()[(row, column)];
            }
        }
    }
    covariance
}
