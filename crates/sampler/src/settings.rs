//! What a run is asked for, and what it reports on the way.

use crate::error::SamplerError;
use serde::{Deserialize, Serialize};

/// Rank-normalised split R̂ that every parameter must stay below (Vehtari et al. 2021, Bayesian Analysis 16, 667, §4.4).
pub const MAXIMUM_RHAT: f64 = 1.01;

/// The same of single walkers, which must have met but need not be long (the threshold of Gelman & Rubin 1992). Were a
/// share ε of the walkers stuck d standard deviations away, it would be √(1 + ε(1 − ε)d²) at least: one in a hundred that is
/// stuck at six is seen.
pub const MAXIMUM_WALKER_RHAT: f64 = 1.1;

/// Bulk and tail effective samples that every parameter must reach: 100 a chain, four split chains (the same, §4.4).
pub const MINIMUM_EFFECTIVE_SAMPLES: f64 = 400.0;

/// Evaluations after which a run gives up where the settings name no limit.
pub const DEFAULT_MAXIMUM_EVALUATIONS: u64 = 50_000_000;

/// How to sample. [`Default`] is meant to be right; only `watched` has to be filled in.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct EnsembleSettings {
    /// Independent ensembles, each with its own random streams; at least 2, or R̂ has nothing to compare.
    pub ensembles: usize,
    /// Walkers of one ensemble: even, at least 2·dimension + 2; by default chosen from the dimension.
    pub walkers: Option<usize>,
    /// The seed that every random number follows from.
    pub seed: u64,
    /// Effective samples that every watched parameter must reach, in the bulk.
    pub effective_samples: f64,
    /// Indices of the parameters that must reach `effective_samples`. The others (all, if this is empty) need only
    /// `minimum_effective_samples`.
    pub watched: Vec<usize>,
    /// Evaluations of the likelihood after which sampling stops unconverged; by default [`DEFAULT_MAXIMUM_EVALUATIONS`].
    pub maximum_evaluations: Option<u64>,
    /// Bulk and tail effective samples that every parameter must reach.
    pub minimum_effective_samples: f64,
    /// Rank-normalised split R̂ that every parameter must stay below.
    pub maximum_rhat: f64,
    /// Draws kept in memory over all ensembles: when they are exceeded, every second one is dropped, and from then on
    /// only every second (fourth, …) step is kept. By default 65,536 or 16 times `effective_samples`, whichever is more.
    pub maximum_draws: Option<usize>,
    /// Weights of the moves by their registry name; empty for the measured defaults of [`crate::moves::move_families`].
    pub move_weights: Vec<(String, f64)>,
}

impl Default for EnsembleSettings {
    fn default() -> Self {
        Self {
            ensembles: 4,
            walkers: None,
            seed: 1,
            effective_samples: 4000.0,
            watched: vec![],
            maximum_evaluations: None,
            minimum_effective_samples: MINIMUM_EFFECTIVE_SAMPLES,
            maximum_rhat: MAXIMUM_RHAT,
            maximum_draws: None,
            move_weights: vec![],
        }
    }
}

impl EnsembleSettings {
    /// Walkers of an ensemble over `dimension` coordinates: the halves span the space with a few to spare.
    pub fn walkers_for(&self, dimension: usize) -> usize {
        self.walkers.unwrap_or_else(|| (2 * dimension + 8).next_multiple_of(4).max(16))
    }

    /// Draws that are kept at most.
    pub(crate) fn draws_at_most(&self) -> usize {
        self.maximum_draws.unwrap_or_else(|| ((16.0 * self.effective_samples).min(1e9) as usize).max(1 << 16))
    }

    /// How draws are thinned on the way, so that memory is bounded however long a run gets; for people.
    pub fn thinning_rule(&self) -> String {
        format!(
            "every step is kept at first; whenever more than {} draws would be, every second of them is dropped, and from \
             then on every second step (fourth, eighth, …) is kept",
            self.draws_at_most()
        )
    }

    /// Refuses settings that cannot work for `dimension` coordinates.
    pub(crate) fn check(&self, dimension: usize, completed: Option<usize>) -> Result<(), SamplerError> {
        let numbers = completed.unwrap_or(dimension);
        let wrong = |setting, rule: String, value: String, way_out| {
            Err(SamplerError::Setting { setting, rule, value, way_out })
        };
        if self.ensembles < 2 {
            let way_out = "R̂ compares ensembles; leave it out for 4";
            return wrong("ensembles", "at least 2".to_owned(), self.ensembles.to_string(), way_out);
        }
        let least = (2 * dimension + 2).max(6);
        if let Some(walkers) = self.walkers.filter(|walkers| *walkers < least || !walkers.is_multiple_of(2)) {
            let way_out = "leave it out to have it chosen from the dimension";
            return wrong("walkers", format!("even and at least {least}"), walkers.to_string(), way_out);
        }
        if let Some(watched) = self.watched.iter().find(|watched| **watched >= numbers) {
            let way_out = "parameters are counted from 0";
            return wrong("watched", format!("below {numbers}"), watched.to_string(), way_out);
        }
        if !(self.effective_samples > 0.0 && self.effective_samples.is_finite()) {
            let way_out = "a few thousand suffice for intervals";
            let value = self.effective_samples.to_string();
            return wrong("effective_samples", "finite and above 0".to_owned(), value, way_out);
        }
        if !(self.maximum_rhat > 1.0) {
            let value = self.maximum_rhat.to_string();
            return wrong("maximum_rhat", "above 1".to_owned(), value, "1.01 is what the literature advises");
        }
        Ok(())
    }
}

/// What a run is busy with.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub enum Phase {
    /// Looking for the posterior's peak.
    Peak,
    /// Waiting until the walkers have forgotten where they started.
    WarmUp,
    /// Collecting draws.
    Sampling,
}

/// What the stop rule sees, a few times a second.
#[derive(Debug, Clone, PartialEq)]
pub struct Progress {
    /// What the run is busy with.
    pub phase: Phase,
    /// Evaluations of the likelihood so far, those of the peak search and the warm-up included.
    pub evaluations: u64,
    /// Evaluations at which the run gives up.
    pub maximum_evaluations: u64,
    /// Steps that every walker has made.
    pub steps: u64,
    /// Seconds since the run started.
    pub elapsed_seconds: f64,
    /// Smallest effective samples among the watched parameters (among all, if none is watched) at the last check.
    pub effective_samples: Option<f64>,
    /// What that number must reach.
    pub wanted_samples: f64,
    /// Largest R̂ at the last check, and whose.
    pub worst_rhat: Option<(usize, f64)>,
    /// Estimated evaluations until every test passes, if nothing changes.
    pub remaining_evaluations: Option<f64>,
}

/// What the caller wants next.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Control {
    /// Go on.
    Continue,
    /// Stop after the step at hand, and hand back what there is.
    Stop,
}
