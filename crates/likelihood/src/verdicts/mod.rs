//! The data's own verdicts: what measurements and covariance say about themselves before anything is fitted.
//!
//! Numbers only: what is suspicious, and in which words, is for the caller. Every verdict compares measurements with an
//! [`Expectation`] (a prediction and how uncertain its parameters make it) by way of a [`Comparison`], one file each.
//! Where a number is a p-value, it is uniform for sound data, or larger (said there); where it is a `sigma`, it is the
//! standard normal deviate of such a p-value.

mod alternative;
mod amplitude;
mod comparison;
mod conditioning;
mod deviate;
mod duplicates;
mod error_budget;
mod factored;
mod goodness_of_fit;
mod leakage;
mod mock_sufficiency;
mod normality;
mod order;
mod orientation;
mod parity;
mod scale;
mod signal;
mod spectrum;

pub use alternative::{Preference, preference};
pub use amplitude::{Amplitude, amplitude, amplitude_error};
pub use comparison::{Comparison, Expectation, VerdictError};
pub use deviate::upper_tail;
pub use duplicates::{Duplicate, duplicate};
pub use error_budget::{BudgetEntry, error_budget};
pub use goodness_of_fit::{Goodness, goodness};
pub use leakage::leakage_direction;
pub use mock_sufficiency::{MockSufficiency, mock_sufficiency};
pub use normality::{Normality, anderson_darling, normality, whitened_residuals};
pub use order::{RowOrder, Swap, row_order};
pub use orientation::{Orientation, orientation};
pub use parity::{ParityBlock, parity_block};
pub use scale::{CovarianceScale, covariance_scale};
pub use signal::{Signal, signal};
pub use spectrum::{Mode, Spectrum, spectrum};
