//! Normal probabilities and the inversion of distribution functions, accurate in both tails.

use libm::erfc;
use statrs::function::erf::erfc_inv;
use std::f64::consts::{FRAC_1_SQRT_2, SQRT_2};

/// ln √(2π).
pub(crate) const LN_SQRT_TWO_PI: f64 = 0.918_938_533_204_672_7;

/// Probability of a standard normal below `z`, to full relative accuracy also far below zero.
pub(crate) fn normal_cdf(z: f64) -> f64 {
    0.5 * erfc(-z * FRAC_1_SQRT_2)
}

/// Standard normal quantile of `p` in [0, 1]; ∓∞ at the ends.
///
/// For `p` close to 1 pass 1 − p to this function and flip the sign: `p` itself has no digits left there.
pub(crate) fn normal_quantile(p: f64) -> f64 {
    if p <= 0.0 {
        return f64::NEG_INFINITY;
    }
    if p >= 1.0 {
        return f64::INFINITY;
    }
    -SQRT_2 * erfc_inv(2.0 * p)
}

/// Solves `probability(x) = wanted` for x > 0, where `probability` is monotone with derivative `slope` (signed).
///
/// Newton steps on ln `probability` as a function of ln x, which is nearly a straight line in a power-law tail, kept
/// inside a bracket that every iteration shrinks; a step that leaves the bracket becomes a bisection (geometric). The
/// bracket starts at `[low, high]` with 0 < low < high, and grows by squaring while it does not hold the solution.
///
/// Accuracy: the bracket closes to a relative 4e-16 or the residual of ln `probability` to 1e-15.
pub(crate) fn invert_positive(
    probability: impl Fn(f64) -> f64,
    slope: impl Fn(f64) -> f64,
    wanted: f64,
    (low, high): (f64, f64),
    limit: f64,
) -> f64 {
    let ln_wanted = wanted.ln();
    let residual = |x: f64| probability(x).ln() - ln_wanted;
    let (mut low, mut high) = (low, high);
    let rising = probability(high) >= probability(low);
    let below = |value: f64| if rising { value < 0.0 } else { value > 0.0 };
    let mut factor = 4.0;
    while below(residual(high)) && high < limit {
        low = high;
        high = (high * factor).min(limit);
        factor = (factor * factor).min(1e30);
    }
    factor = 4.0;
    while !below(residual(low)) && low > 1e-300 {
        high = low;
        low = (low / factor).max(1e-300);
        factor = (factor * factor).min(1e30);
    }
    let mut x = if low * 4.0 < high { (low.ln() * 0.5 + high.ln() * 0.5).exp() } else { 0.5 * (low + high) };
    for _ in 0..400 {
        let value = residual(x);
        if value.abs() < 1e-15 || high - low <= 4e-16 * high {
            break;
        }
        if below(value) {
            low = x
        } else {
            high = x
        }
        let in_log = slope(x) * x / probability(x);
        let newton = x * (-value / in_log).clamp(-700.0, 700.0).exp();
        x = if newton > low && newton < high {
            if newton == x {
                break;
            }
            newton
        } else if low * 4.0 < high {
            (low.ln() * 0.5 + high.ln() * 0.5).exp()
        } else {
            0.5 * (low + high)
        };
    }
    x
}
