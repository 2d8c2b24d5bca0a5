//! Evolution of the tracers and of growth along the light cone, first order in s.

use super::Amplitudes;
use crate::state::PairState;

/// With ẋ = dx/dr,
///
/// ```text
/// c0 = −t ḃ₁b₂ + (1−t) b₁ḃ₂ + (1−2t) ḋ b₁b₂         c4 = (1−2t)(f ḟ + ḋ f²)
/// c2 = −t (ḟ b₂ + ḃ₁ f) + (1−t)(f ḃ₂ + b₁ḟ) + (1−2t) ḋ f (b₁+b₂)
/// A = c0 + c2/3 + c4/5,  B = (2/3) c2 + (4/7) c4,  N = c4            (each times P)
/// δξ1 = s⟦A⟧0 − (2/5) s⟦B⟧2                  δIm P1 = −A_k − (2/5)(B_k + 3B/k)
/// δξ3 = −(3/5) s⟦B⟧2 + (32/315) s⟦N⟧4        δIm P3 = (3/5)(2B/k − B_k) − (32/315)(N_k + 5N/k)
/// ```
///
/// Follows by expanding b₁, b₂, f and D of the even multipoles about the sight-line's point.
pub(super) fn add(pair: &PairState, amplitudes: &mut Amplitudes) {
    let [b1, b2] = pair.bias;
    let [b1_drift, b2_drift] = pair.bias_drift;
    let (f, f_drift, d_drift, t) = (pair.rate, pair.rate_drift, pair.growth_drift, pair.fraction);
    let tilt = 1.0 - 2.0 * t;
    let c0 = -t * b1_drift * b2 + (1.0 - t) * b1 * b2_drift + tilt * d_drift * b1 * b2;
    let c2 = -t * (f_drift * b2 + b1_drift * f)
        + (1.0 - t) * (f * b2_drift + b1 * f_drift)
        + tilt * d_drift * f * (b1 + b2);
    let c4 = tilt * (f * f_drift + d_drift * f * f);
    amplitudes.cone[0] += c0 + c2 / 3.0 + c4 / 5.0;
    amplitudes.cone[1] += 2.0 / 3.0 * c2 + 4.0 / 7.0 * c4;
    amplitudes.cone[2] += c4;
}
