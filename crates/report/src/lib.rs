//! Results in, text out: what a person reads of a study, a prediction or a fit.
//!
//! This crate never reads or writes files and computes no result; it only chooses words and digits.

mod check;
mod closing;
mod figure;
mod manual;
mod numbers;
mod page;
mod prediction;
mod references;
mod run_table;
mod show;
mod style;
mod text;
mod weigh;

pub use check::check_text;
pub use closing::closing_summary;
pub use figure::Figure;
pub use manual::{manual_check, manual_data, manual_estimator, manual_text, manual_topics, manual_weigh};
pub use numbers::{count, duration, signed, significant, whole};
pub use page::{Page, PageInput, page};
pub use prediction::{EffectColumns, prediction_csv, prediction_json};
pub use references::{Reference, bibliography, references};
pub use run_table::{TableFormat, run_table};
pub use show::{show_json, show_table};
pub use style::Style;
pub use weigh::weigh_text;
