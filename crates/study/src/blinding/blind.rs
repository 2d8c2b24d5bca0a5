//! `oddwell blind`.

use super::frozen::{FROZEN_FILE, Frozen, FrozenRow};
use super::secret::{Phrase, fresh_salt};
use crate::assemble::{Measurements, Posterior, PosteriorScratch, read_measurements, read_rows_only};
use crate::checksum::sha256;
use crate::copy::StudyCopy;
use crate::resolve::{Hypothesis, Study};
use crate::run_error::RunError;
use nalgebra::DMatrix;
use oddwell_likelihood::posterior_covariance;
use oddwell_model::{FeltBy, Model, ModelSetup, Workspace, departures};
use oddwell_sampler::Target;
use std::path::{Path, PathBuf};

/// The secret departure's standard deviation, in units of the one expected of the measurement.
const WIDTH: f64 = 3.0;

/// How the note in front of a blinded study begins.
pub(super) const NOTE_START: &str = "# BLINDED:";

/// A blinded study.
#[derive(Clone, Debug, PartialEq)]
pub struct Blinded {
    /// The study file written.
    pub study: PathBuf,
    /// Standard deviation of the secret departure.
    pub width: f64,
    /// The standard deviation that the study expects to measure the departure to.
    pub expected: f64,
}

/// Shifts every measured row (those that `keep` cuts too) by the predicted difference between a secret departure, drawn
/// from the phrase, and none, at the centre of the priors of the study's first hypothesis with an inferred departure; and
/// writes a complete blinded study.
///
/// # Errors
/// [`RunError::Blinded`] for a study that is blinded already; [`RunError::Phrase`]; [`RunError::NothingInferred`] where no
/// hypothesis has a departure to infer; and where the study can't be read or the folder can't be written.
pub fn blind(study: &Study, phrase_file: &Path, folder: &Path) -> Result<Blinded, RunError> {
    if study.file.blinding.is_some() {
        return Err(RunError::Blinded { what: "the study", way_out: "reveal it before blinding it anew" });
    }
    let phrase = Phrase::read(phrase_file)?;
    let hypothesis = study.default_hypothesis();
    if hypothesis.watched().is_empty() {
        return Err(RunError::NothingInferred { hypothesis: hypothesis.name.clone() });
    }
    let kept = read_measurements(study)?;
    let expected = expected_deviation(study, hypothesis, &kept)?;
    let measurements = read_rows_only(&without_keep(study))?;
    let posterior = Posterior::new(study, hypothesis, &measurements)?;
    let values = posterior.values(&hypothesis.start());
    let changes = change_per_tau(&posterior, &values)?;
    let salt = fresh_salt();
    let width = rounded_up(WIDTH * expected);
    let secret = phrase.departure(&salt, width);
    let measured =
        measurements.surveys.iter().flat_map(|survey| survey.table.rows.iter().map(|row| row.value));
    let shifted: Vec<f64> = measured.zip(&changes).map(|(value, change)| value + secret * change).collect();
    let names = posterior.model.layout().names().iter().cloned();
    let frozen = Frozen {
        version: concat!("oddwell ", env!("CARGO_PKG_VERSION")).to_owned(),
        study_sha256: sha256(study.file.source.text().as_bytes()),
        quantities: names.zip(values).collect(),
        change_per_tau: FrozenRow::of(&measurements, &changes),
    };
    let note = "BLINDED: the measurements are shifted by a secret departure. `oddwell reveal` undoes it, with the phrase.";
    let appendix = format!(
        "\n[blinding]                       # written by `oddwell blind`; don't edit\ncommitment = \"{}\"\nsalt = \"{salt}\"\nwidth = {width:?}\nfrozen = \"{FROZEN_FILE}\"\n",
        phrase.commitment(&salt)
    );
    // Numbers and strings always serialise.
    let content = serde_json::to_vec_pretty(&frozen).unwrap_or_default();
    let copy = StudyCopy::new(study, &measurements, &shifted, note, &appendix)?;
    let study = copy.with_file(FROZEN_FILE, content).write(folder)?;
    Ok(Blinded { study, width, expected })
}

/// The study with no row cut: a row that is left as it was measured would give the shift away.
pub(super) fn without_keep(study: &Study) -> Study {
    let mut open = study.clone();
    for survey in &mut open.file.surveys {
        survey.keep.clear();
    }
    open
}

/// To two digits, upwards.
fn rounded_up(value: f64) -> f64 {
    let unit = 10.0_f64.powf(value.log10().floor() - 1.0);
    (value / unit).ceil() * unit
}

/// What the study expects to measure the first parameter of the departure to, from its covariances and priors alone.
fn expected_deviation(
    study: &Study,
    hypothesis: &Hypothesis,
    measurements: &Measurements,
) -> Result<f64, RunError> {
    let posterior = Posterior::new(study, hypothesis, measurements)?;
    let mut scratch = posterior.scratch();
    let centre = hypothesis.start();
    let jacobian = jacobian(&posterior, &centre, &mut scratch)?;
    let fisher = posterior.data.fisher_information(&jacobian);
    let spreads = (0..posterior.dimension()).map(|parameter| posterior.priors.spread(parameter).powi(2));
    let prior = DMatrix::from_diagonal(&nalgebra::DVector::from_iterator(posterior.dimension(), spreads));
    let tau = hypothesis.watched()[0];
    let covariance = posterior_covariance(&fisher, &prior);
    Ok(covariance.map_or_else(|| posterior.priors.spread(tau), |covariance| covariance[(tau, tau)].sqrt()))
}

fn jacobian(
    posterior: &Posterior,
    centre: &[f64],
    scratch: &mut PosteriorScratch,
) -> Result<DMatrix<f64>, RunError> {
    let plain = posterior.predict(centre, scratch)?;
    let mut jacobian = DMatrix::zeros(plain.len(), centre.len());
    for parameter in 0..centre.len() {
        let step = 1e-3 * posterior.priors.spread(parameter);
        let mut moved = centre.to_vec();
        moved[parameter] += step;
        for (row, value) in posterior.predict(&moved, scratch)?.iter().enumerate() {
            jacobian[(row, parameter)] = (value - plain[row]) / step;
        }
    }
    Ok(jacobian)
}

/// The predicted change of every measured row for a constant departure of 1 felt by light.
fn change_per_tau(posterior: &Posterior, values: &[f64]) -> Result<Vec<f64>, RunError> {
    let Some(constant) = departures::find("constant") else { return Ok(Vec::new()) };
    let setup = ModelSetup { departure: constant, felt_by: FeltBy::Light, ..posterior.model.setup().clone() };
    let model = Model::new(setup)?;
    let names = model.layout().names();
    let mut carried: Vec<f64> = names
        .iter()
        .map(|name| posterior.model.layout().index(name).map_or(0.0, |slot| values[slot]))
        .collect();
    let mut workspace = Workspace::new();
    let mut predict = |values: &[f64]| -> Result<Vec<f64>, RunError> {
        let mut rows = vec![0.0; model.setup().rows.len()];
        model.predict(values, &mut workspace, &mut rows)?;
        Ok(posterior.projected(&rows))
    };
    let Some(tau) = model.layout().index("departure.tau") else { return Ok(Vec::new()) };
    carried[tau] = 0.0;
    let without = predict(&carried)?;
    carried[tau] = 1.0;
    let with = predict(&carried)?;
    Ok(with.iter().zip(&without).map(|(with, without)| with - without).collect())
}
