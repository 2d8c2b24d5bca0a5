//! From a resolved study to something that can be evaluated: measurements read, model built, posterior ready.

mod measurements;
mod posterior;
mod power_table;

pub use measurements::{Measurements, SurveyMeasurements, read_measurements};
pub(crate) use posterior::model_setup;
pub use posterior::{Posterior, PosteriorScratch};
