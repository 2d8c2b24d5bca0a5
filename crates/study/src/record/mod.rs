//! What a run leaves behind, as data: the contents of `summary.json`, `manifest.json`, `stability.json`.
//!
//! Unknown numbers are `null` (`None`), never 0. Keys are a contract: scripts read them.

mod manifest;
mod stability;
mod summary;
mod weigh;

pub use manifest::{InputFile, Manifest};
pub use stability::{Stability, StabilityPoint, Variation};
pub use summary::{
    BestFit, BinGoodness, ClockContrastSummary, ClockSummary, DepartureByPart, GeneralRelativity, Mimic,
    Ordered, ParameterSummary, PartAgreement, PartDeparture, SamplerSummary, Summary, SurveyGoodness,
    SwitchedOff, WarningRecord,
};
pub use weigh::{BestOfRecord, ConsistencyRecord, HypothesisRecord, Sensitivity, WeighRecord};
