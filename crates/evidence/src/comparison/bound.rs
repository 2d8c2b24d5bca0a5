//! How much a tail probability can be worth at best.

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
        assert_eq!(largest_odds(0.9), 1.0);
        assert!(largest_odds(-0.1).is_nan());
    }
}
