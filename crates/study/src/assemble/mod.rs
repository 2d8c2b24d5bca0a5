//! From a resolved study to something that can be evaluated: measurements read, model built, posterior ready.

mod covariances;
mod determined;
mod domain;
mod elsewhere;
mod integrated;
mod matrix_file;
mod measurements;
mod posterior;
mod power_table;
mod projection;
mod survey_rows;
mod templates;
mod window;

pub(crate) use determined::with_one_noise;
pub(crate) use elsewhere::predict_elsewhere;
pub use integrated::{IntegratedPosterior, IntegratedPosteriorScratch};
pub(crate) use measurements::read_rows_only;
pub use measurements::{Measurements, NoiseGroup, SurveyMeasurements, SurveyTemplate, read_measurements};
pub(crate) use posterior::model_setup;
pub use posterior::{Posterior, PosteriorScratch};
pub use window::SurveyWindow;
