//! Lensing of the farther tracer by matter around the nearer one.

use super::Amplitudes;
use crate::state::PairState;
use std::f64::consts::PI;

/// Γ = π Ωm(a) H² [b₁(5s₂ − 2) − b₂(5s₁ − 2)] P/k², δIm P₁ = (9/4) Γ, δIm P₃ = −(63/8) Γ.
///
/// A closed form, within 2 % for ξ₁ and 6 % for ξ₃ of the full line-of-sight integral at z ≥ 0.35. Lensing sees Φ + Ψ,
/// held at its value in general relativity: surveys of lensing bound it to a few per cent, and braneworld and f(R)
/// gravity leave it alone.
pub(super) fn add(pair: &PairState, amplitudes: &mut Amplitudes) {
    let [b1, b2] = pair.bias;
    let [s1, s2] = pair.magnification_bias;
    let contrast = b1 * (5.0 * s2 - 2.0) - b2 * (5.0 * s1 - 2.0);
    let gamma = PI * pair.matter_fraction * pair.hubble * pair.hubble * contrast;
    amplitudes.inverse_square[0] += 9.0 / 4.0 * gamma;
    amplitudes.inverse_square[1] -= 63.0 / 8.0 * gamma;
}
