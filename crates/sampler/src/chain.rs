//! The result of a run: the draws, what they cost and whether they suffice.

use crate::diagnostics::ParameterDiagnostics;
use crate::peak::Peak;
use serde::{Deserialize, Serialize};

/// Draws after warm-up, their cost and their verdict.
///
/// Rows are ordered by ensemble, then step, then walker. `points` holds `dimension` numbers a row.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub struct Chain {
    /// Coordinates of a point.
    pub dimension: usize,
    /// Independent ensembles.
    pub ensembles: usize,
    /// Walkers of one ensemble.
    pub walkers: usize,
    /// Steps that every walker made, warm-up included.
    pub steps: u64,
    /// Steps at the start that were dropped as warm-up.
    pub warm_up: u64,
    /// Every how many steps a draw was kept; 1 unless memory ran short.
    pub thinning: u64,
    /// The steps that were kept, rising, the same for every walker.
    pub kept_steps: Vec<u64>,
    /// Coordinates of the draws, `dimension` a row.
    pub points: Vec<f64>,
    /// Log prior of every row.
    pub log_prior: Vec<f64>,
    /// Log likelihood of every row.
    pub log_likelihood: Vec<f64>,
    /// What every parameter's draws are worth.
    pub diagnostics: Vec<ParameterDiagnostics>,
    /// Proposals and acceptances of every move, after warm-up.
    pub acceptance: Vec<MoveAcceptance>,
    /// Evaluations of the likelihood from the first to the last, peak search and warm-up included; the completion of draws,
    /// where quantities were integrated out, is not counted.
    pub evaluations: u64,
    /// Of these, evaluations of the peak search.
    pub peak_evaluations: u64,
    /// Evaluations that gave no likelihood.
    pub rejected: RejectedEvaluations,
    /// Seconds from the first evaluation to the last, warm-up included.
    pub wall_seconds: f64,
    /// Threads that were available.
    pub threads: usize,
    /// Why the run ended, and what is still missing.
    pub outcome: Outcome,
    /// The peak it started from; `None` where quantities were integrated out, or nothing was searched.
    pub peak: Option<Peak>,
    /// The highest point that any walker visited, warm-up included; of completed draws, the highest draw.
    pub best: BestPoint,
}

/// One row of a chain.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Draw<'a> {
    /// Ensemble, from 0.
    pub ensemble: usize,
    /// Walker within the ensemble, from 0.
    pub walker: usize,
    /// Step, from 1, warm-up counted.
    pub step: u64,
    /// Coordinates.
    pub point: &'a [f64],
    /// Log prior density.
    pub log_prior: f64,
    /// Log likelihood.
    pub log_likelihood: f64,
}

/// How often a move was tried and taken.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct MoveAcceptance {
    /// Registry name of the move.
    pub name: String,
    /// Proposals made.
    pub proposed: u64,
    /// Proposals accepted.
    pub accepted: u64,
}

impl MoveAcceptance {
    /// Accepted share of the proposals; `None` before the first.
    pub fn rate(&self) -> Option<f64> {
        (self.proposed > 0).then(|| self.accepted as f64 / self.proposed as f64)
    }
}

/// Evaluations that the model could not make, with a bounded list of reasons.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct RejectedEvaluations {
    /// How many.
    pub count: u64,
    /// The first distinct reasons (at most [`RejectedEvaluations::KEPT`]), each with how often it arose.
    pub reasons: Vec<(String, u64)>,
}

impl RejectedEvaluations {
    /// Distinct reasons that are kept; those that come later are counted, not quoted.
    pub const KEPT: usize = 16;

    /// Counts one more.
    pub(crate) fn add(&mut self, reason: &str) {
        self.add_many(reason, 1);
        self.count += 1;
    }

    fn add_many(&mut self, reason: &str, times: u64) {
        match self.reasons.iter().position(|(known, _)| known == reason) {
            Some(known) => self.reasons[known].1 += times,
            None if self.reasons.len() < Self::KEPT => self.reasons.push((reason.to_owned(), times)),
            None => {}
        }
    }

    /// Adds what another one counted.
    pub(crate) fn merge(&mut self, other: &Self) {
        for (reason, times) in &other.reasons {
            self.add_many(reason, *times);
        }
        self.count += other.count;
    }
}

/// The highest point visited.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct BestPoint {
    /// Coordinates.
    pub point: Vec<f64>,
    /// Log prior density there.
    pub log_prior: f64,
    /// Log likelihood there.
    pub log_likelihood: f64,
}

/// Why a run ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub enum StopReason {
    /// Every test passed.
    Converged,
    /// `maximum_evaluations` came first.
    EvaluationLimit,
    /// The caller's callback said so.
    Caller,
    /// An evaluation failed for good.
    Failure,
}

/// How a run ended.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Outcome {
    /// Whether warm-up ended and every test passed, whatever ended the run.
    pub converged: bool,
    /// Why the run ended.
    pub stopped_by: StopReason,
    /// Whether the end of warm-up could be told from the chain; if not, the later half was kept.
    pub settled: bool,
    /// Tests that failed, the one that needs most first; empty if converged.
    pub failing: Vec<FailedTest>,
}

/// One parameter's failed test.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct FailedTest {
    /// The parameter, by its dimension.
    pub parameter: usize,
    /// What was tested.
    pub test: Test,
    /// What came out.
    pub value: f64,
    /// What was wanted.
    pub wanted: f64,
    /// About how many more evaluations it takes, if the chain goes on as it went.
    pub more_evaluations: Option<f64>,
}

/// The tests of the stop rule.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub enum Test {
    /// Rank-normalised split R̂.
    Rhat,
    /// Rank-normalised split R̂ of single walkers.
    WalkerRhat,
    /// Bulk effective samples.
    BulkEss,
    /// Tail effective samples.
    TailEss,
}

impl std::fmt::Display for Test {
    fn fmt(&self, formatter: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        formatter.write_str(match self {
            Test::Rhat => "R̂",
            Test::WalkerRhat => "R̂ of single walkers",
            Test::BulkEss => "bulk effective samples",
            Test::TailEss => "tail effective samples",
        })
    }
}

impl Chain {
    /// Number of draws.
    pub fn len(&self) -> usize {
        self.log_prior.len()
    }

    /// Whether there is no draw.
    pub fn is_empty(&self) -> bool {
        self.log_prior.is_empty()
    }

    /// One draw; `None` past the end.
    pub fn draw(&self, row: usize) -> Option<Draw<'_>> {
        let log_prior = *self.log_prior.get(row)?;
        let walker = row % self.walkers;
        let kept = row / self.walkers % self.kept_steps.len();
        Some(Draw {
            ensemble: row / (self.walkers * self.kept_steps.len()),
            walker,
            step: self.kept_steps[kept],
            point: &self.points[row * self.dimension..(row + 1) * self.dimension],
            log_prior,
            log_likelihood: self.log_likelihood[row],
        })
    }

    /// All draws, ordered by ensemble, step, walker.
    pub fn draws(&self) -> impl ExactSizeIterator<Item = Draw<'_>> {
        (0..self.len()).map(|row| Draw {
            ensemble: row / (self.walkers * self.kept_steps.len()),
            walker: row % self.walkers,
            step: self.kept_steps[row / self.walkers % self.kept_steps.len()],
            point: &self.points[row * self.dimension..(row + 1) * self.dimension],
            log_prior: self.log_prior[row],
            log_likelihood: self.log_likelihood[row],
        })
    }

    /// The values of one parameter, in the order of the rows.
    pub fn column(&self, parameter: usize) -> Vec<f64> {
        self.points.iter().skip(parameter).step_by(self.dimension).copied().collect()
    }

    /// Diagnostics of any quantity that has one value a row, such as a derived one.
    ///
    /// # Panics
    /// Never; a slice that is not [`Chain::len`] long gives NaN throughout.
    pub fn diagnose(&self, values: &[f64]) -> ParameterDiagnostics {
        crate::diagnostics::diagnose_ensembles(values, self.ensembles, self.walkers)
    }
}
