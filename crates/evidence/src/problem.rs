//! What an estimator is given, and how it is watched.

use crate::error::EvidenceError;
use oddwell_sampler::{Chain, Peak, PriorSet, Target};
use serde::{Deserialize, Serialize};
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};

/// An integral of prior times likelihood to be done, and what is known of it already.
#[derive(Debug)]
pub struct Problem<'a, T: Target> {
    /// Log prior (normalised) and log likelihood.
    pub target: &'a T,
    /// The prior of `target`: draws, scales and bounds.
    pub priors: &'a PriorSet,
    /// The seed that every random number follows from.
    pub seed: u64,
    /// The posterior's peak, where it was searched for.
    pub peak: Option<&'a Peak>,
    /// Draws of the posterior, where it was sampled.
    pub chain: Option<&'a Chain>,
    /// A hypothesis of known evidence that this one contains.
    pub contained: Option<&'a Contained>,
}

// By hand: a derived Clone would ask for a target that can be cloned.
impl<T: Target> Clone for Problem<'_, T> {
    fn clone(&self) -> Self {
        *self
    }
}

impl<T: Target> Copy for Problem<'_, T> {}

/// A hypothesis that follows from another by holding some of its parameters, all others with the same priors; parameters
/// that then no longer matter drop out.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Contained {
    /// The parameters that it holds, by dimension.
    pub parameters: Vec<usize>,
    /// At these values.
    pub values: Vec<f64>,
    /// Its log evidence …
    pub log_evidence: f64,
    /// … and the standard error of that.
    pub error: f64,
}

/// Counts evaluations while estimators run, and tells them to stop.
#[derive(Debug, Default)]
pub struct Watch {
    evaluations: AtomicU64,
    stop: AtomicBool,
}

impl Watch {
    /// Nothing counted yet.
    pub fn new() -> Self {
        Self::default()
    }

    /// Likelihood evaluations so far.
    pub fn evaluations(&self) -> u64 {
        self.evaluations.load(Ordering::Relaxed)
    }

    /// Asks every estimator that is watched to end, with [`EvidenceError::Stopped`].
    pub fn stop(&self) {
        self.stop.store(true, Ordering::Relaxed);
    }

    /// Whether it was asked to.
    pub fn stopped(&self) -> bool {
        self.stop.load(Ordering::Relaxed)
    }

    /// Adds evaluations; ends the run that made them if it is to stop.
    pub fn count(&self, evaluations: u64) -> Result<(), EvidenceError> {
        self.evaluations.fetch_add(evaluations, Ordering::Relaxed);
        if self.stopped() { Err(EvidenceError::Stopped) } else { Ok(()) }
    }
}
