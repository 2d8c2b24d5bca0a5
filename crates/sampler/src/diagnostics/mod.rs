//! What a chain is worth: rank-normalised split R̂, effective sample sizes, Monte Carlo errors, autocorrelation times.
//!
//! The functions over `chains` take one slice a chain, all of equal length, and follow Vehtari, Gelman, Simpson,
//! Carpenter & Bürkner (2021, Bayesian Analysis 16, 667). [`diagnose_ensembles`] adds what walkers of an ensemble need:
//! they are not independent of each other.

mod autocorrelation;
mod density;
mod ensembles;
mod ess;
mod quantiles;
mod ranks;
mod rhat;
mod tails;

pub(crate) use autocorrelation::autocorrelation_time_about;
pub use autocorrelation::{AutocorrelationTime, autocovariance, integrated_autocorrelation_time};
pub use density::{Density, JointDensity, density, joint_density};
pub use ensembles::{ParameterDiagnostics, diagnose_ensembles};
pub(crate) use ensembles::{Shape, diagnose};
pub use ess::{ess_bulk, ess_mean, ess_quantile, ess_tail, mcse_mean};
pub use quantiles::{central_interval, median, quantile, quantile_of_sorted};
pub(crate) use ranks::{ScoreTable, product_sum};
pub use rhat::{rank_normalised_split_rhat, split_rhat};
pub use tails::{Tail, TailSource, tail_of, tail_of_distance};
