//! `oddwell simulate`: measurements drawn from a study's own model and covariance.

use crate::assemble::{Posterior, read_measurements};
use crate::copy::StudyCopy;
use crate::resolve::{Hypothesis, Study};
use crate::run_error::RunError;
use nalgebra::DVector;
use oddwell_sampler::Target;
use rand::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use rand_xoshiro::Xoshiro256PlusPlus;
use std::path::{Path, PathBuf};

/// Where the parameters of a simulation come from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Truth {
    /// The centre of each prior, and what is held.
    Centre,
    /// A draw from the priors.
    Prior,
}

/// A simulated study.
#[derive(Clone, Debug, PartialEq)]
pub struct Simulated {
    /// The study file written.
    pub study: PathBuf,
    /// The truth: names and values of the hypothesis's free parameters.
    pub truth: Vec<(String, f64)>,
}

/// Draws one measurement of every row that the study keeps from a hypothesis and the study's covariances, and writes a
/// complete study with `truth.csv` beside it. The noise is normal with the covariance as given, whatever the noise model.
/// Rows that `keep` cuts stay as they were measured. The same study, seed and version give the same values.
///
/// # Errors
/// [`RunError`] where the study can't be read, has no prediction at the truth, or the folder exists or can't be written.
pub fn simulate_study(
    study: &Study,
    hypothesis: &Hypothesis,
    truth: Truth,
    seed: u64,
    folder: &Path,
) -> Result<Simulated, RunError> {
    let measurements = read_measurements(study)?;
    let posterior = Posterior::new(study, hypothesis, &measurements)?;
    let mut random = Xoshiro256PlusPlus::seed_from_u64(seed);
    let mut point = hypothesis.start();
    if truth == Truth::Prior {
        posterior.priors.sample(&mut random, &mut point);
    }
    let mut values = posterior.predict(&point, &mut posterior.scratch())?;
    for (first, survey) in posterior.data.with_offsets() {
        let normals = DVector::from_fn(survey.rows(), |_, _| StandardNormal.sample(&mut random));
        // The likelihood was built from it, so it has a Cholesky factor.
        let Some(cholesky) = survey.covariance().matrix().clone().cholesky() else { continue };
        let noise = cholesky.l() * normals;
        for (value, noise) in values[first..].iter_mut().zip(noise.iter()) {
            *value += noise;
        }
    }
    let truth: Vec<(String, f64)> = posterior.map.names().iter().cloned().zip(point).collect();
    let mut table = String::from("parameter,value\n");
    for (name, value) in &truth {
        table.push_str(&format!("{name},{value:e}\n"));
    }
    let note = format!(
        "SYNTHETIC MEASUREMENTS, drawn by oddwell {} from hypothesis `{}` of `{}` with seed {seed}.\n\
         The truth is in truth.csv.",
        env!("CARGO_PKG_VERSION"),
        hypothesis.name,
        study.file.title.value,
    );
    let copy = StudyCopy::new(study, &measurements, &values, &note, "")?;
    let study = copy.with_file("truth.csv", table.into_bytes()).write(folder)?;
    Ok(Simulated { study, truth })
}
