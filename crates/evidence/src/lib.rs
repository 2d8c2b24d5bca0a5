//! Evidences: how probable the data are under a hypothesis, its priors included; and what their comparison can bear.
//!
//! Independent routes, one file each behind the trait [`Estimator`]: [`Nested`] sampling, [`SteppingStones`], the
//! [`DensityRatio`] at a point where one hypothesis becomes another, [`Laplace`]'s approximation and the [`ClosedForm`].
//!
//! This crate knows a prior and a log likelihood ([`oddwell_sampler::Target`]) and nothing of what it weighs; it reads and
//! writes no files.

mod closed_form;
pub mod comparison;
mod density_ratio;
mod error;
mod estimate;
mod estimator;
mod laplace;
mod level;
mod nested;
mod numbers;
mod problem;
mod stepping;
mod walk;

pub use closed_form::ClosedForm;
pub use density_ratio::{ConditionalDensities, DensityRatio, Ratio, conditional_densities};
pub use error::EvidenceError;
pub use estimate::Estimate;
pub use estimator::{Estimator, EstimatorFamily, estimator, estimator_families};
pub use laplace::{LEAST_NORMALITY, Laplace};
pub use nested::{LEAST_INSERTION_PROBABILITY, Nested};
pub use problem::{Contained, Problem, Watch};
pub use stepping::SteppingStones;
pub use walk::Sweeps;
