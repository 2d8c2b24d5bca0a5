//! What an estimator hands back.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// A log evidence with a standard error, what it cost, and what it is worth.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Estimate {
    /// Natural logarithm of ∫ prior × likelihood.
    pub log_evidence: f64,
    /// Standard error.
    pub error: f64,
    /// Likelihood evaluations.
    pub evaluations: u64,
    /// Whether it counts when estimates are compared; if not, `doubt` says why.
    pub votes: bool,
    /// Why it should not be relied on; `None` where nothing speaks against it.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub doubt: Option<String>,
    /// The log evidence of each independent run.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub runs: Vec<f64>,
    /// Information that the data give, in nats: ∫ posterior ln(posterior/prior).
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub information: Option<f64>,
    /// Probability of insertion indices as uneven as these, were the draws inside the bound independent.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub insertion_p_value: Option<f64>,
    /// Powers of the likelihood on the ladder between prior and posterior, both ends included.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub ladder: Vec<f64>,
    /// Share of draws of the normal approximation that count as draws of the posterior, 1 where the posterior is normal.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub normality: Option<f64>,
}

impl Estimate {
    /// A plain one that votes.
    pub(crate) fn new(log_evidence: f64, error: f64, evaluations: u64) -> Self {
        Self {
            log_evidence,
            error,
            evaluations,
            votes: true,
            doubt: None,
            runs: vec![],
            information: None,
            insertion_p_value: None,
            ladder: vec![],
            normality: None,
        }
    }

    /// The same, but not to be relied on.
    pub(crate) fn doubted(mut self, why: String) -> Self {
        self.votes = false;
        self.doubt = Some(why);
        self
    }
}
