//! How much a tail probability can be worth at best.

use nalgebra::{Cholesky, DMatrix, DVector};
use statrs::distribution::{ChiSquared, ContinuousCDF};
use statrs::function::erf::erfc;
use std::f64::consts::SQRT_2;

/// The largest odds against a point hypothesis with tail probability p that any reasonable prior gives: 1/(−e p ln p) for
/// p < 1/e, 1 above (Sellke, Bayarri & Berger 2001, Am. Stat. 55, 62, eq. 3). p = 0.05 gives 2.46, p = 0.01 8.13.
///
/// NaN for a p outside [0, 1]; infinite for p = 0.
pub fn largest_odds(p: f64) -> f64 {
    if !(0.0..=1.0).contains(&p) {
        f64::NAN
    } else if p >= (-1f64).exp() {
        1.0
    } else {
        -1.0 / (std::f64::consts::E * p * p.ln())
    }
}

/// Two-sided tail probability of a normal deviate.
pub fn two_sided_tail(deviate: f64) -> f64 {
    erfc(deviate.abs() / SQRT_2)
}

/// Tail probability of several correlated deviates z together: χ² = zᵀ R⁻¹ z with as many degrees of freedom. `correlation` holds
/// the rows of R; `None` where that is no correlation.
pub fn joint_tail(deviates: &[f64], correlation: &[f64]) -> Option<f64> {
    let n = deviates.len();
    if correlation.len() != n * n || n == 0 {
        return None;
    }
    let z = DVector::from_row_slice(deviates);
    let square = Cholesky::new(DMatrix::from_row_slice(n, n, correlation))?.solve(&z).dot(&z);
    ChiSquared::new(n as f64).ok().map(|chi_squared| chi_squared.sf(square))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The paper's table 1: B(p) = −e p ln p is 0.870, 0.628, 0.407, 0.125, 0.0188 for p = 0.2, 0.1, 0.05, 0.01, 0.001 (from
    /// memory).
    #[test]
    fn the_published_table() {
        for (p, lowest) in [(0.2, 0.870), (0.1, 0.628), (0.05, 0.407), (0.01, 0.125), (0.001, 0.0188)] {
            let got = 1.0 / largest_odds(p);
            // The table has three digits.
            assert!((got / lowest - 1.0).abs() < 6e-3, "{p}: {got}");
        }
        // 1.96 standard deviations; two independent deviates of 1: exp(−χ²/2) = 1/e.
        assert!((two_sided_tail(-1.959_963_985) - 0.05).abs() < 1e-9);
        assert!((joint_tail(&[1.0, 1.0], &[1.0, 0.0, 0.0, 1.0]).unwrap() - (-1f64).exp()).abs() < 1e-12);
        assert!(joint_tail(&[], &[]).is_none());
        assert_eq!(largest_odds(0.9), 1.0);
        assert!(largest_odds(-0.1).is_nan());
    }
}
