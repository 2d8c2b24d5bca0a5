//! Runs read back, with what a page about them needs beyond their files: predictions and bands, verdicts, densities.
//!
//! Nothing here is fitted anew. What a run left in its directory is read; what follows from its draws is computed with the
//! same posterior that the run had, which needs the measurements to be where and what they were ([`ReviewError`] says so
//! where they are not, and the rest stands without).

mod chain_table;
mod curve;
mod dependence;
mod panels;
mod parameters;
mod predictive;
mod restore;
mod traces;
mod weighed;

pub use chain_table::ChainTable;
pub use curve::{CurvePoint, DepartureCurve, REFERENCE_WAVENUMBER};
pub use dependence::{Dependence, JointPicture, RankedPair};
pub use panels::{Panel, PanelRow};
pub use parameters::ParameterPicture;
pub use predictive::PredictiveCheck;
pub use traces::{Trace, TraceBand};
pub use weighed::{Weighing, read_weighing};

use crate::assemble::{Measurements, Posterior, SurveyMeasurements};
use crate::check::{CheckReport, check};
use crate::fit::{Analysis, PointAndWidths};
use crate::record::{Manifest, Stability, Summary};
use crate::resolve::Study;
use crate::run_directory::read_summary;
use crate::run_error::RunError;
use oddwell_likelihood::SurveyLikelihood;
use oddwell_sampler::Target;
use std::path::{Path, PathBuf};
use thiserror::Error;

/// Where a run directory keeps what became of the departure under other cuts and assumptions.
pub const STABILITY_FILE: &str = "stability.json";

/// Why the parts of a review that need the measurements are missing. The text ends with the way out.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
#[non_exhaustive]
pub enum ReviewError {
    /// An input is not what the run read.
    #[error("{path}: is not what the run read (its SHA-256 differs); bring it back, or fit again")]
    Changed {
        /// The file.
        path: String,
    },
    /// The study or its measurements can't be read or predicted any more.
    #[error("{reason}; run the report from the folder in which the fit was run, or fit again")]
    Unusable {
        /// Why.
        reason: String,
    },
}

impl From<RunError> for ReviewError {
    fn from(error: RunError) -> ReviewError {
        ReviewError::Unusable { reason: error.to_string() }
    }
}

/// One fitted run, read back.
#[derive(Clone, Debug)]
pub struct Review {
    /// The run directory, as given.
    pub directory: PathBuf,
    /// `summary.json`.
    pub summary: Summary,
    /// `manifest.json`.
    pub manifest: Manifest,
    /// `stability.json`, where the run has one.
    pub stability: Option<Stability>,
    /// How many draws the chain holds.
    pub draws: usize,
    /// The densities of the inferred quantities, with their priors.
    pub pictures: Vec<ParameterPicture>,
    /// Where the walkers went.
    pub traces: Vec<Trace>,
    /// What depends on what.
    pub dependence: Dependence,
    /// What needs the measurements.
    pub beside_data: Result<BesideData, ReviewError>,
}

/// What needs the measurements beside the draws.
#[derive(Clone, Debug)]
pub struct BesideData {
    /// Every multipole of every bin.
    pub panels: Vec<Panel>,
    /// The departure against redshift.
    pub curve: Option<DepartureCurve>,
    /// Posterior-predictive checks.
    pub predictive: Vec<PredictiveCheck>,
    /// What `oddwell check` says.
    pub check: CheckReport,
}

/// Reads a run directory and computes what a page needs.
///
/// # Errors
/// [`RunError::UnreadableRun`] where `summary.json`, `manifest.json` or `chain.csv` can't be read.
pub fn review(directory: &Path) -> Result<Review, RunError> {
    let summary = read_summary(directory)?;
    let manifest: Manifest = read_json(&directory.join("manifest.json"))?;
    let chain = ChainTable::read(directory)?;
    let stability = directory.join(STABILITY_FILE);
    let stability = stability.exists().then(|| read_json(&stability)).transpose()?;
    let restored = restore::restore(&manifest);
    let posterior = restored.as_ref().map_err(Clone::clone).and_then(|(study, measurements)| {
        let hypothesis = study.hypothesis(Some(&summary.hypothesis)).map_err(RunError::from)?;
        Ok(Posterior::new(study, hypothesis, measurements)?)
    });
    let priors = posterior.as_ref().ok();
    let pictures = parameters::pictures(&summary, &chain, priors);
    let dependence = dependence::dependence(&summary, &chain, priors);
    let traces = traces::traces(&chain);
    let beside_data = match (&restored, &posterior) {
        (Ok((study, measurements)), Ok(posterior)) => {
            beside_data(study, measurements, posterior, &summary, &chain)
        }
        (Err(error), _) | (_, Err(error)) => Err(error.clone()),
    };
    Ok(Review {
        directory: directory.to_owned(),
        draws: chain.len(),
        summary,
        manifest,
        stability,
        pictures,
        traces,
        dependence,
        beside_data,
    })
}

fn beside_data(
    study: &Study,
    measurements: &Measurements,
    posterior: &Posterior,
    summary: &Summary,
    chain: &ChainTable,
) -> Result<BesideData, ReviewError> {
    let names = posterior.map.names();
    let columns: Option<Vec<&[f64]>> = names.iter().map(|name| chain.column(name)).collect();
    let columns = columns.ok_or_else(|| ReviewError::Unusable {
        reason: "chain.csv lacks columns of the study's parameters".to_owned(),
    })?;
    let point = |row: usize| -> Vec<f64> { columns.iter().map(|column| column[row]).collect() };
    let draws: Vec<Vec<f64>> = chain.spread(draw_count(measurements)).into_iter().map(point).collect();
    // While blinded, the summary does not say where the departure was at its best.
    let best: Option<Vec<f64>> =
        names.iter().map(|name| summary.best.parameters.get(name).copied()).collect();
    let best = PointAndWidths {
        point: best.unwrap_or_else(|| point(chain.highest())),
        widths: columns.iter().map(|column| standard_deviation(column)).collect(),
    };
    let mut scratch = posterior.scratch();
    let analysis = Analysis::at(posterior, &best, &mut scratch)?;
    let context = Context { study, measurements, posterior, analysis: &analysis, draws: &draws };
    let (panels, predictive) = (panels::panels(&context)?, predictive::predictive(&context)?);
    let curve = curve::curve(&context, summary)?;
    let check = check(study, &posterior.hypothesis)?;
    Ok(BesideData { panels, curve, predictive, check })
}

/// What every part beside the data is computed from.
struct Context<'a> {
    study: &'a Study,
    measurements: &'a Measurements,
    posterior: &'a Posterior,
    analysis: &'a Analysis,
    /// Some of the draws, evenly spread over the chain.
    draws: &'a [Vec<f64>],
}

/// A survey's rows among all.
#[derive(Clone, Copy)]
struct Placed<'a> {
    survey: &'a SurveyMeasurements,
    /// The likelihood of all surveys that share its noise.
    likelihood: &'a SurveyLikelihood,
    /// Their first row among all rows.
    first: usize,
    /// The survey's first row among theirs.
    within: usize,
}

impl<'a> Context<'a> {
    fn placed(&self) -> Vec<Placed<'a>> {
        let mut all = Vec::new();
        for (group, (first, likelihood)) in
            self.measurements.groups.iter().zip(self.posterior.data.with_offsets())
        {
            let mut within = 0;
            for survey in &self.measurements.surveys[group.surveys.clone()] {
                all.push(Placed { survey, likelihood, first, within });
                within += survey.table.len();
            }
        }
        all
    }
}

/// Draws for bands and predictive checks: 300 give a quantile of 2.5 % to a third of itself; fewer where χ² of a draw is
/// dear.
fn draw_count(measurements: &Measurements) -> usize {
    let rows = measurements.len() as f64;
    (2e9 / rows.powi(3)).clamp(60.0, 300.0) as usize
}

fn standard_deviation(values: &[f64]) -> f64 {
    let count = values.len() as f64;
    let mean = values.iter().sum::<f64>() / count;
    (values.iter().map(|value| (value - mean).powi(2)).sum::<f64>() / (count - 1.0).max(1.0)).sqrt()
}

pub(crate) fn read_json<T: serde::de::DeserializeOwned>(path: &Path) -> Result<T, RunError> {
    let unreadable = |reason: String| RunError::UnreadableRun { path: path.to_owned(), reason };
    let text = std::fs::read_to_string(path).map_err(|error| unreadable(error.to_string()))?;
    serde_json::from_str(&text).map_err(|error| unreadable(error.to_string()))
}
