//! Doppler, acceleration and gravitational redshift: the order H/k of each tracer's counts.

use super::Amplitudes;
use crate::state::PairState;

/// Im P₁ = (H/k) [R₁b₂ − R₂b₁ + (3/5) f (R₁ − R₂)] P, Im P₃ = (H/k) (2/5) f (R₁ − R₂) P.
///
/// Source: McDonald 2009, JCAP 11, 026, with the full response R of [`crate::Tracer::response`].
pub(super) fn add(pair: &PairState, amplitudes: &mut Amplitudes) {
    let [b1, b2] = pair.bias;
    let [r1, r2] = pair.response;
    let difference = pair.rate * (r1 - r2);
    amplitudes.inverse[0] += pair.hubble * (r1 * b2 - r2 * b1 + 0.6 * difference);
    amplitudes.inverse[1] += pair.hubble * 0.4 * difference;
}
