//! From a study to a finished run: sampling, what the chain says, and the run directory.

mod analysis;
mod clocks;
mod drawn_back;
mod general_relativity;
mod goodness;
mod mimics;
mod sampling;
mod summary;
mod suspicions;
mod switched_off;

pub(crate) use analysis::{Analysis, PointAndWidths};
pub(crate) use general_relativity::points as general_relativity_points;

use crate::assemble::{Measurements, Posterior, read_measurements};
use crate::blinding::{WITHHELD, withhold};
use crate::file::Override;
use crate::record::{Manifest, Summary};
use crate::resolve::{Hypothesis, Study};
use crate::run_directory::RunDirectory;
use crate::run_error::RunError;
use oddwell_sampler::{Chain, Control, EnsembleSettings, Progress, SamplerError, StopReason, Target};
use std::path::{Path, PathBuf};
use time::OffsetDateTime;
use time::format_description::well_known::Rfc3339;

/// How to run a fit.
#[derive(Clone, Debug)]
pub struct FitOptions {
    /// The run directory to make.
    pub out: PathBuf,
    /// Whether an existing run directory may be replaced (once the new one is complete).
    pub replace: bool,
    /// The seed, in place of the study's.
    pub seed: Option<u64>,
    /// Where sampling ends at the latest, in likelihood evaluations.
    pub maximum_evaluations: Option<u64>,
    /// The command line, for the manifest.
    pub command: Vec<String>,
    /// Threads available, for the record.
    pub threads: usize,
}

/// A finished fit.
#[derive(Clone, Debug)]
pub struct Fitted {
    /// What it says.
    pub summary: Summary,
    /// What it was made from.
    pub manifest: Manifest,
    /// Where it was written.
    pub directory: PathBuf,
    /// Whether the caller stopped it before it converged.
    pub interrupted: bool,
}

/// `runs/<title>-<hypothesis>`, with the title in lower case and dashes for everything but letters and digits.
#[must_use]
pub fn default_directory(study: &Study, hypothesis: &Hypothesis) -> PathBuf {
    default_directory_of(study, &hypothesis.name)
}

/// `runs/<title>-<what>`.
pub(crate) fn default_directory_of(study: &Study, what: &str) -> PathBuf {
    let mut slug = String::new();
    for character in study.file.title.value.to_lowercase().chars() {
        if character.is_alphanumeric() {
            slug.push(character);
        } else if !slug.ends_with('-') {
            slug.push('-');
        }
    }
    let slug = slug.trim_matches('-');
    let slug = if slug.is_empty() { "study" } else { slug };
    Path::new("runs").join(format!("{slug}-{what}"))
}

/// Samples the posterior of a hypothesis and writes a run directory. `progress` is called some 25 times a second with
/// what the stop rule sees and the parameters' names, and may stop the run: then what there is gets written.
///
/// # Errors
/// [`RunError`]; nothing half-written stays behind.
pub fn fit(
    study: &Study,
    hypothesis: &Hypothesis,
    options: &FitOptions,
    progress: &mut dyn FnMut(&Progress, &[String]) -> Control,
) -> Result<Fitted, RunError> {
    if study.file.blinding.is_some() && hypothesis.watched().is_empty() {
        let hypothesis = hypothesis.name.clone();
        return Err(RunError::Withheld { hypothesis, withheld: WITHHELD });
    }
    let directory = RunDirectory::claim(&options.out, options.replace)?;
    let measurements = read_measurements(study)?;
    let posterior = Posterior::new(study, hypothesis, &measurements)?;
    if posterior.dimension() == 0 {
        return Err(RunError::NothingInferred { hypothesis: hypothesis.name.clone() });
    }
    let fitted = fit_posterior(study, &posterior, &measurements, &directory, options, progress)?;
    Ok(fitted.0)
}

/// How the study wants a posterior sampled.
pub(crate) fn ensemble_settings(
    study: &Study,
    hypothesis: &Hypothesis,
    options: &FitOptions,
) -> EnsembleSettings {
    let sampling = &study.file.sampling;
    EnsembleSettings {
        seed: options.seed.unwrap_or(sampling.seed.value),
        effective_samples: sampling.effective_samples.value as f64,
        watched: hypothesis.watched(),
        ensembles: sampling.ensembles.value as usize,
        walkers: sampling.walkers.as_ref().map(|walkers| walkers.value as usize),
        maximum_evaluations: options
            .maximum_evaluations
            .or_else(|| sampling.maximum_evaluations.as_ref().map(|maximum| maximum.value)),
        ..EnsembleSettings::default()
    }
}

/// [`fit`] of a posterior that is there already, with the chain.
pub(crate) fn fit_posterior(
    study: &Study,
    posterior: &Posterior,
    measurements: &Measurements,
    directory: &RunDirectory,
    options: &FitOptions,
    progress: &mut dyn FnMut(&Progress, &[String]) -> Control,
) -> Result<(Fitted, Chain), RunError> {
    let started = OffsetDateTime::now_utc();
    let hypothesis = &posterior.hypothesis;
    let settings = ensemble_settings(study, hypothesis, options);
    let names = posterior.map.names().to_vec();
    let chain = sampling::chain_of(posterior, &settings, &mut |state| progress(state, &names))?;
    let (mut summary, derived) = summary::summarise(study, posterior, measurements, &chain, settings.seed)?;
    if study.file.blinding.is_some() {
        withhold(&mut summary);
    }
    let time = |moment: OffsetDateTime| moment.format(&Rfc3339).unwrap_or_default();
    let manifest = Manifest {
        version: concat!("oddwell ", env!("CARGO_PKG_VERSION")).to_owned(),
        command: options.command.clone(),
        study_file: study.file.source.name().to_owned(),
        study_text: study.file.source.text().to_owned(),
        overrides: study.overrides().iter().map(|each: &Override| each.option.clone()).collect(),
        hypothesis: hypothesis.name.clone(),
        seed: settings.seed,
        threads: options.threads,
        started: time(started),
        ended: time(OffsetDateTime::now_utc()),
        inputs: measurements.inputs.clone(),
        warm_up: chain.warm_up,
        thinning: chain.thinning,
        units: names
            .iter()
            .chain(&derived.names)
            .filter_map(|name| Some((name.clone(), unit_of(name)?.to_owned())))
            .collect(),
    };
    directory.write(&names, &chain, (&derived.names, &derived.columns), &summary, &manifest)?;
    let interrupted = chain.outcome.stopped_by == StopReason::Caller && !chain.outcome.converged;
    Ok((Fitted { summary, manifest, directory: options.out.clone(), interrupted }, chain))
}

impl RunError {
    /// Whether it only says that the caller stopped the run before there was anything to write.
    #[must_use]
    pub fn is_interruption(&self) -> bool {
        matches!(self, RunError::Sampler(SamplerError::Stopped))
    }
}

/// The unit of a quantity, where it has one.
fn unit_of(name: &str) -> Option<&'static str> {
    if name.starts_with("derived.clock_contrast.") {
        return Some("s/yr");
    }
    match name.rsplit('.').next() {
        Some("offset") => Some("km/s"),
        Some("damping" | "smearing" | "clock_distance") => Some("Mpc/h"),
        Some("range") if name.starts_with("departure.") => Some("Mpc/h"),
        Some("crossover") => Some("c/H0"),
        _ => None,
    }
}
