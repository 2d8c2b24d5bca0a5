//! Redshift offset: the second tracer's redshifts lie higher than the first's by v.

use super::Amplitudes;
use crate::state::PairState;

/// δIm P₁ = k Δ (P₀ + (2/5) P₂), δIm P₃ = k Δ ((3/5) P₂ + (4/9) P₄), Δ = (v/c)/H.
///
/// The cross-spectrum times e^(ikμΔ) to first order. For the size of the effect: Breton et al. 2019, MNRAS 483, 2671;
/// Saga et al. 2020, MNRAS 498, 981.
///
/// `even` are P₀, P₂ and P₄ over P.
pub(super) fn add(pair: &PairState, even: &[f64; 3], amplitudes: &mut Amplitudes) {
    let [p0, p2, p4] = *even;
    amplitudes.linear[0] += pair.shift * (p0 + 0.4 * p2);
    amplitudes.linear[1] += pair.shift * (0.6 * p2 + 4.0 / 9.0 * p4);
}
