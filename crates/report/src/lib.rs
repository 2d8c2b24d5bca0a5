//! Results in, text out: what a person reads of a study, a prediction or a fit.
//!
//! This crate never reads or writes files and computes no result; it only chooses words and digits.

mod check;
mod closing;
mod manual;
mod numbers;
mod prediction;
mod show;
mod style;
mod text;

pub use check::check_text;
pub use closing::closing_summary;
pub use manual::{manual_check, manual_text, manual_topics};
pub use numbers::{count, duration, signed, significant, whole};
pub use prediction::{EffectColumns, prediction_csv, prediction_json};
pub use show::{show_json, show_table};
pub use style::Style;
