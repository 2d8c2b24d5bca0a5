//! What is sampled: a log prior and a log likelihood over points of a fixed dimension.

use crate::moves::Random;
use thiserror::Error;

/// A posterior density to explore: prior times likelihood over `dimension()` real numbers.
///
/// Threads evaluate side by side, each with its own [`Target::Scratch`], so an evaluation needs neither locks nor
/// allocation.
pub trait Target: Sync {
    /// Working memory of one thread.
    type Scratch: Send;

    /// Number of coordinates of a point.
    fn dimension(&self) -> usize;

    /// Makes the working memory of one thread.
    fn scratch(&self) -> Self::Scratch;

    /// Natural logarithm of the normalised prior density at `point`; −∞ outside the support.
    ///
    /// The likelihood is never asked for where this is −∞ or NaN.
    fn log_prior(&self, point: &[f64]) -> f64;

    /// Natural logarithm of the likelihood at `point`.
    ///
    /// # Errors
    /// [`EvaluationFailure::Rejected`] where the model has no answer at this point (the point is rejected and counted);
    /// [`EvaluationFailure::Fatal`] where going on makes no sense. A returned NaN or +∞ counts as rejected; −∞ is a
    /// likelihood of zero.
    fn log_likelihood(&self, point: &[f64], scratch: &mut Self::Scratch) -> Result<f64, EvaluationFailure>;

    /// Numbers of a completed draw, for a target with quantities integrated out that are drawn back for the chain; `None`
    /// where a draw is the point itself.
    fn completed_dimension(&self) -> Option<usize> {
        None
    }

    /// Draws the quantities that were integrated out, given `point`, and writes the completed draw. Returns its own log prior
    /// and log likelihood.
    ///
    /// # Errors
    /// As [`Target::log_likelihood`]; by default always, since nothing was integrated out.
    fn complete(
        &self,
        _point: &[f64],
        _random: &mut Random,
        _scratch: &mut Self::Scratch,
        _draw: &mut [f64],
    ) -> Result<(f64, f64), EvaluationFailure> {
        Err(EvaluationFailure::Fatal { reason: "no quantity was integrated out".to_owned() })
    }
}

/// Why an evaluation gave no likelihood.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum EvaluationFailure {
    /// The model has no answer here; the point counts as one of likelihood zero, and the reason is kept.
    #[error("point rejected: {reason}")]
    Rejected {
        /// What was not computable, naming the term.
        reason: String,
    },
    /// Sampling stops; what was sampled until then is handed back.
    #[error("evaluation failed: {reason}")]
    Fatal {
        /// What went wrong.
        reason: String,
    },
}
