//! A departure that grows or fades as a power of the scale factor.

use super::{Departure, DepartureParameter, FeltBy, TAU};
use oddwell_cosmology::Background;

/// A departure that grows or fades as a power of the scale factor.
#[derive(Debug)]
pub(super) struct PowerLaw;

impl Departure for PowerLaw {
    fn name(&self) -> &'static str {
        "power-law"
    }

    fn formula(&self) -> &'static str {
        "τ = τ0 aⁿ"
    }

    fn manual(&self) -> &'static str {
        "A power of the scale factor, n = slope: positive n fades into the past. With τ0 near 0 the slope is not determined and its posterior is its prior. Felt by everything, Ψ and the acceleration cancel in the odd multipoles and only growth is left: then they hardly test it."
    }

    fn parameters(&self) -> &'static [DepartureParameter] {
        &[
            TAU,
            DepartureParameter {
                name: "slope",
                meaning: "power n of the scale factor, dimensionless; any number",
                general_relativity: None,
            },
        ]
    }

    fn allowed(&self) -> &'static [FeltBy] {
        &FeltBy::ALL
    }

    fn tau(&self, parameters: &[f64], background: &Background, a: f64, k: f64) -> f64 {
        let _ = (background, k);
        parameters[0] * a.powf(parameters[1])
    }
}
