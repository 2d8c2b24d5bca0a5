//! How well the best point fits, as a whole, by survey and by bin.

use super::analysis::Analysis;
use crate::assemble::{Measurements, Posterior, SurveyMeasurements};
use crate::record::{BestFit, BinGoodness, SurveyGoodness};
use crate::run_error::RunError;
use oddwell_likelihood::{chi_squared_p_value, share_of_effective_parameters};

pub(super) fn goodness(
    posterior: &Posterior,
    measurements: &Measurements,
    analysis: &Analysis,
) -> Result<BestFit, RunError> {
    let mut surveys = Vec::new();
    for ((first, _), survey) in posterior.data.with_offsets().zip(&measurements.surveys) {
        surveys.push(of_survey(posterior, survey, first, analysis)?);
    }
    let chi2 = surveys.iter().map(|survey| survey.chi2).sum();
    let data_points = posterior.data.rows();
    let effective = share_of_effective_parameters(&analysis.fisher, &analysis.covariance);
    // χ² of surveys whose covariances come from different mocks has no common distribution.
    let p_value = match (&surveys[..], posterior.data.surveys()) {
        ([only], _) => only.p_value,
        (_, all) if all.iter().all(|survey| survey.mock_count().is_none()) => {
            chi_squared_p_value(chi2, data_points as f64 - effective, None)
        }
        _ => None,
    };
    Ok(BestFit {
        parameters: posterior.map.names().iter().cloned().zip(analysis.best.iter().copied()).collect(),
        log_likelihood: analysis.log_likelihood,
        log_posterior: analysis.log_prior + analysis.log_likelihood,
        chi2,
        data_points,
        effective_parameters: Some(effective).filter(|value| value.is_finite()),
        p_value,
        surveys,
    })
}

fn of_survey(
    posterior: &Posterior,
    survey: &SurveyMeasurements,
    first: usize,
    analysis: &Analysis,
) -> Result<SurveyGoodness, RunError> {
    let likelihood = &survey.likelihood;
    let prediction = &analysis.prediction[first..first + likelihood.rows()];
    let part = |rows: &[usize]| -> Result<(f64, Option<f64>, Option<f64>), RunError> {
        let chi2 = likelihood
            .subset_chi_squared(prediction, rows)
            .map_err(|source| RunError::Likelihood { survey: survey.name.clone(), source })?;
        let information = analysis.part(likelihood, first, rows);
        let effective = share_of_effective_parameters(&information, &analysis.covariance);
        let effective = Some(effective).filter(|value| value.is_finite());
        let freedom = rows.len() as f64 - effective.unwrap_or(0.0);
        Ok((chi2, effective, likelihood.p_value(chi2, freedom)))
    };
    let all: Vec<usize> = (0..likelihood.rows()).collect();
    let (chi2, effective_parameters, p_value) = part(&all)?;
    let mut bins = Vec::new();
    for (index, bin) in posterior.model.setup().bins.iter().enumerate() {
        let rows = survey.rows_of(index);
        if rows.is_empty() {
            continue;
        }
        let (chi2, effective_parameters, p_value) = part(&rows)?;
        let name = bin.name.clone();
        bins.push(BinGoodness { name, chi2, data_points: rows.len(), effective_parameters, p_value });
    }
    let name = survey.name.clone();
    Ok(SurveyGoodness { name, chi2, data_points: all.len(), effective_parameters, p_value, bins })
}
