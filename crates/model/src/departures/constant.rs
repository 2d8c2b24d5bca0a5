//! The same departure at all times and scales.

use super::{Departure, DepartureParameter, FeltBy, TAU};
use oddwell_cosmology::Background;

/// The same departure at all times and scales.
#[derive(Debug)]
pub(super) struct Constant;

impl Departure for Constant {
    fn name(&self) -> &'static str {
        "constant"
    }

    fn formula(&self) -> &'static str {
        "τ = τ0"
    }

    fn manual(&self) -> &'static str {
        "The same at all times and scales, τ0 any number; felt by matter or everything it acts on growth from a = 10⁻³ on, so values of order one change structure out of recognition. Felt by light, odd multipoles see it directly, degenerate with a common error of both evolution biases: δτ = −δe f/(1.5 Ωm(a)). Felt by everything, Ψ and the acceleration cancel in the odd multipoles and only growth is left: then they hardly test it."
    }

    fn parameters(&self) -> &'static [DepartureParameter] {
        &[TAU]
    }

    fn allowed(&self) -> &'static [FeltBy] {
        &FeltBy::ALL
    }

    fn tau(&self, parameters: &[f64], background: &Background, a: f64, k: f64) -> f64 {
        let _ = (background, a, k);
        parameters[0]
    }
}
