//! The best of many: how often chance alone gives something as good.

use nalgebra::{Cholesky, DMatrix, DVector};
use oddwell_sampler::moves::Random;
use rand::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};
use statrs::function::erf::erfc;
use std::f64::consts::SQRT_2;

/// Tail probabilities of the largest of several correlated deviates.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct GlobalTail {
    /// Which of them is the largest; not written, since records name it.
    #[serde(skip)]
    pub best: usize,
    /// How far out it is, in standard deviations.
    pub deviate: f64,
    /// Two-sided tail probability of this one alone.
    pub local: f64,
    /// Probability that the largest of all is as far out.
    pub global: f64,
    /// Whether `global` is only an upper bound, the number of deviates times `local`.
    pub bound: bool,
}

/// Draws of the deviates.
const DRAWS: usize = 200_000;

/// Below so many of them beyond the largest deviate, the bound of Bonferroni stands in.
const LEAST_BEYOND: usize = 100;

/// Local and global tail of the largest |z| among deviates with this correlation, by draws of a normal distribution.
///
/// `None` for no deviates, one that is not finite, or a matrix that is no correlation.
pub fn global_tail(deviates: &[f64], correlation: &DMatrix<f64>, seed: u64) -> Option<GlobalTail> {
    let n = deviates.len();
    if correlation.nrows() != n || deviates.iter().any(|z| !z.is_finite()) {
        return None;
    }
    let (best, deviate) =
        deviates.iter().copied().enumerate().max_by(|a, b| a.1.abs().total_cmp(&b.1.abs()))?;
    let local = erfc(deviate.abs() / SQRT_2);
    // Shapes that fit the data in the same way are correlated by 1 up to rounding.
    let factor = Cholesky::new(correlation + DMatrix::identity(n, n) * 1e-9)?;
    let lower = factor.l();
    let mut random = Random::seed_from_u64(seed);
    let beyond = (0..DRAWS)
        .filter(|_| {
            let normals = DVector::from_fn(n, |_, _| {
                let normal: f64 = StandardNormal.sample(&mut random);
                normal
            });
            (&lower * normals).amax() >= deviate.abs()
        })
        .count();
    let bonferroni = (n as f64 * local).min(1.0);
    let bound = beyond < LEAST_BEYOND;
    let global = if bound { bonferroni } else { (beyond as f64 / DRAWS as f64).clamp(local, bonferroni) };
    Some(GlobalTail { best, deviate, local, global, bound })
}

/// Correlation of the estimates of the first `of` parameters, each with the nuisances alone free beside it: what
/// [`global_tail`] needs for the best of several shapes.
///
/// `information`: Fisher information of the data about the `of` amplitudes and then the nuisances, which have the prior precision
/// `nuisance_precision`. With the nuisances integrated out, M = F_aa − F_an (F_nn + Λ)⁻¹ F_na; amplitude a alone is estimated by its
/// row of the score over M_aa, so the correlation is M_ab/√(M_aa M_bb). `None` where the data say nothing about an amplitude.
pub fn correlations(
    information: &DMatrix<f64>,
    of: usize,
    nuisance_precision: &DMatrix<f64>,
) -> Option<DMatrix<f64>> {
    let nuisances = information.nrows().checked_sub(of)?;
    let own = information.view((0, 0), (of, of)).into_owned();
    let shared = information.view((of, 0), (nuisances, of)).into_owned();
    let rest = information.view((of, of), (nuisances, nuisances)) + nuisance_precision;
    let left = if nuisances == 0 { own } else { own - shared.tr_mul(&Cholesky::new(rest)?.solve(&shared)) };
    let scale = left.diagonal();
    if !scale.iter().all(|entry| *entry > 0.0) {
        return None;
    }
    Some(DMatrix::from_fn(of, of, |i, j| left[(i, j)] / (scale[i] * scale[j]).sqrt()))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Two shapes whose only overlap is a nuisance: without a prior on it, and one datum each besides, they are
    /// anticorrelated; a tight prior on it makes them independent.
    #[test]
    fn nuisances_correlate_shapes() {
        let jacobian = DMatrix::from_row_slice(3, 3, &[1.0, 0.0, 1.0, 0.0, 1.0, 1.0, 0.0, 0.0, 1.0]);
        let information = jacobian.tr_mul(&jacobian);
        let with = |precision: f64| {
            correlations(&information, 2, &DMatrix::from_element(1, 1, precision)).unwrap()[(0, 1)]
        };
        // M = 1 − 1/(3 + Λ) on the diagonal, −1/(3 + Λ) off it.
        assert!((with(0.0) + 0.5).abs() < 1e-12);
        assert!((with(1e9)).abs() < 1e-8);
        assert!(correlations(&DMatrix::zeros(2, 2), 2, &DMatrix::zeros(0, 0)).is_none());
    }

    #[test]
    fn independent_deviates_and_one_and_the_same() {
        // Five independent ones: 1 − (1 − p)⁵; counting errors of 200,000 draws are below 1 % here, three of them 3 %.
        let z = [0.3, -2.0, 1.0, 0.1, 0.0];
        let found = global_tail(&z, &DMatrix::identity(5, 5), 1).unwrap();
        assert_eq!((found.best, found.deviate), (1, -2.0));
        let expected = 1.0 - (1.0 - found.local).powi(5);
        assert!((found.global / expected - 1.0).abs() < 0.03);
        // One and the same: the global tail is the local one.
        let found = global_tail(&[2.0, 2.0], &DMatrix::from_element(2, 2, 1.0), 1).unwrap();
        assert!((found.global / found.local - 1.0).abs() < 0.03);
        // Too far out to count: Bonferroni's bound.
        let found = global_tail(&[7.0, 0.0], &DMatrix::identity(2, 2), 1).unwrap();
        assert!(found.bound && (found.global / found.local - 2.0).abs() < 1e-9);
        assert!(global_tail(&[], &DMatrix::zeros(0, 0), 1).is_none());
        assert!(global_tail(&[f64::NAN], &DMatrix::identity(1, 1), 1).is_none());
    }
}
