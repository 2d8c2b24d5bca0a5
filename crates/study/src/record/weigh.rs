//! The contents of `weigh.json`: the evidence of every hypothesis, and what the comparison can bear.

use super::Ordered;
use oddwell_evidence::Estimate;
use oddwell_evidence::comparison::{Consistency, Disagreement, GlobalTail, Verdict, WeightedSummary};
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// `weigh.json`.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct WeighRecord {
    /// The study's title.
    pub study: String,
    /// The hypothesis that odds are against: the first without a departure, else the first.
    pub reference: String,
    /// Whether the estimators of every hypothesis agree within their errors.
    pub agree: bool,
    /// Whether log evidences lack a constant that is the same for all (then only odds are given): the noise is no density.
    pub relative: bool,
    /// Every hypothesis, in the order of the study.
    pub hypotheses: Vec<HypothesisRecord>,
    /// What light sees of the departure, `T − 1`, and the clock contrast, bin by bin, averaged over hypotheses.
    pub average: Ordered<WeightedSummary>,
    /// One departure for all against one each.
    pub consistency: Vec<ConsistencyRecord>,
    /// The best of many bins, or shapes.
    pub best_of: Vec<BestOfRecord>,
    /// What to know before believing it.
    pub notes: Vec<String>,
    /// The seed of all random numbers.
    pub seed: u64,
    /// Threads available.
    pub threads: usize,
    /// Likelihood evaluations of everything.
    pub evaluations: u64,
    /// Seconds from begin to end.
    pub wall_seconds: f64,
}

/// One hypothesis.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct HypothesisRecord {
    /// The hypothesis.
    pub name: String,
    /// Its shape.
    pub departure: String,
    /// Who feels it.
    pub felt_by: String,
    /// How probable it was held to be before the data, relative to the others.
    pub weight: f64,
    /// What the estimators come down to; null where none could be had, or where only odds are known.
    pub log_evidence: Option<f64>,
    /// Standard error of it.
    pub error: Option<f64>,
    /// Weight and evidence over those of the reference; null where the data do not test the hypothesis.
    pub odds: Option<f64>,
    /// Standard error of the odds' logarithm.
    pub log_odds_error: Option<f64>,
    /// Among all hypotheses that the data test.
    pub probability: Option<f64>,
    /// Every estimator; null where it does not apply.
    pub estimators: Ordered<Option<Estimate>>,
    /// Why those that are null do not apply.
    pub not_applicable: Ordered<String>,
    /// Whether those that vote agree.
    pub agree: bool,
    /// Pairs that do not.
    pub disagreements: Vec<Disagreement>,
    /// Whether the data test its departure: null where it has none that is inferred.
    pub tested: Option<bool>,
    /// Largest difference between posterior and prior distribution functions of its departure's quantities.
    pub distance_from_prior: Option<f64>,
    /// How the odds hang on the prior of the departure.
    pub sensitivity: Option<Sensitivity>,
    /// Likelihood evaluations, those of the posterior included.
    pub evaluations: u64,
    /// Seconds of work, over all threads.
    pub seconds: f64,
    /// Folder of its posterior in the run directory; null where there is nothing to infer.
    pub run: Option<String>,
}

/// How odds against the reference hang on the width of the departure's prior.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Sensitivity {
    /// Half the central 68 % of the prior of each departure quantity, as used.
    pub width: f64,
    /// The width closest to it at which the odds, prior odds included, turn; null where no width turns them.
    pub turning_width: Option<f64>,
    /// Whether wider priors than that favour the reference.
    pub wider_favours_reference: Option<bool>,
    /// The largest ratio of evidences that any width gives.
    pub largest: f64,
    /// The width that gives it.
    pub largest_width: f64,
    /// Two-sided tail probability of general relativity by the data alone; null where it is not known.
    pub tail_probability: Option<f64>,
    /// The largest odds that a prior of any reasonable form could give to that tail.
    pub bound: Option<f64>,
    /// What the odds come to.
    pub verdict: Verdict,
    /// Widths …
    pub widths: Vec<f64>,
    /// … and the natural logarithm of the ratio of evidences at each.
    pub log_ratios: Vec<f64>,
}

/// One departure for all surveys, or bins, against one each.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct ConsistencyRecord {
    /// `surveys` or `bins`.
    pub of: String,
    /// What is compared.
    #[serde(flatten)]
    pub consistency: Consistency,
}

/// The best of several departures.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct BestOfRecord {
    /// `bins of NAME`, or `shapes`.
    pub of: String,
    /// Which is the best.
    pub best: String,
    /// How many there are.
    pub number: usize,
    /// Its tails, alone and as the best of all.
    #[serde(flatten)]
    pub tail: GlobalTail,
}
