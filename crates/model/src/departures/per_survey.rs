//! One free departure a survey.

use super::{Departure, DepartureParameter, FeltBy, Spread, TAU};
use oddwell_cosmology::Background;

/// One free departure a survey.
#[derive(Debug)]
pub(super) struct PerSurvey;

impl Departure for PerSurvey {
    fn name(&self) -> &'static str {
        "per-survey"
    }

    fn formula(&self) -> &'static str {
        "τ = one value a survey"
    }

    fn manual(&self) -> &'static str {
        "One value a survey, all with the same prior: nothing is assumed of how a departure changes with time. Goes with light only, since growth would need τ between the bins."
    }

    fn parameters(&self) -> &'static [DepartureParameter] {
        &[TAU]
    }

    fn allowed(&self) -> &'static [FeltBy] {
        &[FeltBy::Light]
    }

    fn spread(&self) -> Spread {
        Spread::PerSurvey
    }

    fn tau(&self, parameters: &[f64], background: &Background, a: f64, k: f64) -> f64 {
        let _ = (background, a, k);
        parameters[0]
    }
}
