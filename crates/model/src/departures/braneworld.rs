//! Gravity that leaks into a fifth dimension (normal branch), Koyama & Maartens 2006.

use super::{Departure, DepartureParameter, FeltBy};
use crate::error::ModelError;
use oddwell_cosmology::Background;

/// Gravity that leaks into a fifth dimension (normal branch), Koyama & Maartens 2006.
#[derive(Debug)]
pub(super) struct Braneworld;

impl Departure for Braneworld {
    fn name(&self) -> &'static str {
        "braneworld"
    }

    fn formula(&self) -> &'static str {
        "τ = 1/(3β), β = 1 + 2 E r_c (1 + (dlnE/dlna)/3)"
    }

    fn manual(&self) -> &'static str {
        "The normal branch of a braneworld with crossover length r_c in units of c/H0, above 0; r_c → ∞ is general relativity. Felt by everything; needs w0 = −1, wa = 0. Ψ and the acceleration cancel, so odd multipoles see it only through growth. Source: Koyama & Maartens 2006, JCAP 01, 016."
    }

    fn parameters(&self) -> &'static [DepartureParameter] {
        &[DepartureParameter {
            name: "crossover",
            meaning: "crossover length r_c in c/H0, above 0",
            general_relativity: None,
        }]
    }

    fn allowed(&self) -> &'static [FeltBy] {
        &[FeltBy::Everything]
    }

    fn check(&self, parameters: &[f64]) -> Result<(), ModelError> {
        if parameters[0] > 0.0 {
            return Ok(());
        }
        Err(ModelError::Departure {
            parameter: "crossover",
            value: parameters[0],
            rule: "the crossover length is in c/H0 and above 0; a large one is general relativity",
        })
    }

    fn tau(&self, parameters: &[f64], background: &Background, a: f64, k: f64) -> f64 {
        let _ = k;
        let beta =
            1.0 + 2.0 * background.expansion(a) * parameters[0] * (1.0 + background.expansion_slope(a) / 3.0);
        1.0 / (3.0 * beta)
    }
}
