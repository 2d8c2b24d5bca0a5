//! Whether the data say anything about a quantity.

use oddwell_sampler::SharedPrior;

/// A posterior closer to its prior than this has not been tested by the data: the largest difference of their distribution
/// functions. A normal posterior nine tenths as wide as its normal prior is 0.025 away; one shifted by a quarter of a standard
/// deviation 0.1.
pub const LEAST_DISTANCE: f64 = 0.05;

/// The largest difference between the distribution function of the draws and that of the prior (Kolmogorov and Smirnov's D),
/// less what `effective` draws leave by chance, 1.36/√effective (its 95 % point); not below 0.
pub fn distance_from_prior(draws: &[f64], prior: &SharedPrior, effective: f64) -> f64 {
    let mut heights: Vec<f64> = draws.iter().map(|draw| prior.cdf(*draw)).collect();
    heights.sort_unstable_by(f64::total_cmp);
    let count = heights.len() as f64;
    let gap = |(rank, height): (usize, &f64)| {
        (height - rank as f64 / count).abs().max(((rank + 1) as f64 / count - height).abs())
    };
    let distance = heights.iter().enumerate().map(gap).fold(0.0, f64::max);
    (distance - 1.36 / effective.max(1.0).sqrt()).max(0.0)
}

#[cfg(test)]
mod tests {
    use super::*;
    use oddwell_sampler::build_prior;

    #[test]
    fn the_prior_is_no_test_and_a_shift_is() {
        let prior = build_prior("normal", &[0.0, 2.0], None).unwrap();
        let draws = |shift: f64, width: f64| -> Vec<f64> {
            (0..10_000).map(|i| shift + width * prior.quantile((f64::from(i) + 0.5) / 10_000.0)).collect()
        };
        assert!(distance_from_prior(&draws(0.0, 1.0), &prior, 1e4) < LEAST_DISTANCE);
        assert!(distance_from_prior(&draws(0.0, 0.9), &prior, 1e4) < LEAST_DISTANCE);
        assert!(distance_from_prior(&draws(0.6, 1.0), &prior, 1e4) > LEAST_DISTANCE);
        assert!(distance_from_prior(&draws(0.0, 0.5), &prior, 1e4) > LEAST_DISTANCE);
    }
}
