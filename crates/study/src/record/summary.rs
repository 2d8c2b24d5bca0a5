//! The contents of `summary.json`.

use crate::warnings::Warning;
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};
use std::collections::BTreeMap;

/// A map that keeps the order in which parameters stand in the study.
pub type Ordered<T> = indexmap::IndexMap<String, T>;

/// `summary.json`: what a fit says, and what it is worth.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Summary {
    /// The study's title.
    pub study: String,
    /// The surveys and bins that were left in alone, as `SURVEY` or `SURVEY.BIN`; empty: all.
    #[serde(default)]
    pub only: Vec<String>,
    /// Those that were left out.
    #[serde(default)]
    pub without: Vec<String>,
    /// The hypothesis fitted.
    pub hypothesis: String,
    /// Its shape, as in the registry of departures.
    pub departure: String,
    /// Who feels it.
    pub felt_by: String,
    /// Whether every parameter passed every test.
    pub converged: bool,
    /// Whether the measurements are blinded.
    pub blinded: bool,
    /// What to look at before believing the numbers.
    pub warnings: Vec<WarningRecord>,
    /// Every inferred parameter by its full name, then derived quantities (`derived.*`).
    pub parameters: Ordered<ParameterSummary>,
    /// The names of the departure's inferred parameters.
    pub departure_parameters: Vec<String>,
    /// The highest posterior density found.
    pub best: BestFit,
    /// Where general relativity lies; absent parts are null.
    pub general_relativity: GeneralRelativity,
    /// What it would take for general relativity to give the same data (only where the departure is above 1 σ).
    pub mimics: Vec<Mimic>,
    /// What it means for clocks, bin by bin.
    #[serde(default)]
    pub clocks: Vec<ClockSummary>,
    /// The departure from each survey and each bin, and whether they agree; null where there is but one bin, or no
    /// amplitude to compare.
    #[serde(default)]
    pub by_part: Option<DepartureByPart>,
    /// The largest effect that the study leaves out of its predictions; null where it leaves out none, or where the data
    /// could not tell.
    #[serde(default)]
    pub switched_off: Option<SwitchedOff>,
    /// What sampling cost.
    pub sampler: SamplerSummary,
}

/// A warning as data.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct WarningRecord {
    /// A word for scripts.
    pub code: String,
    /// What it is and what to try next.
    pub text: String,
    /// The parameter, survey or file concerned.
    #[serde(rename = "where")]
    pub place: String,
}

impl From<&Warning> for WarningRecord {
    fn from(warning: &Warning) -> Self {
        Self { code: warning.code().to_owned(), text: warning.text(), place: warning.place().to_owned() }
    }
}

/// One inferred or derived quantity.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct ParameterSummary {
    /// Posterior mean.
    pub mean: Option<f64>,
    /// Posterior standard deviation.
    pub sd: Option<f64>,
    /// Posterior median.
    pub median: Option<f64>,
    /// Central 68 %.
    pub interval68: Option<[f64; 2]>,
    /// Central 95 %.
    pub interval95: Option<[f64; 2]>,
    /// Prior mean; null for derived quantities and where a prior has none.
    pub prior_mean: Option<f64>,
    /// Prior standard deviation; null for derived quantities and where a prior has none.
    pub prior_sd: Option<f64>,
    /// Bulk effective samples.
    pub ess: Option<f64>,
    /// Tail effective samples.
    pub ess_tail: Option<f64>,
    /// Rank-normalised split R̂.
    pub rhat: Option<f64>,
    /// Monte Carlo standard error of the mean.
    pub mcse: Option<f64>,
}

/// The best point found and how well it fits.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct BestFit {
    /// Its coordinates.
    pub parameters: Ordered<f64>,
    /// Log likelihood, constants included.
    pub log_likelihood: f64,
    /// Log prior plus log likelihood.
    pub log_posterior: f64,
    /// χ² of all surveys.
    pub chi2: f64,
    /// Measured numbers kept.
    pub data_points: usize,
    /// Trace of the data's share of the Fisher information.
    pub effective_parameters: Option<f64>,
    /// Probability of a χ² at least this large, with data_points − effective_parameters degrees of freedom.
    pub p_value: Option<f64>,
    /// By survey.
    pub surveys: Vec<SurveyGoodness>,
}

/// χ² of one survey.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct SurveyGoodness {
    /// The survey.
    pub name: String,
    /// χ².
    pub chi2: f64,
    /// Measured numbers kept.
    pub data_points: usize,
    /// Its share of the effective parameters.
    pub effective_parameters: Option<f64>,
    /// Probability of a χ² at least this large.
    pub p_value: Option<f64>,
    /// By bin, each by its own covariance.
    pub bins: Vec<BinGoodness>,
}

/// χ² of one bin alone, by its own block of the covariance.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct BinGoodness {
    /// The bin.
    pub name: String,
    /// χ².
    pub chi2: f64,
    /// Measured numbers kept.
    pub data_points: usize,
    /// Its share of the effective parameters.
    pub effective_parameters: Option<f64>,
    /// Probability of a χ² at least this large.
    pub p_value: Option<f64>,
}

/// Where general relativity lies in the departure's posterior.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct GeneralRelativity {
    /// Two-sided tail probability: how much of the posterior lies farther out than general relativity.
    pub tail_probability: Option<f64>,
    /// The same in standard deviations of a normal, signed as the departure; null where general relativity lies on a
    /// boundary, and where there are several departure parameters.
    pub sigma: Option<f64>,
    /// How the tail was found: `chain` (counted), `normal` (too far out to count: from mean and covariance).
    pub from: Option<String>,
}

/// An error in a group of nuisances with which general relativity gives nearly the same data.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Mimic {
    /// `evolution`, `magnification` or `offset`.
    pub nuisance: String,
    /// The common shift of all of them that comes closest; in km/s for offsets.
    pub shift: f64,
    /// What the priors allow for such a common shift (standard deviation); null where it is held.
    pub allowed: Option<f64>,
    /// How nearly the same: cosine between the two changes of the data, in units of the noise; 1 is exactly the same.
    pub likeness: f64,
}

/// How differently clocks tick in a bin: the rms difference in rate between two places, `derived.clock_contrast`.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct ClockSummary {
    /// The survey.
    pub survey: String,
    /// The bin.
    pub bin: String,
    /// How far apart the clocks stand, comoving, Mpc/h.
    pub distance: f64,
    /// Seconds a year: the posterior.
    pub seconds_per_year: ClockContrastSummary,
    /// Seconds a year in general relativity: the same study without a departure, at the best point.
    pub general_relativity: Option<f64>,
    /// Share of the square that comes from wavenumbers that the bin's measurements reach, at the best point, 0 to 1; the
    /// rest is the shape's word. Separations from s₁ to s₂ reach from π/s₂ to π/s₁, wavenumbers themselves.
    pub share_reached: Option<f64>,
}

/// The posterior of a clock contrast.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct ClockContrastSummary {
    /// Mean.
    pub mean: Option<f64>,
    /// Standard deviation.
    pub sd: Option<f64>,
    /// Central 68 %.
    pub interval68: Option<[f64; 2]>,
}

/// The amplitude of the departure by parts of the data: linear about the best point, without the departure's own prior.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct DepartureByPart {
    /// By survey; empty where there is but one.
    pub surveys: Vec<PartDeparture>,
    /// Whether the surveys agree; null where there is but one, or where the data leave one open.
    pub survey_agreement: Option<PartAgreement>,
    /// By bin.
    pub bins: Vec<PartDeparture>,
    /// Whether the bins agree; null as for surveys.
    pub bin_agreement: Option<PartAgreement>,
}

/// The amplitude of the departure from one part of the data.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct PartDeparture {
    /// The survey.
    pub survey: String,
    /// The bin; null for a survey as a whole.
    pub bin: Option<String>,
    /// From this part's rows alone, nuisances as far as their priors and these rows know them; null while blinded, or where
    /// they leave it open.
    pub value: Option<f64>,
    /// Its standard deviation.
    pub sd: Option<f64>,
    /// From all rows together, one amplitude a part, nuisances in common; null as for `value`.
    pub together: Option<f64>,
    /// Its standard deviation.
    pub together_sd: Option<f64>,
}

/// χ² of the amplitudes of all parts, estimated together, about their mean, with what they share in their covariance.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct PartAgreement {
    /// χ².
    pub chi2: f64,
    /// Degrees of freedom: one less than there are parts.
    pub degrees_of_freedom: usize,
    /// Probability of a χ² at least this large where all parts have the same amplitude.
    pub p_value: Option<f64>,
}

/// An effect that is left out of the predictions.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct SwitchedOff {
    /// `wide_angle`, `light_cone`, `lensing`, or `offset`.
    pub effect: String,
    /// What it would be taken for: the departure felt by light whose change of the data, in units of the noise, is most
    /// like the effect's. Of an offset, for 10 km/s.
    pub tau: f64,
}

/// What sampling cost. `evaluations` and `wall_seconds` run from the first evaluation to the last, warm-up included.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct SamplerSummary {
    /// Independent ensembles.
    pub ensembles: usize,
    /// Walkers of each.
    pub walkers: usize,
    /// Steps of every walker, warm-up included.
    pub steps: u64,
    /// Steps dropped as warm-up.
    pub warm_up: u64,
    /// Every how many steps a draw is kept.
    pub thinning: u64,
    /// Likelihood evaluations.
    pub evaluations: u64,
    /// Evaluations that gave no likelihood, by reason.
    pub rejected_evaluations: u64,
    /// The first reasons for those, with their counts.
    pub rejected_reasons: BTreeMap<String, u64>,
    /// Seconds.
    pub wall_seconds: f64,
    /// Evaluations a second.
    pub evaluations_per_second: f64,
    /// Accepted share of all proposals after warm-up.
    pub acceptance: Option<f64>,
    /// Accepted share by move.
    pub acceptance_by_move: BTreeMap<String, Option<f64>>,
    /// Threads available.
    pub threads: usize,
    /// The seed.
    pub seed: u64,
}
