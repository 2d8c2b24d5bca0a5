//! Wide-angle terms, first order in s/r̃.

use super::Amplitudes;
use crate::state::PairState;

/// C₂ = (6/5)(1/r̃) [−(2/3) f (b₁(1−t) − b₂t) − (2/7)(1−2t) f²], C₄ = (16/63)(1/r̃)(1−2t) f², which enter as
///
/// ```text
/// δξ1 = s ⟦C₂P⟧2                δξ3 = −s ⟦C₂P⟧2 + s ⟦C₄P⟧4
/// δIm P1 = g_k + 3g/k           δIm P3 = 2g/k − g_k − h_k − 5h/k        g = C₂P, h = C₄P
/// ```
///
/// Cf. Szalay, Matsubara & Landy 1998, ApJ 498, L1; Reimberg, Bernardeau & Pitrou 2016, JCAP 01, 048.
pub(super) fn add(pair: &PairState, amplitudes: &mut Amplitudes) {
    let [b1, b2] = pair.bias;
    let (f, t) = (pair.rate, pair.fraction);
    let tilt = 1.0 - 2.0 * t;
    let bracket = -2.0 / 3.0 * f * (b1 * (1.0 - t) - b2 * t) - 2.0 / 7.0 * tilt * f * f;
    amplitudes.wide[0] += 1.2 / pair.reduced_distance * bracket;
    amplitudes.wide[1] += 16.0 / 63.0 / pair.reduced_distance * tilt * f * f;
}
