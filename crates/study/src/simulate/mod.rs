//! `oddwell simulate`: measurements drawn from a study's own model, with the study's covariances or those of Gaussian fields
//! for the survey's design.

mod planned;
mod truth;

use crate::assemble::{Posterior, predict_elsewhere, read_measurements};
use crate::copy::StudyCopy;
use crate::file::StudyFile;
use crate::resolve::{Hypothesis, State, Study};
use crate::run_error::RunError;
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::npy_bytes;
use oddwell_model::{FeltBy, ModelSetup, departures};
use oddwell_sampler::Target;
use planned::Plan;
pub(crate) use planned::sampling;
use rand::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use rand_xoshiro::Xoshiro256PlusPlus;
use std::path::{Path, PathBuf};
use truth::{truth_table, truth_values};

/// Where the parameters of a simulation come from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Truth {
    /// The centre of each prior, and what is held.
    Centre,
    /// A draw from the priors.
    Prior,
}

/// What to draw.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Draw {
    /// Where the parameters come from.
    pub truth: Truth,
    /// Seed of every random number.
    pub seed: u64,
    /// How many mock measurements to draw of each survey, whose covariance is then estimated from them; 0: none.
    pub mocks: usize,
}

/// A simulated study.
#[derive(Clone, Debug, PartialEq)]
pub struct Simulated {
    /// The study file written.
    pub study: PathBuf,
    /// The truth: names and values of what the hypothesis infers in the study file, and of what was set besides.
    pub truth: Vec<(String, f64)>,
}

/// Draws one measurement of every row from a hypothesis, and writes a complete study with `truth.csv` beside it.
///
/// A survey with a design ([`DesignSection`](crate::file::DesignSection)) needs neither measurements nor covariance: its rows
/// are those of the design, its covariance that of Gaussian fields
/// ([`gaussian_covariance`](oddwell_model::covariance::gaussian_covariance)) in general relativity at the centre of the priors
/// *of the study file* (`--set` aside), as an analyst would make it who does not know the truth. Values of such a survey carry
/// seven digits, covariances nine. Any other survey is drawn with its covariance as given, whatever the noise model; its rows
/// that `keep` cuts stay as they were measured, but where mocks are drawn. Noise is normal. Surveys and bins of a design share
/// no volume.
///
/// Mocks are as many more measurements with the same covariance, about general relativity at the centre of the priors of the
/// study file: `SURVEY-mocks.npy`, a mock a row, a column for each row of the survey's table. The written study estimates its
/// covariance from them.
///
/// The same study, seed and version give the same bytes.
///
/// # Errors
/// [`RunError`] where the study can't be read, has no prediction at the truth, is blinded, has a noise model that needs mocks
/// without any, or where the folder exists or can't be written.
pub fn simulate_study(
    study: &Study,
    hypothesis: &Hypothesis,
    draw: Draw,
    folder: &Path,
) -> Result<Simulated, RunError> {
    if folder.symlink_metadata().is_ok() {
        return Err(RunError::FolderExists { path: folder.to_owned() });
    }
    let (copy, truth) = drawn(study, hypothesis, draw)?;
    let study = copy.with_file("truth.csv", truth_table(&truth).into_bytes()).write(folder)?;
    Ok(Simulated { study, truth })
}

/// Parameters by name.
type Named = Vec<(String, f64)>;

/// As [`simulate_study`], without writing it: the study's files and the truth.
pub(crate) fn drawn(
    study: &Study,
    hypothesis: &Hypothesis,
    draw: Draw,
) -> Result<(StudyCopy, Named), RunError> {
    if study.file.blinding.is_some() {
        let way_out = "simulate from the study that it was made from, or reveal it first";
        return Err(RunError::Blinded { what: "the study", way_out });
    }
    let fiducial = as_written(study)?;
    let plan = Plan::new(study, &fiducial, fiducial.hypothesis(Some(&hypothesis.name))?, draw.mocks)?;
    let planned = plan.study();
    let measurements = read_measurements(planned)?;
    let posterior = Posterior::new(planned, hypothesis, &measurements)?;
    let mut random = Xoshiro256PlusPlus::seed_from_u64(draw.seed);
    let mut point = hypothesis.start();
    if draw.truth == Truth::Prior {
        posterior.priors.sample(&mut random, &mut point);
    }
    let (quantities, amplitudes) = amplitudes(&posterior, draw.truth, &point, &mut random);
    let mut values = posterior.predict_values(&quantities, &mut posterior.scratch())?;
    let factors = factors(&posterior);
    for (first, factor) in &factors {
        add_noise(&mut values[*first..], factor, &mut random);
    }
    plan.round(&measurements, &mut values);
    let mut truth = truth_values(&fiducial, study, hypothesis, &point)?;
    truth.extend(amplitudes);
    let note = format!(
        "SYNTHETIC MEASUREMENTS, drawn by oddwell {} from hypothesis `{}` of `{}` with seed {}.\n\
         The truth is in truth.csv.",
        env!("CARGO_PKG_VERSION"),
        hypothesis.name,
        study.file.title.value,
        draw.seed,
    );
    let mut copy = StudyCopy::new(planned, &measurements, &values, &note, "")?;
    plan.name_files(&mut copy)?;
    if draw.mocks > 0 {
        let expected = expected(&fiducial, &posterior, &hypothesis.name)?;
        for (group, (first, factor)) in measurements.groups.iter().zip(&factors) {
            let size = factor.nrows();
            let mut mocks = DMatrix::zeros(draw.mocks, size);
            let mut mock = vec![0.0; size];
            for row in 0..draw.mocks {
                mock.copy_from_slice(&expected[*first..first + size]);
                add_noise(&mut mock, factor, &mut random);
                mocks.row_mut(row).copy_from_slice(&mock);
            }
            // Surveys that share volume have the same realisations.
            let mut within = 0;
            for survey in &measurements.surveys[group.surveys.clone()] {
                let own = mocks.columns(within, survey.table.len()).into_owned();
                within += survey.table.len();
                copy.with_mocks(&survey.name, npy_bytes(&own))?;
            }
        }
        copy.with_joint_mocks()?;
    }
    Ok((copy, truth))
}

/// The study without what the command line changed.
fn as_written(study: &Study) -> Result<Study, RunError> {
    let source = &study.file.source;
    let file = StudyFile::parse(source.name(), source.text(), study.file.folder.clone())?;
    Ok(Study::resolve(file, &[])?)
}

/// The Cholesky factor of the covariance of each group of surveys, with the place of its first row.
fn factors(posterior: &Posterior) -> Vec<(usize, DMatrix<f64>)> {
    let surveys = posterior.data.with_offsets();
    surveys
        .filter_map(|(first, survey)| {
            // The likelihood was built from it, so it has a factor.
            let cholesky = survey.noise_covariance().matrix().clone().cholesky()?;
            Some((first, cholesky.unpack()))
        })
        .collect()
}

/// The quantities at a point; amplitudes of templates that the hypothesis integrates out stand at their prior's mean or are
/// drawn from it, and are handed back by name.
fn amplitudes(
    posterior: &Posterior,
    truth: Truth,
    point: &[f64],
    random: &mut Xoshiro256PlusPlus,
) -> (Vec<f64>, Named) {
    let mut values = posterior.values(point);
    let mut named = Vec::new();
    for quantity in &posterior.hypothesis.quantities {
        let State::IntegratedOut { mean, standard_deviation } = quantity.state else { continue };
        let Some(slot) = posterior.slot(&quantity.name) else { continue };
        if truth == Truth::Prior {
            let normal: f64 = StandardNormal.sample(random);
            values[slot] = mean + standard_deviation * normal;
        }
        named.push((quantity.name.clone(), values[slot]));
    }
    (values, named)
}

fn add_noise(values: &mut [f64], factor: &DMatrix<f64>, random: &mut Xoshiro256PlusPlus) {
    let normals = DVector::from_fn(factor.nrows(), |_, _| StandardNormal.sample(random));
    let noise = factor * normals;
    values.iter_mut().zip(noise.iter()).for_each(|(value, noise)| *value += noise);
}

/// The prediction in general relativity at the centre of the priors of the study file.
fn expected(fiducial: &Study, posterior: &Posterior, hypothesis: &str) -> Result<Vec<f64>, RunError> {
    let hypothesis = fiducial.hypothesis(Some(hypothesis))?;
    let setup = in_general_relativity(posterior.model.setup().clone());
    let centre = hypothesis.start();
    predict_elsewhere(posterior, setup, &|name| {
        hypothesis.quantity(name).map_or(0.0, |quantity| quantity.form.value(&centre))
    })
}

/// The same model without a departure.
fn in_general_relativity(setup: ModelSetup) -> ModelSetup {
    match departures::find("none") {
        Some(none) => ModelSetup { departure: none, felt_by: FeltBy::Light, ..setup },
        None => setup,
    }
}
