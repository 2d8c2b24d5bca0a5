//! Why a run could not be made.

use crate::chain::Chain;
use thiserror::Error;

/// A run that did not start, or broke off.
#[derive(Debug, Error)]
pub enum SamplerError {
    /// A setting that cannot work.
    #[error("sampling: {setting} must be {rule}, got {value}; {way_out}")]
    Setting {
        /// Name of the setting.
        setting: &'static str,
        /// What it must be.
        rule: String,
        /// What it was.
        value: String,
        /// What to do about it.
        way_out: &'static str,
    },
    /// Target and priors disagree about the number of dimensions, or there is none.
    #[error(
        "sampling: the target has {target} dimensions and the prior {prior}; they must be equal and above 0"
    )]
    Dimension {
        /// Dimensions of the target.
        target: usize,
        /// Dimensions of the prior.
        prior: usize,
    },
    /// No point of finite posterior density was found to start from.
    #[error(
        "sampling: none of {tried} draws of the prior has a finite likelihood{}; move the priors to where the model has an answer",
        match reason { Some(reason) => format!(" ({reason})"), None => String::new() }
    )]
    NoStart {
        /// Draws that were tried.
        tried: u64,
        /// The first reason of a rejection, if there was one.
        reason: Option<String>,
    },
    /// An evaluation failed for good.
    #[error("sampling: an evaluation failed at {point:?}: {reason}")]
    Evaluation {
        /// What went wrong.
        reason: String,
        /// Where.
        point: Vec<f64>,
        /// What had been sampled until then, if anything.
        partial: Option<Box<Chain>>,
    },
    /// The state of another run.
    #[error(
        "sampling: the state to go on from belongs to a run with other settings or another number of dimensions; start anew"
    )]
    ForeignState,
    /// The caller stopped the run before there was anything to hand back.
    #[error(
        "sampling: stopped before there was a draw to hand back; allow it more evaluations, or more time"
    )]
    Stopped,
}
