//! How well the best point fits, as a whole, by survey and by bin.

use super::analysis::Analysis;
use super::drawn_back::expected_amplitudes;
use crate::assemble::{Measurements, Posterior, SurveyMeasurements};
use crate::record::{BestFit, BinGoodness, SurveyGoodness};
use crate::run_error::RunError;
use oddwell_likelihood::{SurveyLikelihood, chi_squared_p_value, share_of_effective_parameters};

pub(super) fn goodness(
    posterior: &Posterior,
    measurements: &Measurements,
    analysis: &Analysis,
) -> Result<BestFit, RunError> {
    let mut surveys = Vec::new();
    for (group, (first, likelihood)) in measurements.groups.iter().zip(posterior.data.with_offsets()) {
        let mut within = 0;
        for survey in &measurements.surveys[group.surveys.clone()] {
            surveys.push(of_survey(posterior, survey, (likelihood, first, within), analysis)?);
            within += survey.table.len();
        }
    }
    let chi2 = posterior.data.chi_squared(&analysis.prediction, &mut Vec::new());
    let data_points = posterior.data.rows();
    let effective = share_of_effective_parameters(&analysis.fisher, &analysis.covariance);
    // χ² of surveys whose covariances come from different mocks has no common distribution.
    let freedom = data_points as f64 - effective;
    let p_value = match posterior.data.surveys() {
        [only] => only.p_value(chi2, freedom),
        all if all.iter().all(|survey| survey.mock_count().is_none()) => {
            chi_squared_p_value(chi2, freedom, None)
        }
        _ => None,
    };
    let sampled = posterior.map.names().iter().cloned().zip(analysis.best.iter().copied());
    let parameters = sampled.chain(expected_amplitudes(posterior, &analysis.prediction)).collect();
    Ok(BestFit {
        parameters,
        log_likelihood: analysis.log_likelihood,
        log_posterior: analysis.log_prior + analysis.log_likelihood,
        chi2,
        data_points,
        effective_parameters: Some(effective).filter(|value| value.is_finite()),
        p_value,
        surveys,
    })
}

/// `first` is the first row of the survey's group among all rows, `within` the survey's first row in the group.
fn of_survey(
    posterior: &Posterior,
    survey: &SurveyMeasurements,
    (likelihood, first, within): (&SurveyLikelihood, usize, usize),
    analysis: &Analysis,
) -> Result<SurveyGoodness, RunError> {
    let prediction = &analysis.prediction[first..first + likelihood.rows()];
    let part = |rows: &[usize]| -> Result<(f64, Option<f64>, Option<f64>), RunError> {
        let rows: Vec<usize> = rows.iter().map(|row| within + row).collect();
        let rows = &rows[..];
        let chi2 = likelihood
            .subset_chi_squared(prediction, rows)
            .map_err(|source| RunError::Likelihood { survey: survey.name.clone(), source })?;
        let information = analysis.part(likelihood, first, rows);
        let effective = share_of_effective_parameters(&information, &analysis.covariance);
        let effective = Some(effective).filter(|value| value.is_finite());
        let freedom = rows.len() as f64 - effective.unwrap_or(0.0);
        Ok((chi2, effective, likelihood.p_value(chi2, freedom)))
    };
    let all: Vec<usize> = (0..survey.table.len()).collect();
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
