//! Exponential, logarithm and sine as plain arithmetic.
//!
//! A call to the library's function takes one value at a time and spills every register around it. Written out, without a
//! branch, the same few dozen operations run on several values at once: the transfer function asks for seven of them at
//! each of hundreds of wavenumbers, at every evaluation of a likelihood whose background moves.

use std::f64::consts::{FRAC_1_PI, LOG2_E, SQRT_2};

/// 1.5·2⁵²: added to a number of modest size it leaves the nearest integer in the last bits of the sum.
const SHIFT: f64 = 6_755_399_441_055_744.0;

/// ln 2 in two parts, the first with twenty trailing zeros so that its multiples are exact.
const LN_2_HIGH: f64 = f64::from_bits(0x3fe6_2e42_fee0_0000);
const LN_2_LOW: f64 = f64::from_bits(0x3dea_39ef_3579_3c76);

/// π in three parts, the first two with trailing zeros so that their multiples up to 2²⁰ are exact.
const PI_HIGH: f64 = f64::from_bits(0x4009_21fb_5440_0000);
const PI_MIDDLE: f64 = f64::from_bits(0x3de0_b461_1a60_0000);
const PI_LOW: f64 = f64::from_bits(0x3bb3_198a_2e03_7073);

/// eˣ for −700 < x < 700, to 6e-16 of itself; beyond, the value at that end.
///
/// With n the integer nearest to x/ln 2 the rest r is at most ½ ln 2 in size, and Taylor's series to r¹³ leaves 4e-18.
#[inline(always)]
pub(crate) fn exp(x: f64) -> f64 {
    const SERIES: [f64; 14] = inverse_factorials(0, 1);
    // Written so that NaN stays NaN.
    let x = if x < -700.0 { -700.0 } else { x };
    let x = if x > 700.0 { 700.0 } else { x };
    let shifted = x * LOG2_E + SHIFT;
    let n = shifted - SHIFT;
    let rest = (x - n * LN_2_HIGH) - n * LN_2_LOW;
    let mut sum = SERIES[13];
    for term in (0..13).rev() {
        sum = sum * rest + SERIES[term];
    }
    // 2ⁿ: n stands in the last bits.
    sum * f64::from_bits(shifted.to_bits().wrapping_add(1023) << 52)
}

/// ln x for normal x > 0, to 6e-16 of the larger of itself and a tenth. Elsewhere it is wrong without saying so.
///
/// x = 2ⁿ m with √½ < m ≤ √2, and ln m = 2 artanh s with s = (m − 1)/(m + 1), |s| < 0.1716: s²³ leaves 1e-19.
#[inline(always)]
pub(crate) fn ln(x: f64) -> f64 {
    const TWO_52: f64 = 4_503_599_627_370_496.0;
    let bits = x.to_bits();
    let exponent = f64::from_bits((bits >> 52) | TWO_52.to_bits()) - (TWO_52 + 1023.0);
    let mantissa = f64::from_bits((bits & ((1 << 52) - 1)) | 1.0_f64.to_bits());
    let large = mantissa > SQRT_2;
    let mantissa = if large { 0.5 * mantissa } else { mantissa };
    let n = if large { exponent + 1.0 } else { exponent };
    let s = (mantissa - 1.0) / (mantissa + 1.0);
    let square = s * s;
    let mut sum = 1.0 / 23.0;
    for power in (0..11).rev() {
        sum = sum * square + 1.0 / (2 * power + 1) as f64;
    }
    n * LN_2_HIGH + (2.0 * s * sum + n * LN_2_LOW)
}

/// sin x for |x| < 10⁶, to 6e-16, and of itself for small x.
///
/// With n the integer nearest to x/π the rest is at most π/2 in size, and Taylor's series to r²¹ leaves 1e-18.
#[inline(always)]
pub(crate) fn sin(x: f64) -> f64 {
    const SERIES: [f64; 11] = inverse_factorials(1, 2);
    let shifted = x * FRAC_1_PI + SHIFT;
    let n = shifted - SHIFT;
    let rest = ((x - n * PI_HIGH) - n * PI_MIDDLE) - n * PI_LOW;
    let square = rest * rest;
    let mut sum = SERIES[10];
    for term in (0..10).rev() {
        sum = SERIES[term] - sum * square;
    }
    // The sign of an odd n.
    f64::from_bits((sum * rest).to_bits() ^ (shifted.to_bits() << 63))
}

/// 1/(first + i·step)!
const fn inverse_factorials<const N: usize>(first: usize, step: usize) -> [f64; N] {
    let mut table = [0.0; N];
    let mut i = 0;
    while i < N {
        let mut factorial = 1.0;
        let mut factor = 2;
        while factor <= first + i * step {
            factorial *= factor as f64;
            factor += 1;
        }
        table[i] = 1.0 / factorial;
        i += 1;
    }
    table
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use std::f64::consts::PI;

    /// Two units in the last place, 2.2e-16 each where that is largest, and some rounding on the way.
    fn near(found: f64, expected: f64, scale: f64) -> Result<(), TestCaseError> {
        prop_assert!((found - expected).abs() <= 6e-16 * scale, "{found:e} {expected:e}");
        Ok(())
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 20_000, failure_persistence: None, ..ProptestConfig::default() })]

        #[test]
        fn exponentials(x in -700.0..700.0f64, small in -1.0..1.0f64) {
            for x in [x, small] {
                near(exp(x), x.exp(), x.exp())?;
            }
        }

        #[test]
        fn logarithms(exponent in -300.0..300.0f64, around in 0.5..2.0f64) {
            for x in [10f64.powf(exponent), around] {
                near(ln(x), x.ln(), x.ln().abs().max(0.1))?;
            }
        }

        /// The library reduces its argument exactly; ours loses what three parts of π leave, 1e-33 × 3e5.
        #[test]
        fn sines(x in -1e6..1e6f64, small in -4.0..4.0f64) {
            for x in [x, small] {
                near(sin(x), x.sin(), 1.0)?;
            }
            // And near a zero, relative to it.
            let close = (small / PI).round() * PI + 1e-3 * small;
            near(sin(close), close.sin(), close.sin().abs())?;
        }
    }

    #[test]
    fn special_values() {
        assert_eq!((exp(0.0), ln(1.0), sin(0.0)), (1.0, 0.0, 0.0));
        assert_eq!(exp(-1e-300), 1.0);
        assert_eq!((exp(1e4), exp(-1e4)), (exp(700.0), exp(-700.0)));
        assert!(exp(f64::NAN).is_nan() && sin(f64::NAN).is_nan());
    }
}
