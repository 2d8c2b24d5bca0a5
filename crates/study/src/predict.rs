//! The prediction beside the measurements.

use crate::assemble::{Measurements, Posterior, read_measurements};
use crate::resolve::{Hypothesis, Study};
use crate::run_error::RunError;
use oddwell_likelihood::Axis;
use oddwell_model::{EffectName, Workspace};
use oddwell_sampler::Target;
use serde::Serialize;

/// One measured row and what the model says of it.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct PredictedRow {
    /// The survey.
    pub survey: String,
    /// The bin.
    pub bin: String,
    /// The pair.
    pub pair: String,
    /// ℓ.
    pub multipole: u8,
    /// Mpc/h; none in Fourier space.
    pub separation: Option<f64>,
    /// h/Mpc; none in separation space.
    pub wavenumber: Option<f64>,
    /// The measured value; withheld while the measurements are blinded.
    pub measured: Option<f64>,
    /// Its standard deviation, from the covariance.
    pub error: f64,
    /// The prediction.
    pub predicted: f64,
}

/// Predicts every kept row at the centre of the priors and the values held.
///
/// # Errors
/// [`RunError`] where the data can't be read or the model has no prediction there.
pub fn predict(study: &Study, hypothesis: &Hypothesis) -> Result<Vec<PredictedRow>, RunError> {
    let measurements = read_measurements(study)?;
    let posterior = Posterior::new(study, hypothesis, &measurements)?;
    let prediction = posterior.predict(&hypothesis.start(), &mut posterior.scratch())?;
    Ok(beside(study, &measurements, prediction))
}

/// What each physical effect contributes: its name, and a number a row.
pub type EffectColumns = Vec<(String, Vec<f64>)>;

/// As [`predict`], and what each physical effect contributes to each row: a name ([`EffectName::name`]) and a column in
/// the order of the rows, and `templates` where the study has any. The columns add up to the prediction; an effect that the study switches off is a column of zeros.
///
/// # Errors
/// As [`predict`].
///
/// [`EffectName::name`]: oddwell_model::EffectName::name
pub fn predict_by_effect(
    study: &Study,
    hypothesis: &Hypothesis,
) -> Result<(Vec<PredictedRow>, EffectColumns), RunError> {
    let measurements = read_measurements(study)?;
    let posterior = Posterior::new(study, hypothesis, &measurements)?;
    let values = posterior.values(&hypothesis.start());
    let prediction = posterior.predict_values(&values, &mut posterior.scratch())?;
    let effects = posterior.model.by_effect(&values, &mut Workspace::new())?;
    // A window is linear, so it applies to each.
    let measured = |(effect, predicted): (EffectName, Vec<f64>)| {
        (effect.name().to_owned(), posterior.projected(&predicted))
    };
    let mut columns: EffectColumns = effects.into_iter().map(measured).collect();
    columns.extend(posterior.of_templates(&values).map(|added| ("templates".to_owned(), added)));
    Ok((beside(study, &measurements, prediction), columns))
}

fn beside(study: &Study, measurements: &Measurements, prediction: Vec<f64>) -> Vec<PredictedRow> {
    let mut predicted = prediction.into_iter();
    let mut rows = Vec::with_capacity(measurements.len());
    for survey in &measurements.surveys {
        let errors = survey.likelihood.covariance().standard_deviations();
        for ((row, error), predicted) in survey.table.rows.iter().zip(errors).zip(&mut predicted) {
            let at = |axis| (row.axis == axis).then_some(row.at);
            rows.push(PredictedRow {
                survey: survey.name.clone(),
                bin: row.bin.clone(),
                pair: row.pair.clone(),
                multipole: row.multipole,
                separation: at(Axis::Separation),
                wavenumber: at(Axis::Wavenumber),
                measured: study.file.blinding.is_none().then_some(row.value),
                error,
                predicted,
            });
        }
    }
    rows
}
