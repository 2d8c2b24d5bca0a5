//! Weighing the hypotheses of a study: evidences by independent routes, and what their comparison can bear.

mod average;
mod best_of;
mod consistency;
mod facts;
mod pieces;
mod plan;
mod state;
mod verdict;
mod watch;

pub use watch::{HypothesisWatch, WeighWatch};

use crate::assemble::{Measurements, Posterior, read_measurements, with_one_noise};
use crate::fit::{FitOptions, default_directory_of};
use crate::record::{Manifest, WeighRecord};
use crate::resolve::Study;
use crate::run_directory::Existing;
use crate::run_error::RunError;
use crate::weigh::pieces::{Pieces, Task};
use oddwell_evidence::EvidenceError;
use rayon::prelude::*;
use state::State;
use std::path::{Path, PathBuf};
use std::time::Instant;
use time::OffsetDateTime;
use time::format_description::well_known::Rfc3339;

/// How to weigh.
#[derive(Clone, Debug)]
pub struct WeighOptions {
    /// The run directory to make.
    pub out: PathBuf,
    /// Whether an existing run directory may be replaced (once the new one is complete).
    pub replace: bool,
    /// Whether to go on with what an interrupted run has left.
    pub resume: bool,
    /// The seed, in place of the study's.
    pub seed: Option<u64>,
    /// The command line, for the manifest.
    pub command: Vec<String>,
    /// Threads available, for the record.
    pub threads: usize,
}

/// Hypotheses that were weighed.
#[derive(Clone, Debug)]
pub struct Weighed {
    /// What it says.
    pub record: WeighRecord,
    /// Where it was written.
    pub directory: PathBuf,
}

/// `runs/<title>-weigh`.
#[must_use]
pub fn default_weigh_directory(study: &Study) -> PathBuf {
    default_directory_of(study, "weigh")
}

/// Computes the evidence of every hypothesis by every estimator that applies, samples every posterior, compares them, and
/// writes a run directory: `weigh.json`, `manifest.json`, and in a folder for each hypothesis its posterior as `fit` writes it.
///
/// What is finished is kept in a hidden folder beside the run directory until all is, so that an interrupted run can be
/// resumed. The result depends on study, seed and version alone.
///
/// # Errors
/// [`RunError`]: [`RunError::Blinded`] for a blinded study, and what stops a fit; [`RunError::Evidence`].
pub fn weigh(study: &Study, options: &WeighOptions, watch: &WeighWatch) -> Result<Weighed, RunError> {
    if study.file.blinding.is_some() {
        return Err(RunError::Blinded {
            what: "this study",
            way_out: "an evidence would tell which hypothesis the measurements favour; freeze the analysis, `oddwell reveal` it, then weigh",
        });
    }
    let (clock, started) = (Instant::now(), OffsetDateTime::now_utc());
    let seed = options.seed.unwrap_or(study.file.sampling.seed.value);
    let measurements = with_one_noise(study, read_measurements(study)?)?;
    let state = State::open(study, &measurements, seed, options)?;
    let posteriors: Vec<Posterior> = study
        .hypotheses
        .iter()
        .map(|hypothesis| Posterior::new(study, hypothesis, &measurements))
        .collect::<Result<_, _>>()?;
    let work = Work {
        study,
        measurements: &measurements,
        posteriors: &posteriors,
        state: &state,
        options,
        seed,
        watch,
    };
    let pieces = work.pieces()?;
    let mut record = verdict::record(&work, pieces)?;
    record.evaluations = record.hypotheses.iter().map(|hypothesis| hypothesis.evaluations).sum();
    record.wall_seconds = clock.elapsed().as_secs_f64();
    let manifest = work.manifest(started);
    state.finish(&record, &manifest)?;
    Ok(Weighed { record, directory: options.out.clone() })
}

/// Everything that the parts of a weighing share.
pub(crate) struct Work<'a> {
    pub(crate) study: &'a Study,
    pub(crate) measurements: &'a Measurements,
    pub(crate) posteriors: &'a [Posterior],
    pub(crate) state: &'a State,
    pub(crate) options: &'a WeighOptions,
    pub(crate) seed: u64,
    pub(crate) watch: &'a WeighWatch,
}

impl Work<'_> {
    /// Posteriors one after the other, each on all cores; then all estimators of all hypotheses side by side.
    fn pieces(&self) -> Result<Vec<Pieces>, RunError> {
        let mut pieces = Vec::new();
        for (index, posterior) in self.posteriors.iter().enumerate() {
            pieces.push(Pieces::begin(self, index, posterior)?);
        }
        let tasks: Vec<(usize, Task)> = Task::ALL
            .iter()
            .flat_map(|task| (0..self.posteriors.len()).map(move |index| (index, *task)))
            .collect();
        let outcomes: Vec<_> = tasks
            .into_par_iter()
            .with_max_len(1)
            .map(|(index, task)| Ok((index, task, task.outcome(self, index, &self.posteriors[index])?)))
            .collect::<Result<_, RunError>>()?;
        for (index, task, outcome) in outcomes {
            pieces[index].outcomes.insert(task.name().to_owned(), outcome);
        }
        Ok(pieces)
    }

    fn manifest(&self, started: OffsetDateTime) -> Manifest {
        let time = |moment: OffsetDateTime| moment.format(&Rfc3339).unwrap_or_default();
        Manifest {
            version: concat!("oddwell ", env!("CARGO_PKG_VERSION")).to_owned(),
            command: self.options.command.clone(),
            study_file: self.study.file.source.name().to_owned(),
            study_text: self.study.file.source.text().to_owned(),
            overrides: self.study.overrides().iter().map(|each| each.option.clone()).collect(),
            only: self.study.restriction().only.clone(),
            without: self.study.restriction().without.clone(),
            hypothesis: "all".to_owned(),
            seed: self.seed,
            threads: self.options.threads,
            started: time(started),
            ended: time(OffsetDateTime::now_utc()),
            inputs: self.measurements.inputs.clone(),
            interrupted: false,
            warm_up: 0,
            thinning: 1,
            thinning_rule: String::new(),
            units: std::collections::BTreeMap::new(),
        }
    }

    /// How the posterior of a hypothesis is sampled, into a folder of the state.
    pub(crate) fn fit_options(&self, folder: &Path) -> FitOptions {
        FitOptions {
            out: folder.to_owned(),
            existing: Existing::Resume,
            seed: Some(self.seed),
            maximum_evaluations: None,
            command: self.options.command.clone(),
            threads: self.options.threads,
        }
    }
}

impl RunError {
    /// Whether the caller stopped a weighing.
    #[must_use]
    pub fn is_stopped_weighing(&self) -> bool {
        matches!(self, RunError::Evidence(EvidenceError::Stopped)) || self.is_interruption()
    }
}
