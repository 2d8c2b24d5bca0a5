//! Sums of exponentials, and the few numbers that estimators share.

/// ln Σ exp(values); −∞ for none.
pub(crate) fn log_sum_exp(values: &[f64]) -> f64 {
    let largest = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if !largest.is_finite() {
        return largest;
    }
    largest + values.iter().map(|value| (value - largest).exp()).sum::<f64>().ln()
}

/// ln(eᵃ + eᵇ).
pub(crate) fn log_add(a: f64, b: f64) -> f64 {
    let (high, low) = if a > b { (a, b) } else { (b, a) };
    if low == f64::NEG_INFINITY { high } else { high + (low - high).exp().ln_1p() }
}

/// The logarithm of the mean of exponentials, and the squared coefficient of variation of the terms (divisor n − 1).
pub(crate) fn log_mean_exp(values: &[f64]) -> (f64, f64) {
    let count = values.len() as f64;
    let largest = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if !largest.is_finite() {
        return (largest, f64::INFINITY);
    }
    let (mut sum, mut squares) = (0.0, 0.0);
    for value in values {
        let term = (value - largest).exp();
        sum += term;
        squares += term * term;
    }
    let mean = sum / count;
    let spread = (squares / count / (mean * mean) - 1.0).max(0.0) * count / (count - 1.0).max(1.0);
    (largest + mean.ln(), spread)
}

/// Mean, and variance with divisor n − 1 (0 for a single value).
pub(crate) fn mean_and_variance(values: &[f64]) -> (f64, f64) {
    let count = values.len() as f64;
    let mean = values.iter().sum::<f64>() / count;
    let squares: f64 = values.iter().map(|value| (value - mean) * (value - mean)).sum();
    (mean, if values.len() > 1 { squares / (count - 1.0) } else { 0.0 })
}

/// Probability that √n·D of Kolmogorov and Smirnov exceeds what it is for `uniforms`, were they uniform on [0, 1].
///
/// The asymptotic series 2 Σ (−1)^(j−1) exp(−2 j² λ²), with λ = (√n + 0.12 + 0.11/√n) D (Stephens 1970, J. R. Stat. Soc. B
/// 32, 115), good to a few per cent from n = 5 on. 1 for no numbers.
pub(crate) fn kolmogorov_p_value(mut uniforms: Vec<f64>) -> f64 {
    let count = uniforms.len() as f64;
    uniforms.sort_unstable_by(f64::total_cmp);
    let gap = |(rank, value): (usize, &f64)| {
        (value - rank as f64 / count).abs().max(((rank + 1) as f64 / count - value).abs())
    };
    let distance = uniforms.iter().enumerate().map(gap).fold(0.0, f64::max);
    let root = count.sqrt();
    let scaled = (root + 0.12 + 0.11 / root) * distance;
    if count == 0.0 || scaled < 0.3 {
        return 1.0;
    }
    let term = |j: i32| {
        let sign = if j % 2 == 1 { 2.0 } else { -2.0 };
        sign * (-2.0 * f64::from(j * j) * scaled * scaled).exp()
    };
    (1..=100).map(term).sum::<f64>().clamp(0.0, 1.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn sums_of_exponentials_neither_overflow_nor_lose_small_terms() {
        assert!((log_sum_exp(&[1000.0, 1000.0]) - (1000.0 + 2f64.ln())).abs() < 1e-12);
        assert_eq!(log_sum_exp(&[]), f64::NEG_INFINITY);
        assert!((log_add(-1000.0, -1001.0) - (-1000.0 + (-1f64).exp().ln_1p())).abs() < 1e-12);
        assert_eq!(log_add(f64::NEG_INFINITY, f64::NEG_INFINITY), f64::NEG_INFINITY);
        let (mean, spread) = log_mean_exp(&[0.0, f64::NEG_INFINITY]);
        assert!((mean - 0.5f64.ln()).abs() < 1e-12 && (spread - 2.0).abs() < 1e-12);
    }

    /// Table values of the distribution: λ = 1.3581 leaves 5 %, 1.6276 leaves 1 % (Smirnov 1948, Ann. Math. Stat. 19, 279;
    /// from memory).
    #[test]
    fn the_tail_of_the_kolmogorov_distribution() {
        let evenly = |count: usize, shift: f64| -> Vec<f64> {
            (0..count).map(|i| ((i as f64 + 0.5) / count as f64 + shift).min(1.0)).collect()
        };
        assert!(kolmogorov_p_value(evenly(1000, 0.0)) > 0.999_999);
        for (scaled, expected) in [(1.3581, 0.05), (1.6276, 0.01)] {
            let count = 100_000;
            let shift = scaled / (count as f64).sqrt() - 0.5 / count as f64;
            let got = kolmogorov_p_value(evenly(count, shift));
            // Shift and rank leave 1e-3 of the distance open, √n + 0.12 as much again.
            assert!((got / expected - 1.0).abs() < 0.02, "{got} {expected}");
        }
    }
}
