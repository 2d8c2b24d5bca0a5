//! The posterior's peak and the normal approximation around it.

mod coordinates;
mod evaluator;
mod hessian;
mod polish;
mod search;

pub use search::{PeakSettings, find_peak, find_peak_with};

use nalgebra::DMatrix;
use serde::{Deserialize, Serialize};

/// A lower peak.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct OtherPeak {
    /// Coordinates.
    pub point: Vec<f64>,
    /// Log posterior there.
    pub log_posterior: f64,
    /// Laplace covariance there.
    pub covariance: DMatrix<f64>,
}

/// The point of highest posterior density, and the Laplace approximation there.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Peak {
    /// Coordinates.
    pub point: Vec<f64>,
    /// Log prior density there.
    pub log_prior: f64,
    /// Log likelihood there.
    pub log_likelihood: f64,
    /// Sum of both: the log posterior density up to the log evidence.
    pub log_posterior: f64,
    /// Laplace covariance: inverse of −∂² log posterior, from central differences (see [`find_peak`]).
    pub covariance: DMatrix<f64>,
    /// Dimensions whose peak lies on an end of the prior's support. Their variance is the squared distance from the edge
    /// at which the log posterior has fallen by ½, uncorrelated with anything.
    pub at_edge: Vec<usize>,
    /// Whether a direction was as flat as the prior or rising, so that its variance was bounded by the prior's spread.
    /// The covariance then serves to start walkers, not to quote errors or evidences.
    pub bounded_by_prior: bool,
    /// Whether the search ended at a point where a Newton step promises less than 1e-6 of log posterior.
    pub polished: bool,
    /// Other peaks that are not negligible, across a valley of the log posterior from this one and from each other.
    pub others: Vec<OtherPeak>,
    /// Evaluations of the likelihood that the search took.
    pub evaluations: u64,
}
