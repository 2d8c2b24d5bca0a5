//! What an error in a nuisance is worth in the departure, where that is exact.

use crate::state::BinState;

/// The common error δe of both tracers' evolution biases that general relativity needs to give the same odd multipoles
/// as a departure `tau` felt by light: δe = −(3/2) Ωm(a) τ / f.
///
/// Exact at every separation: Ψ enters R as −(3/2) Ωm(a) T and e as f e, in both tracers alike. Where growth follows the
/// departure too (felt by matter or everything) there is no such identity.
///
/// Source: from R in Challinor & Lewis 2011, PRD 84, 043516.
#[must_use]
pub fn evolution_bias_of(state: &BinState, tau: f64) -> f64 {
    -1.5 * state.epoch.matter_fraction * tau / state.growth.rate
}

/// The departure felt by light that a common error of both evolution biases looks like: δτ = −δe f/(1.5 Ωm(a)).
#[must_use]
pub fn tau_of_evolution_bias(state: &BinState, evolution_bias: f64) -> f64 {
    -evolution_bias * state.growth.rate / (1.5 * state.epoch.matter_fraction)
}
