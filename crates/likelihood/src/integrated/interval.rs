//! A normal variable between two ends: how probable, and drawn.

use libm::erfc;
use statrs::function::erf::erfc_inv;
use std::f64::consts::{FRAC_1_SQRT_2, SQRT_2};

/// Standard deviations from the mean to an end beyond which no probability is left in 64-bit arithmetic: Φ(−9) = 1e-19.
const FAR: f64 = 9.0;

/// A standard normal variable between `low` and `high`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Interval {
    pub(super) low: f64,
    pub(super) high: f64,
}

/// Probability below −z, to full relative accuracy.
fn tail(z: f64) -> f64 {
    0.5 * erfc(z * FRAC_1_SQRT_2)
}

impl Interval {
    /// ln [Φ(high) − Φ(low)]. On one side of 0 it is the difference of the tails there; beyond 38 standard deviations, where
    /// the tails underflow, −∞.
    pub(super) fn log_probability(self) -> f64 {
        let Self { low, high } = self;
        if low < -FAR && high > FAR {
            0.0
        } else if low > 0.0 {
            (tail(low) - tail(high)).ln()
        } else if high < 0.0 {
            (tail(-high) - tail(-low)).ln()
        } else {
            (-(tail(-low) + tail(high))).ln_1p()
        }
    }

    /// The value below which lies the share `uniform` of the probability between the ends, by the tail of the nearer side.
    pub(super) fn quantile(self, uniform: f64) -> f64 {
        let Self { low, high } = self;
        let inverse = |p: f64| SQRT_2 * erfc_inv(2.0 * p);
        let value = if low + high > 0.0 {
            inverse(tail(low) + uniform * (tail(high) - tail(low)))
        } else {
            -inverse(tail(-low) + uniform * (tail(-high) - tail(-low)))
        };
        value.clamp(low, high)
    }

    /// Whether both ends are too far away to matter.
    pub(super) fn is_open(self) -> bool {
        self.low < -FAR && self.high > FAR
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Probabilities from mpmath 1.4.1 (50 digits): ncdf(b) − ncdf(a).
    #[test]
    fn probabilities_keep_their_digits_in_the_tails() {
        let cases = [
            (-1.0, 2.0, 0.818_594_614_120_364),
            (5.0, 6.0, 2.856_649_842_341_56e-7),
            (-21.0, -20.0, 2.753_624_115_326_96e-89),
            (-1.0, f64::INFINITY, 0.841_344_746_068_543),
        ];
        for (low, high, expected) in cases {
            let found = Interval { low, high }.log_probability();
            assert!((found - f64::ln(expected)).abs() < 1e-11, "{low} {high}");
        }
    }

    #[test]
    fn quantiles_undo_the_probability() {
        for (low, high) in [(-1.0, 2.0), (4.0, 9.0), (-30.0, -6.0), (-0.2, 0.1)] {
            for uniform in [0.01, 0.3, 0.5, 0.99] {
                let at = Interval { low, high }.quantile(uniform);
                let below = Interval { low, high: at }.log_probability();
                let all = Interval { low, high }.log_probability();
                assert!(((below - all).exp() - uniform).abs() < 1e-8, "{low} {high} {uniform}");
            }
        }
    }
}
