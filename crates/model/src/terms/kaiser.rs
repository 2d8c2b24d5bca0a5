//! The even multipoles, at zeroth order in H/k.

use crate::state::PairState;

/// P₀/P = b₁b₂ + (b₁+b₂) f/3 + f²/5, P₂/P = (2/3) f (b₁+b₂) + (4/7) f², P₄/P = (8/35) f².
///
/// Source: Kaiser 1987, MNRAS 227, 1; Hamilton 1992, ApJ 385, L5.
pub(super) fn even(pair: &PairState) -> [f64; 3] {
    let [b1, b2] = pair.bias;
    let f = pair.rate;
    let sum = b1 + b2;
    [b1 * b2 + sum * f / 3.0 + f * f / 5.0, 2.0 / 3.0 * f * sum + 4.0 / 7.0 * f * f, 8.0 / 35.0 * f * f]
}
