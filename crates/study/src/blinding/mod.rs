//! Blinding: measurements shifted by a secret departure, so that nobody can steer an analysis towards an answer.
//!
//! As Muir et al. 2020 (MNRAS 494, 4454) do for data vectors: what is added is the *predicted difference* between a secret
//! departure and none, so that the blinded measurements are as smooth and as consistent between bins as the true ones. The
//! departure is constant, felt by light, one for the whole joint analysis; its standard deviation is at least three times
//! what the study expects to measure it to. The study that comes out commits to the phrase by a salted SHA-256.

mod blind;
mod frozen;
mod reveal;
mod secret;
mod withhold;

pub use blind::{Blinded, blind};
pub use reveal::{Revealed, reveal};
pub use withhold::withhold;

/// Why something is not shown, for every place that withholds it.
pub const WITHHELD: &str = "the measurements are blinded: what would tell where the departure lies is withheld until `oddwell reveal`";
