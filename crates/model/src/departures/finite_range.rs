//! A departure mediated by a field of finite range.

use super::{Departure, DepartureParameter, FeltBy, TAU};
use crate::error::ModelError;
use oddwell_cosmology::Background;

/// A departure mediated by a field of finite range.
#[derive(Debug)]
pub(super) struct FiniteRange;

impl Departure for FiniteRange {
    fn name(&self) -> &'static str {
        "finite-range"
    }

    fn formula(&self) -> &'static str {
        "τ = τ0 k²/(k² + a²/λ²)"
    }

    fn manual(&self) -> &'static str {
        "A departure that acts within a proper length λ = range (Mpc/h, above 0) and dies beyond it: λ → ∞ is the constant shape, λ → 0 general relativity. Growth and T depend on k. Felt by everything, Ψ and the acceleration cancel in the odd multipoles and only growth is left: then they hardly test it."
    }

    fn parameters(&self) -> &'static [DepartureParameter] {
        &[
            TAU,
            DepartureParameter {
                name: "range",
                meaning: "proper length λ in Mpc/h, above 0",
                general_relativity: Some(0.0),
            },
        ]
    }

    fn allowed(&self) -> &'static [FeltBy] {
        &FeltBy::ALL
    }

    fn scale_dependent(&self) -> bool {
        true
    }

    fn check(&self, parameters: &[f64]) -> Result<(), ModelError> {
        if parameters[1] > 0.0 {
            return Ok(());
        }
        Err(ModelError::Departure {
            parameter: "range",
            value: parameters[1],
            rule: "the range is a proper length in Mpc/h, above 0; a tiny one is general relativity",
        })
    }

    fn tau(&self, parameters: &[f64], background: &Background, a: f64, k: f64) -> f64 {
        let _ = background;
        let mass = a / parameters[1];
        parameters[0] * k * k / (k * k + mass * mass)
    }
}
