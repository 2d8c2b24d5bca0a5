//! Averages over hypotheses, by their probabilities.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// Draws of a quantity under one hypothesis, and that hypothesis's probability. One draw stands for a held number.
#[derive(Debug, Clone, PartialEq)]
pub struct WeightedDraws {
    /// Values, all of equal weight.
    pub values: Vec<f64>,
    /// Probability of the hypothesis.
    pub probability: f64,
}

/// What a quantity is, averaged over hypotheses.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct WeightedSummary {
    /// Mean.
    pub mean: f64,
    /// Standard deviation.
    pub sd: f64,
    /// Median.
    pub median: f64,
    /// Central interval of 68 %.
    pub interval68: [f64; 2],
    /// Central interval of 95 %.
    pub interval95: [f64; 2],
}

/// The posterior Σ p(x | hypothesis, data) P(hypothesis | data) (Hoeting et al. 1999, Stat. Sci. 14, 382, eq. 1).
///
/// `None` where no draw has weight.
pub fn average(parts: &[WeightedDraws]) -> Option<WeightedSummary> {
    let mut draws: Vec<(f64, f64)> = Vec::new();
    for part in parts.iter().filter(|part| part.probability > 0.0) {
        let weight = part.probability / part.values.len() as f64;
        draws.extend(part.values.iter().filter(|value| value.is_finite()).map(|value| (*value, weight)));
    }
    let total: f64 = draws.iter().map(|(_, weight)| weight).sum();
    if !(total > 0.0) {
        return None;
    }
    draws.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mean = draws.iter().map(|(value, weight)| value * weight).sum::<f64>() / total;
    let squares: f64 = draws.iter().map(|(value, weight)| weight * (value - mean) * (value - mean)).sum();
    let mut cumulative = Vec::with_capacity(draws.len());
    let mut sum = 0.0;
    for (_, weight) in &draws {
        sum += weight;
        cumulative.push(sum / total);
    }
    let quantile = |p: f64| {
        let at = cumulative.partition_point(|sum| *sum < p).min(draws.len() - 1);
        draws[at].0
    };
    Some(WeightedSummary {
        mean,
        sd: (squares / total).sqrt(),
        median: quantile(0.5),
        interval68: [quantile(0.16), quantile(0.84)],
        interval95: [quantile(0.025), quantile(0.975)],
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// 0 with probability 0.6, uniform on [0, 1] with 0.4: mean 0.2, E x² = 0.4/3; 84 % lie below 0.6.
    #[test]
    fn a_point_and_a_spread() {
        let spread = (0..10_000).map(|i| (f64::from(i) + 0.5) / 10_000.0).collect();
        let found = average(&[
            WeightedDraws { values: vec![0.0], probability: 0.6 },
            WeightedDraws { values: spread, probability: 0.4 },
        ])
        .unwrap();
        assert!((found.mean - 0.2).abs() < 1e-9);
        assert!((found.sd - (0.4f64 / 3.0 - 0.04).sqrt()).abs() < 1e-6);
        assert_eq!((found.median, found.interval68[0]), (0.0, 0.0));
        assert!((found.interval68[1] - 0.6).abs() < 1e-3);
        assert!(average(&[]).is_none());
    }
}
