//! What a run leaves behind, as data: the contents of `summary.json` and `manifest.json`.
//!
//! Unknown numbers are `null` (`None`), never 0. Keys are a contract: scripts read them.

mod manifest;
mod summary;

pub use manifest::{InputFile, Manifest};
pub use summary::{
    BestFit, BinGoodness, ClockContrastSummary, ClockSummary, GeneralRelativity, Mimic, Ordered,
    ParameterSummary, SamplerSummary, Summary, SurveyGoodness, SwitchedOff, WarningRecord,
};
