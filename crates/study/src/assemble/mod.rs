//! From a resolved study to something that can be evaluated: measurements read, model built, posterior ready.

mod measurements;
mod power_table;
mod problem;

pub use measurements::{Measurements, SurveyMeasurements, read_measurements};
pub use problem::{Problem, ProblemScratch};
