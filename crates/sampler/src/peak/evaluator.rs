//! The log posterior as the peak search sees it: counted, and −∞ wherever there is no answer.

use crate::error::SamplerError;
use crate::target::{EvaluationFailure, Target};

/// Log prior and log likelihood of one point.
#[derive(Debug, Clone, Copy)]
pub(super) struct Height {
    pub(super) log_prior: f64,
    pub(super) log_likelihood: f64,
}

impl Height {
    pub(super) fn log_posterior(self) -> f64 {
        self.log_prior + self.log_likelihood
    }
}

/// Evaluates a target, counts, and keeps the first failure of each kind.
pub(super) struct Evaluator<'a, T: Target> {
    target: &'a T,
    scratch: T::Scratch,
    pub(super) evaluations: u64,
    pub(super) first_rejection: Option<String>,
    pub(super) fatal: Option<(String, Vec<f64>)>,
}

impl<'a, T: Target> Evaluator<'a, T> {
    pub(super) fn new(target: &'a T) -> Self {
        Self { target, scratch: target.scratch(), evaluations: 0, first_rejection: None, fatal: None }
    }

    /// The height of a point; −∞ outside the support, where the model has no answer, and after a fatal failure.
    pub(super) fn height(&mut self, point: &[f64]) -> Height {
        let nowhere = Height { log_prior: f64::NEG_INFINITY, log_likelihood: f64::NEG_INFINITY };
        let log_prior = self.target.log_prior(point);
        if self.fatal.is_some() || !log_prior.is_finite() {
            return nowhere;
        }
        self.evaluations += 1;
        match self.target.log_likelihood(point, &mut self.scratch) {
            Ok(log_likelihood) if log_likelihood.is_finite() => Height { log_prior, log_likelihood },
            Ok(_) => nowhere,
            Err(EvaluationFailure::Rejected { reason }) => {
                self.first_rejection.get_or_insert(reason);
                nowhere
            }
            Err(EvaluationFailure::Fatal { reason }) => {
                self.fatal = Some((reason, point.to_vec()));
                nowhere
            }
        }
    }

    /// The log posterior of a point.
    pub(super) fn log_posterior(&mut self, point: &[f64]) -> f64 {
        self.height(point).log_posterior()
    }

    /// Turns a fatal failure into an error.
    pub(super) fn check(&mut self) -> Result<(), SamplerError> {
        match self.fatal.take() {
            Some((reason, point)) => Err(SamplerError::Evaluation { reason, point, partial: None }),
            None => Ok(()),
        }
    }
}
