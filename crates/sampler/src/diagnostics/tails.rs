//! How far out a value lies in a posterior.

use statrs::distribution::{ChiSquared, ContinuousCDF, Normal};

/// How a tail probability was found.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TailSource {
    /// Draws beyond the value were counted.
    Counted,
    /// Too few draws lie beyond: from the mean and the (co)variance, as if the posterior were normal.
    Normal,
}

/// A two-sided tail probability, and the standard deviations of a normal that have it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tail {
    /// Twice the share of the posterior on the far side of the value.
    pub probability: f64,
    /// The same in standard deviations, signed: positive where the posterior lies above the value.
    pub sigma: f64,
    /// How it was found.
    pub source: TailSource,
}

/// Effective draws that must lie beyond a value for its tail to be counted: their number is then known to some 30 %.
const ENOUGH: f64 = 10.0;

fn standard_normal() -> Normal {
    Normal::standard()
}

/// Where `value` lies among the draws, which are worth `effective_samples`. Falls back on the normal approximation, about
/// `mean` and `sd`, where fewer than ten effective draws lie beyond the value.
#[must_use]
pub fn tail_of(draws: &[f64], value: f64, effective_samples: f64, mean: f64, sd: f64) -> Tail {
    let below = draws.iter().filter(|&&draw| draw < value).count() as f64;
    let equal = draws.iter().filter(|&&draw| draw == value).count() as f64;
    let share = (below + 0.5 * equal) / draws.len() as f64;
    let smaller = share.min(1.0 - share);
    let sign = if share < 0.5 { 1.0 } else { -1.0 };
    if smaller * effective_samples >= ENOUGH {
        let sigma = sign * -standard_normal().inverse_cdf(smaller);
        return Tail { probability: 2.0 * smaller, sigma, source: TailSource::Counted };
    }
    let sigma = (mean - value) / sd;
    Tail { probability: 2.0 * standard_normal().cdf(-sigma.abs()), sigma, source: TailSource::Normal }
}

/// The probability of a point at least as far from the mean as `distance_squared` = (x − μ)ᵀ Σ⁻¹ (x − μ) in `dimension`
/// directions, for a normal posterior. `None` for a dimension of 0 or a distance that is negative or not a number.
#[must_use]
pub fn tail_of_distance(distance_squared: f64, dimension: usize) -> Option<f64> {
    if !(distance_squared >= 0.0) {
        return None;
    }
    Some(ChiSquared::new(dimension as f64).ok()?.sf(distance_squared))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_counted_tail_is_the_share_beyond() {
        // 0.5 … 999.5: 25 of 1,000 lie below 25.
        let draws: Vec<f64> = (0..1000).map(|i| f64::from(i) + 0.5).collect();
        let tail = tail_of(&draws, 25.0, 1000.0, 500.0, 288.7);
        assert_eq!(tail.source, TailSource::Counted);
        assert!((tail.probability - 0.05).abs() < 1e-12);
        // The 2.5 % point of a normal, from any table: 1.959964.
        assert!((tail.sigma - 1.959_964).abs() < 1e-6);
        assert!((tail_of(&draws, 975.0, 1000.0, 500.0, 288.7).sigma + 1.959_964).abs() < 1e-6);
    }

    #[test]
    fn a_far_tail_is_normal() {
        let draws: Vec<f64> = (0..1000).map(|i| f64::from(i) + 0.5).collect();
        let tail = tail_of(&draws, -400.0, 1000.0, 500.0, 300.0);
        assert_eq!(tail.source, TailSource::Normal);
        assert!((tail.sigma - 3.0).abs() < 1e-12);
        // Two-sided 3 σ: 0.0026998 (any table of the normal distribution).
        assert!((tail.probability - 0.002_699_8).abs() < 1e-7);
    }

    #[test]
    fn distances_follow_chi_squared() {
        // One direction: 4 is 2 σ, 0.0455003; two directions: exp(−d²/2).
        assert!((tail_of_distance(4.0, 1).unwrap() - 0.045_500_26).abs() < 1e-8);
        assert!((tail_of_distance(4.0, 2).unwrap() - (-2.0_f64).exp()).abs() < 1e-12);
        assert_eq!(tail_of_distance(4.0, 0), None);
        assert_eq!(tail_of_distance(f64::NAN, 2), None);
    }
}
