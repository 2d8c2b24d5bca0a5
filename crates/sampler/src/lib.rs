//! Priors, posterior sampling and what a chain is worth.
//!
//! This crate knows a [`Target`] (a log prior and a log likelihood over a fixed number of dimensions) and nothing of what
//! it samples; it reads and writes no files.

pub mod priors;
mod target;

pub use priors::{JointNormal, Prior, PriorError, PriorFamily, PriorSet, PriorShape, SharedPrior, Truncated};
pub use priors::{build_prior, prior_families, prior_family};
pub use target::{EvaluationFailure, Target};
