//! The contents of `stability.json`: the departure under other cuts of the data and other assumptions.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// `stability.json`.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Stability {
    /// The departure's parameter that is followed.
    pub parameter: String,
    /// Whether the measurements are blinded: then means are null, and differences stay.
    pub blinded: bool,
    /// The run itself.
    pub whole: StabilityPoint,
    /// Everything that was changed, in the order in which it is read.
    pub variations: Vec<Variation>,
}

/// A posterior of the departure.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct StabilityPoint {
    /// Mean; null while blinded.
    pub mean: Option<f64>,
    /// Standard deviation.
    pub sd: Option<f64>,
    /// Monte Carlo standard error of the mean.
    pub mcse: Option<f64>,
    /// Whether every parameter passed every test.
    pub converged: bool,
    /// Measured numbers used.
    pub data_points: usize,
}

/// One change of the data or of the assumptions.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Variation {
    /// What kind of change: `smallest`, `largest` (separation or wavenumber), `without`, `only`, `noise`, `growth`.
    pub kind: String,
    /// What was changed, in words.
    pub text: String,
    /// The bin or survey concerned; null where there is none.
    pub place: Option<String>,
    /// The posterior; null where it could not be had, and `reason` says why.
    pub found: Option<StabilityPoint>,
    /// Why there is none.
    pub reason: Option<String>,
    /// Its mean less the whole run's.
    pub difference: Option<f64>,
    /// The standard deviation that such a difference must have by chance, where the data are a subset of the whole run's:
    /// √(sd² − whole sd²), and the Monte Carlo errors of both means; null where the data are the same.
    pub expected_scatter: Option<f64>,
}
