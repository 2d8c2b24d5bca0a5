//! From a study to a finished run: sampling, what the chain says, and the run directory.

mod analysis;
mod by_part;
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
use crate::checkpoint::{Kept, RunIdentity};
use crate::file::Override;
use crate::record::{Manifest, Summary, WarningRecord};
use crate::resolve::{Hypothesis, Study};
use crate::run_directory::{Existing, RunDirectory, read_manifest, read_summary};
use crate::run_error::RunError;
use crate::warnings::Warning;
use oddwell_sampler::{Chain, Control, EnsembleSettings, Progress, SamplerError, StopReason, Target};
use std::path::{Path, PathBuf};
use time::OffsetDateTime;
use time::format_description::well_known::Rfc3339;

/// The program's name and version.
const VERSION: &str = concat!("oddwell ", env!("CARGO_PKG_VERSION"));

/// How to run a fit.
#[derive(Clone, Debug)]
pub struct FitOptions {
    /// The run directory to make.
    pub out: PathBuf,
    /// What to do about a run directory, or a run that was broken off, that is there already.
    pub existing: Existing,
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
    /// Whether the caller stopped it before it converged; then its state is kept, to go on from.
    pub interrupted: bool,
    /// What it went on from.
    pub resumed: Resumed,
}

/// What a run went on from.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Resumed {
    /// Nothing: it was begun.
    Begun,
    /// The checkpoint of a run that had been broken off; with what was wrong with the last one, where the one before it had to
    /// do.
    Continued {
        /// What was wrong.
        damage: Option<String>,
    },
    /// It had been finished before.
    Finished,
}

/// `runs/<title>-<hypothesis>`, with the title in lower case and dashes for everything but letters and digits; what a
/// restriction leaves in or out follows, as in `-only-larkfield.near`.
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
    let mut name = format!("{slug}-{what}");
    let restriction = study.restriction();
    for (word, names) in [("only", &restriction.only), ("without", &restriction.without)] {
        if !names.is_empty() {
            name.push_str(&format!("-{word}-{}", names.join("-")));
        }
    }
    Path::new("runs").join(name)
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
    let directory = RunDirectory::claim(&options.out, options.existing)?;
    let measurements = read_measurements(study)?;
    if options.existing == Existing::Resume && directory.is_finished() {
        let seed = options.seed.unwrap_or(study.file.sampling.seed.value);
        let identity = identity_of(study, hypothesis, &measurements, seed);
        let finished = finished(&options.out, &identity)?;
        // One that was interrupted before there was a state to keep starts from the beginning.
        if !finished.manifest.interrupted {
            return Ok(finished);
        }
    }
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

/// [`fit`] of a posterior that is there already, with the chain. Goes on with a state that is kept in `directory`, if that is
/// what `options` want.
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
    let mut checkpoints = directory.checkpoints(identity_of(study, hypothesis, measurements, settings.seed));
    let kept = match options.existing {
        Existing::Resume => checkpoints.load()?,
        _ => None,
    };
    let (state, resumed) = match kept {
        Some(Kept { state, damage }) => (Some(state), Resumed::Continued { damage }),
        None => (None, Resumed::Begun),
    };
    let names = posterior.map.names().to_vec();
    let chain = sampling::chain_of(
        posterior,
        &settings,
        state,
        &mut |state| progress(state, &names),
        &mut |state, stopping| checkpoints.keep(state, stopping),
    )?;
    let interrupted = chain.outcome.stopped_by == StopReason::Caller && !chain.outcome.converged;
    let (mut summary, derived) = summary::summarise(study, posterior, measurements, &chain, settings.seed)?;
    if let Some(reason) = checkpoints.failure() {
        let (run, reason) = (options.out.display().to_string(), reason.to_owned());
        summary.warnings.push(WarningRecord::from(&Warning::CheckpointNotWritten { run, reason }));
    }
    if study.file.blinding.is_some() {
        withhold(&mut summary);
    }
    let time = |moment: OffsetDateTime| moment.format(&Rfc3339).unwrap_or_default();
    let manifest = Manifest {
        version: VERSION.to_owned(),
        command: options.command.clone(),
        study_file: study.file.source.name().to_owned(),
        study_text: study.file.source.text().to_owned(),
        overrides: overrides_of(study),
        only: study.restriction().only.clone(),
        without: study.restriction().without.clone(),
        hypothesis: hypothesis.name.clone(),
        seed: settings.seed,
        threads: options.threads,
        started: time(started),
        ended: time(OffsetDateTime::now_utc()),
        inputs: measurements.inputs.clone(),
        interrupted,
        warm_up: chain.warm_up,
        thinning: chain.thinning,
        thinning_rule: settings.thinning_rule(),
        units: names
            .iter()
            .chain(&derived.names)
            .filter_map(|name| Some((name.clone(), unit_of(name)?.to_owned())))
            .collect(),
    };
    let derived = (derived.names.as_slice(), derived.columns.as_slice());
    directory.write(&names, &chain, derived, &summary, &manifest, interrupted)?;
    let directory = options.out.clone();
    Ok((Fitted { summary, manifest, directory, interrupted, resumed }, chain))
}

/// What a state of this run belongs to.
fn identity_of(
    study: &Study,
    hypothesis: &Hypothesis,
    measurements: &Measurements,
    seed: u64,
) -> RunIdentity {
    RunIdentity {
        version: VERSION.to_owned(),
        task: format!("a fit of `{}`", hypothesis.name),
        inputs: measurements.inputs.clone(),
        overrides: options_of(overrides_of(study), &study.restriction().only, &study.restriction().without),
        seed,
    }
}

fn overrides_of(study: &Study) -> Vec<String> {
    study.overrides().iter().map(|each: &Override| each.option.clone()).collect()
}

/// `--set` options, and behind them what is left in and out: another part of the measurements is another run.
fn options_of(mut overrides: Vec<String>, only: &[String], without: &[String]) -> Vec<String> {
    overrides.extend(only.iter().map(|name| format!("--only {name}")));
    overrides.extend(without.iter().map(|name| format!("--without {name}")));
    overrides
}

/// A run that is there, if it is the one that is asked for.
fn finished(directory: &Path, identity: &RunIdentity) -> Result<Fitted, RunError> {
    let (summary, manifest) = (read_summary(directory)?, read_manifest(directory)?);
    let there = RunIdentity {
        version: manifest.version.clone(),
        task: format!("a fit of `{}`", manifest.hypothesis),
        inputs: manifest.inputs.clone(),
        overrides: options_of(manifest.overrides.clone(), &manifest.only, &manifest.without),
        seed: manifest.seed,
    };
    if let Some(difference) = there.difference(identity) {
        return Err(RunError::ForeignState { path: directory.to_owned(), difference });
    }
    let directory = directory.to_owned();
    Ok(Fitted { summary, manifest, directory, interrupted: false, resumed: Resumed::Finished })
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
