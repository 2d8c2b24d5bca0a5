//! Priors, posterior sampling and what a chain is worth.
//!
//! This crate knows a [`Target`] (a log prior and a log likelihood over a fixed number of dimensions) and nothing of what
//! it samples; it reads and writes no files.

mod chain;
pub mod diagnostics;
mod direct;
mod ensemble;
mod error;
mod history;
pub mod moves;
mod peak;
pub mod priors;
mod proposals;
mod run;
mod settings;
mod start;
mod state;
mod stopping;
mod target;
mod warm_up;

pub use chain::{
    BestPoint, Chain, Draw, FailedTest, MoveAcceptance, Outcome, RejectedEvaluations, StopReason, Test,
};
pub use error::SamplerError;
pub use peak::{OtherPeak, Peak, PeakSettings, find_peak, find_peak_with};
pub use priors::{JointNormal, Prior, PriorError, PriorFamily, PriorSet, PriorShape, SharedPrior, Truncated};
pub use priors::{build_prior, prior_families, prior_family};
pub use run::{sample, sample_with};
pub use settings::{Control, EnsembleSettings, Phase, Progress};
pub use settings::{
    DEFAULT_MAXIMUM_EVALUATIONS, MAXIMUM_RHAT, MAXIMUM_WALKER_RHAT, MINIMUM_EFFECTIVE_SAMPLES,
};
pub use state::RunState;
pub use target::{EvaluationFailure, Target};
