//! One free departure a bin.

use super::{Departure, DepartureParameter, FeltBy, Spread, TAU};
use oddwell_cosmology::Background;

/// One free departure a bin.
#[derive(Debug)]
pub(super) struct PerBin;

impl Departure for PerBin {
    fn name(&self) -> &'static str {
        "per-bin"
    }

    fn formula(&self) -> &'static str {
        "τ = one value a bin"
    }

    fn manual(&self) -> &'static str {
        "One value a bin, all with the same prior: nothing is assumed of how a departure changes with time. Goes with light only, since growth would need τ between the bins."
    }

    fn parameters(&self) -> &'static [DepartureParameter] {
        &[TAU]
    }

    fn allowed(&self) -> &'static [FeltBy] {
        &[FeltBy::Light]
    }

    fn spread(&self) -> Spread {
        Spread::PerBin
    }

    fn tau(&self, parameters: &[f64], background: &Background, a: f64, k: f64) -> f64 {
        let _ = (background, a, k);
        parameters[0]
    }
}
