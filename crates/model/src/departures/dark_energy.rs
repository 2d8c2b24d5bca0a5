//! A departure that follows the share of dark energy.

use super::{Departure, DepartureParameter, FeltBy, TAU};
use oddwell_cosmology::Background;

/// A departure that follows the share of dark energy.
#[derive(Debug)]
pub(super) struct DarkEnergy;

impl Departure for DarkEnergy {
    fn name(&self) -> &'static str {
        "dark-energy"
    }

    fn formula(&self) -> &'static str {
        "τ = τ0 Ωde(a)/Ωde(1)"
    }

    fn manual(&self) -> &'static str {
        "Follows the fraction of the critical density that is dark energy, so that it is τ0 today and fades into the past: a departure that comes with the acceleration of the expansion. Needs Ωde ≠ 0 today. High-redshift bins test it little. Felt by everything, Ψ and the acceleration cancel in the odd multipoles and only growth is left: then they hardly test it."
    }

    fn parameters(&self) -> &'static [DepartureParameter] {
        &[TAU]
    }

    fn allowed(&self) -> &'static [FeltBy] {
        &FeltBy::ALL
    }

    fn tau(&self, parameters: &[f64], background: &Background, a: f64, k: f64) -> f64 {
        let _ = k;
        parameters[0] * background.dark_energy_fraction(a) / background.dark_energy_fraction(1.0)
    }
}
