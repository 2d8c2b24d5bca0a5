//! Why there is no evidence.

use oddwell_sampler::SamplerError;
use thiserror::Error;

/// An estimate that was not made.
#[derive(Debug, Error)]
#[non_exhaustive]
pub enum EvidenceError {
    /// The estimator's assumptions do not hold.
    #[error("`{estimator}` does not apply: {reason}")]
    NotApplicable {
        /// The estimator's name in the registry.
        estimator: &'static str,
        /// Which assumption fails, and on what.
        reason: String,
    },
    /// No draw of the prior has a likelihood above zero.
    #[error(
        "evidence: none of {tried} draws of the prior has a likelihood above zero; move the priors to where the model has an answer"
    )]
    NoLikelihood {
        /// Draws that were tried.
        tried: usize,
    },
    /// A likelihood that cannot be integrated.
    #[error("evidence: an evaluation failed at {point:?}: {reason}")]
    Evaluation {
        /// What went wrong.
        reason: String,
        /// Where.
        point: Vec<f64>,
    },
    /// A run that does not come to an end.
    #[error(
        "evidence: `{estimator}` has not ended after {evaluations} evaluations; narrow the priors, or allow more"
    )]
    TooLong {
        /// The estimator's name in the registry.
        estimator: &'static str,
        /// Evaluations made.
        evaluations: u64,
    },
    /// A setting that cannot work.
    #[error("evidence: {setting} must be {rule}, got {value}")]
    Setting {
        /// Name of the setting.
        setting: &'static str,
        /// What it must be.
        rule: &'static str,
        /// What it was.
        value: String,
    },
    /// The moves could not be made.
    #[error(transparent)]
    Sampler(#[from] SamplerError),
    /// The caller asked for the end.
    #[error("evidence: stopped by the caller before there was an estimate")]
    Stopped,
}
