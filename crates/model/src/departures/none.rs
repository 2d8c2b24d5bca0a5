//! General relativity: no departure.

use super::{Departure, DepartureParameter, FeltBy};
use oddwell_cosmology::Background;

/// General relativity: no departure.
#[derive(Debug)]
pub(super) struct None;

impl Departure for None {
    fn name(&self) -> &'static str {
        "none"
    }

    fn formula(&self) -> &'static str {
        "τ = 0"
    }

    fn manual(&self) -> &'static str {
        "General relativity. T = G = 1: matter and light feel the same Ψ, with k²Ψ = −(3/2) H² Ωm(a) δ."
    }

    fn parameters(&self) -> &'static [DepartureParameter] {
        &[]
    }

    fn allowed(&self) -> &'static [FeltBy] {
        &FeltBy::ALL
    }

    fn tau(&self, parameters: &[f64], background: &Background, a: f64, k: f64) -> f64 {
        let _ = (parameters, background, a, k);
        0.0
    }
}
