//! The departure from each survey and each bin, beside the joint one, and whether they agree.

use super::analysis::{Analysis, prior_precision};
use super::general_relativity::points;
use super::summary::finite;
use crate::assemble::{Measurements, Posterior};
use crate::record::{DepartureByPart, PartAgreement, PartDeparture};
use crate::run_error::RunError;
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{NoiseChoice, SurveyLikelihood, agreement, part_estimates};

/// The prior's gradient is a central difference over this share of its width: exact for a normal prior.
const STEP: f64 = 1e-3;

/// A part of the data: rows among all, and what to call it.
struct Part {
    survey: String,
    bin: Option<String>,
    rows: Vec<usize>,
}

/// The linear problem about the best point, with the departure's amplitude the same everywhere.
struct Linear<'a> {
    posterior: &'a Posterior,
    /// The amplitude there.
    amplitude: f64,
    /// Measured less predicted.
    residual: DVector<f64>,
    /// ∂prediction/∂amplitude.
    by_amplitude: DVector<f64>,
    /// ∂prediction/∂nuisance, rows × nuisances; other parameters of the departure are among them.
    by_nuisance: DMatrix<f64>,
    /// Minus the second, and the first, derivatives of the nuisances' log prior.
    precision: DMatrix<f64>,
    gradient: DVector<f64>,
    /// −2 ∂ln L/∂χ² of each group of surveys.
    weights: Vec<f64>,
}

/// None where there is one bin, or where no parameter of the departure is an amplitude with a value in general relativity.
pub(super) fn by_part(
    posterior: &Posterior,
    measurements: &Measurements,
    analysis: &Analysis,
) -> Result<Option<DepartureByPart>, RunError> {
    let amplitudes: Vec<usize> = points(posterior).iter().map(|point| point.parameter).collect();
    if amplitudes.is_empty() || posterior.model.setup().bins.len() < 2 {
        return Ok(None);
    }
    let linear = Linear::new(posterior, analysis, &amplitudes);
    let (surveys, bins) = parts(posterior, measurements);
    let surveys = if surveys.len() > 1 { surveys } else { Vec::new() };
    let (surveys, survey_agreement) = linear.estimates(surveys)?;
    let (bins, bin_agreement) = linear.estimates(bins)?;
    Ok(Some(DepartureByPart { surveys, survey_agreement, bins, bin_agreement }))
}

fn parts(posterior: &Posterior, measurements: &Measurements) -> (Vec<Part>, Vec<Part>) {
    let mut surveys = Vec::new();
    for (first, survey) in measurements.with_offsets() {
        let rows = (first..first + survey.table.len()).collect();
        surveys.push(Part { survey: survey.name.clone(), bin: None, rows });
    }
    let bins = posterior.model.setup().bins.iter().enumerate().map(|(index, bin)| Part {
        survey: bin.survey.clone(),
        bin: Some(bin.name.clone()),
        rows: (0..measurements.len()).filter(|&row| measurements.rows[row].bin == index).collect(),
    });
    (surveys, bins.collect())
}

impl<'a> Linear<'a> {
    fn new(posterior: &'a Posterior, analysis: &Analysis, amplitudes: &[usize]) -> Linear<'a> {
        let rows = posterior.data.rows();
        let nuisances: Vec<usize> =
            (0..posterior.map.dimension()).filter(|parameter| !amplitudes.contains(parameter)).collect();
        // Several amplitudes (one a bin, or a survey) start from their mean.
        let best = |parameter: &usize| analysis.best[*parameter];
        let amplitude = amplitudes.iter().map(best).sum::<f64>() / amplitudes.len() as f64;
        let mut prediction = DVector::from_column_slice(&analysis.prediction);
        let mut by_amplitude = DVector::zeros(rows);
        for &parameter in amplitudes {
            let column = analysis.jacobian.column(parameter);
            prediction.axpy(amplitude - analysis.best[parameter], &column, 1.0);
            by_amplitude += column;
        }
        let measured = posterior.data.surveys().iter().flat_map(|survey| survey.data().iter().copied());
        let residual = DVector::from_iterator(rows, measured) - &prediction;
        let weights = posterior
            .data
            .with_offsets()
            .map(|(first, survey)| {
                let predicted = &analysis.prediction[first..first + survey.rows()];
                survey.noise().weight(survey.chi_squared(predicted, &mut Vec::new()))
            })
            .collect();
        let all = prior_precision(posterior, &analysis.best);
        Linear {
            posterior,
            amplitude,
            residual,
            by_amplitude,
            by_nuisance: analysis.jacobian.select_columns(&nuisances),
            precision: all.select_rows(&nuisances).select_columns(&nuisances),
            gradient: prior_gradient(posterior, &analysis.best, &nuisances),
            weights,
        }
    }

    /// Each part alone, then all together, with their agreement.
    fn estimates(&self, parts: Vec<Part>) -> Result<(Vec<PartDeparture>, Option<PartAgreement>), RunError> {
        let seen: Vec<Part> = parts
            .into_iter()
            .filter(|part| part.rows.iter().any(|&row| self.by_amplitude[row] != 0.0))
            .collect();
        let together = self.together(&seen);
        let found = together.as_ref().and_then(|found| agreement(&found.values, &found.covariance));
        let mut departures = Vec::new();
        for (index, part) in seen.iter().enumerate() {
            let alone = self.alone(part)?;
            let shift = |shift: f64| finite(self.amplitude + shift);
            let sd = |variance: f64| finite(variance.sqrt());
            departures.push(PartDeparture {
                survey: part.survey.clone(),
                bin: part.bin.clone(),
                value: alone.and_then(|(value, _)| shift(value)),
                sd: alone.and_then(|(_, variance)| sd(variance)),
                together: together.as_ref().and_then(|found| shift(found.values[index])),
                together_sd: together.as_ref().and_then(|found| sd(found.covariance[(index, index)])),
            });
        }
        let agreement = found.map(|found| PartAgreement {
            chi2: found.chi_squared,
            degrees_of_freedom: found.degrees_of_freedom,
            p_value: found.p_value,
        });
        Ok((departures, agreement))
    }

    /// The priors' information and gradient, with room for amplitudes in front.
    fn priors(&self, amplitudes: usize) -> (DMatrix<f64>, DVector<f64>) {
        let nuisances = self.precision.nrows();
        let size = amplitudes + nuisances;
        let mut information = DMatrix::zeros(size, size);
        information.view_mut((amplitudes, amplitudes), (nuisances, nuisances)).copy_from(&self.precision);
        let mut gradient = DVector::zeros(size);
        gradient.rows_mut(amplitudes, nuisances).copy_from(&self.gradient);
        (information, gradient)
    }

    /// One amplitude a part, of all rows.
    fn together(&self, parts: &[Part]) -> Option<oddwell_likelihood::PartEstimates> {
        let (mut information, mut gradient) = self.priors(parts.len());
        let mut columns = DMatrix::zeros(self.residual.len(), parts.len());
        for (index, part) in parts.iter().enumerate() {
            for &row in &part.rows {
                columns[(row, index)] = self.by_amplitude[row];
            }
        }
        for ((first, survey), weight) in self.posterior.data.with_offsets().zip(&self.weights) {
            let rows: Vec<usize> = (first..first + survey.rows()).collect();
            self.add(survey, &columns.select_rows(&rows), &rows, *weight, (&mut information, &mut gradient));
        }
        part_estimates(&information, &gradient, parts.len())
    }

    /// The amplitude and its variance from the rows of one part, by their own block of the covariance.
    fn alone(&self, part: &Part) -> Result<Option<(f64, f64)>, RunError> {
        let (mut information, mut gradient) = self.priors(1);
        for ((first, survey), weight) in self.posterior.data.with_offsets().zip(&self.weights) {
            let own = first..first + survey.rows();
            let rows: Vec<usize> = part.rows.iter().copied().filter(|row| own.contains(row)).collect();
            if rows.is_empty() {
                continue;
            }
            let within: Vec<usize> = rows.iter().map(|row| row - first).collect();
            let block = SurveyLikelihood::from_covariance(
                survey.data().select_rows(&within),
                survey.covariance().select(&within),
                &NoiseChoice::gaussian(),
            )
            .map_err(|source| RunError::Likelihood { survey: part.survey.clone(), source })?;
            let column = DMatrix::from_fn(rows.len(), 1, |row, _| self.by_amplitude[rows[row]]);
            self.add(&block, &column, &rows, *weight, (&mut information, &mut gradient));
        }
        let found = part_estimates(&information, &gradient, 1);
        Ok(found.map(|found| (found.values[0], found.covariance[(0, 0)])))
    }

    /// Adds information and gradient of some rows, whose likelihood is `survey`.
    fn add(
        &self,
        survey: &SurveyLikelihood,
        amplitudes: &DMatrix<f64>,
        rows: &[usize],
        weight: f64,
        (information, gradient): (&mut DMatrix<f64>, &mut DVector<f64>),
    ) {
        let parts = amplitudes.ncols();
        let nuisances = self.by_nuisance.ncols();
        let mut all = DMatrix::zeros(rows.len(), parts + nuisances + 1);
        all.columns_mut(0, parts).copy_from(amplitudes);
        all.columns_mut(parts, nuisances).copy_from(&self.by_nuisance.select_rows(rows));
        all.column_mut(parts + nuisances).copy_from(&self.residual.select_rows(rows));
        let whitened = survey.whiten(&all);
        let directions = whitened.columns(0, parts + nuisances);
        *information += directions.tr_mul(&directions) * weight;
        *gradient += directions.tr_mul(&whitened.column(parts + nuisances)) * weight;
    }
}

/// ∂ log prior/∂nuisance; 0 where the prior ends within a step.
fn prior_gradient(posterior: &Posterior, best: &[f64], nuisances: &[usize]) -> DVector<f64> {
    DVector::from_iterator(
        nuisances.len(),
        nuisances.iter().map(|&parameter| {
            let step = STEP * posterior.priors.spread(parameter);
            let at = |offset: f64| {
                let mut point = best.to_vec();
                point[parameter] += offset;
                posterior.priors.log_density(&point)
            };
            let slope = (at(step) - at(-step)) / (2.0 * step);
            if slope.is_finite() { slope } else { 0.0 }
        }),
    )
}
