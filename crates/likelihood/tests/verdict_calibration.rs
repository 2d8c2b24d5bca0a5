//! False alarms: the p-values of every verdict on clean simulations, as often below a threshold as it says.
//!
//! 2000 draws each. p-values that are exact are held against the uniform distribution as a whole (Kolmogorov and Smirnov,
//! passed by all but 1 in 1000 seeds); approximate ones at thresholds of 1, 5 and 20 %; bounds may only be too rare.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

mod common;
#[path = "common/simulation.rs"]
mod simulation;

use common::generator;
use oddwell_likelihood::Covariance;
use oddwell_likelihood::verdicts::{
    Comparison, amplitude, covariance_scale, duplicate, goodness, normality, orientation, parity_block,
    preference, row_order, signal, whitened_residuals,
};
use simulation::{World, binomial_error, distance_from_uniform, share_below};
use statrs::distribution::{ContinuousCDF, Normal};

const DRAWS: usize = 2000;

/// One number from each of many clean comparisons.
fn over_draws(world: &World, seed: u64, mut verdict: impl FnMut(&Comparison) -> f64) -> Vec<f64> {
    let mut random = generator(seed);
    (0..DRAWS).map(|_| verdict(&world.comparison(&mut random))).collect()
}

fn world(parameters: usize, mocks: Option<usize>) -> World {
    World::new(16, 1.5, parameters, 0.7, mocks, &mut generator(100))
}

/// As often below 1, 5 and 20 % as these, give or take 3.5 binomial errors and a share of the threshold.
fn check_rates(sample: &[f64], slack: f64, what: &str) {
    for threshold in [0.01, 0.05, 0.2] {
        let share = share_below(sample, threshold);
        let error = binomial_error(threshold, sample.len());
        assert!(
            (share - threshold).abs() < slack * threshold + 3.5 * error,
            "{what}: {share} below {threshold}, binomial error {error}"
        );
    }
}

/// No more often below a threshold than it says.
fn check_bound(sample: &[f64], what: &str) {
    for threshold in [0.01, 0.05, 0.2] {
        let share = share_below(sample, threshold);
        assert!(
            share < threshold + 3.0 * binomial_error(threshold, sample.len()),
            "{what}: {share} below {threshold}"
        );
    }
}

#[test]
fn goodness_of_the_whole_and_of_parts() {
    let p = |comparison: &Comparison| goodness(comparison).unwrap().p_value.unwrap();
    let part = |comparison: &Comparison| p(&comparison.select(&[3, 1, 10, 7, 8]));
    for (parameters, mocks) in [(0, None), (3, None), (0, Some(40))] {
        let world = world(parameters, mocks);
        assert!(distance_from_uniform(over_draws(&world, 1, p)) < 1.0, "{parameters}, {mocks:?}");
        assert!(distance_from_uniform(over_draws(&world, 2, part)) < 1.0, "{parameters}, {mocks:?}");
    }
    // Approximate: both at once. Were N + JΣJᵀ as a whole taken for an estimate, with more mocks, 1 % would be 2 %.
    let both = world(3, Some(32));
    check_rates(&over_draws(&both, 3, p), 0.1, "goodness, mocks and parameters");
    // And wrong, where the parameters' spread is forgotten.
    let forgotten = |comparison: &Comparison| p(&comparison.clone().holding(&[0, 1, 2]));
    assert!(distance_from_uniform(over_draws(&world(3, None), 4, forgotten)) > 3.0);
}

#[test]
fn amplitudes_and_their_significance() {
    let uniform = |sigma: f64| Normal::standard().cdf(sigma);
    for (parameters, mocks) in [(0, None), (3, None), (0, Some(24))] {
        let world = world(parameters, mocks);
        let direction = world.expectation.prediction.clone();
        let found = over_draws(&world, 5, |comparison| {
            uniform(amplitude(comparison, &direction).unwrap().sigma_from(0.0))
        });
        assert!(distance_from_uniform(found) < 1.0, "{parameters}, {mocks:?}");
    }
    let both = world(3, Some(32));
    let direction = both.expectation.prediction.clone();
    let two_sided = over_draws(&both, 6, |comparison| {
        2.0 * uniform(-amplitude(comparison, &direction).unwrap().sigma_from(0.0).abs())
    });
    check_rates(&two_sided, 0.15, "amplitude, mocks and parameters");
}

/// Mocks and parameters together, where both are approximate. With 10 000 draws each: goodness 0.7 to 1.0 % below 1 % and
/// 4.4 to 5.0 % below 5 %, amplitudes 0.7 to 1.0 % and 4.1 to 5.0 %.
#[test]
fn mocks_and_parameters_together() {
    for (spread, mocks, parameters) in [(0.2, 40, 8), (3.0, 40, 8), (0.3, 24, 3), (5.0, 24, 3)] {
        let world = World::new(16, 1.5, parameters, spread, Some(mocks), &mut generator(100));
        let direction = world.expectation.prediction.clone();
        let mut two_sided = Vec::new();
        let p = over_draws(&world, 20, |comparison| {
            let sigma = amplitude(comparison, &direction).unwrap().sigma_from(0.0);
            two_sided.push(2.0 * Normal::standard().cdf(-sigma.abs()));
            goodness(comparison).unwrap().p_value.unwrap()
        });
        check_rates(&p, 0.2, &format!("goodness, {spread}, {mocks}, {parameters}"));
        check_rates(&two_sided, 0.25, &format!("amplitude, {spread}, {mocks}, {parameters}"));
    }
}

#[test]
fn whitened_residuals_are_standard_normal() {
    for (parameters, mocks) in [(3, None), (0, Some(20))] {
        let world = world(parameters, mocks);
        let mut residuals = vec![Vec::new(); world.rows()];
        let mut random = generator(7);
        for _ in 0..DRAWS {
            let found = whitened_residuals(&world.comparison(&mut random)).unwrap();
            found.iter().zip(&mut residuals).for_each(|(z, all)| all.push(Normal::standard().cdf(*z)));
        }
        for (row, residuals) in residuals.into_iter().enumerate() {
            // Sixteen rows: a threshold that 1 in 16 000 exceeds (Kolmogorov: 2 exp(−2·2.28²)).
            assert!(distance_from_uniform(residuals) < 2.28 / 1.95, "row {row}, {mocks:?}");
        }
    }
}

#[test]
fn normality_of_normal_noise() {
    for (parameters, mocks) in [(3, None), (0, Some(20)), (3, Some(32))] {
        let world = world(parameters, mocks);
        let found = over_draws(&world, 8, |comparison| normality(comparison).unwrap().unwrap().p_value);
        check_rates(&found, 0.1, "normality");
    }
}

#[test]
fn scale_of_the_covariance() {
    for (parameters, mocks) in [(0, None), (3, None), (0, Some(40)), (3, Some(40))] {
        let world = world(parameters, mocks);
        let mut pulls = Vec::new();
        let found = over_draws(&world, 9, |comparison| {
            let scale = covariance_scale(comparison).unwrap().unwrap();
            pulls.push(scale.log_factor / scale.log_error);
            scale.p_value
        });
        check_rates(&found, 0.15, "scale");
        if mocks.is_none() {
            // The logarithm of a χ² of 13 to 16 degrees of freedom is not quite normal: mean −1/ν of it, variance 1 + 1/ν
            // in units of the error, to a few per cent.
            let mean = pulls.iter().sum::<f64>() / DRAWS as f64;
            let variance = pulls.iter().map(|pull| (pull - mean).powi(2)).sum::<f64>() / DRAWS as f64;
            assert!(mean.abs() < 0.4 && (variance - 1.0).abs() < 0.25, "{mean} {variance}");
        }
    }
}

#[test]
fn bounds_are_kept() {
    for (parameters, mocks) in [(0, None), (3, None), (2, Some(40))] {
        for strength in [0.2, 0.8] {
            let world = World::new(16, strength, parameters, 0.7, mocks, &mut generator(101));
            let odd: Vec<usize> = (0..8).collect();
            let what = format!("{parameters}, {mocks:?}, {strength}");
            let turned = over_draws(&world, 10, |comparison| orientation(comparison, &odd).unwrap().p_value);
            check_bound(&turned, &format!("orientation, {what}"));
            let order = over_draws(&world, 11, |comparison| {
                row_order(&comparison.select(&[0, 1, 2, 3, 4, 5, 6, 7])).unwrap().p_value
            });
            check_bound(&order, &format!("order, {what}"));
        }
    }
    // An order is sought among so many that without its number the bound would be broken.
    let world = World::new(40, 0.5, 0, 0.0, None, &mut generator(104));
    check_bound(&over_draws(&world, 105, |comparison| row_order(comparison).unwrap().p_value), "order of 40");
    // The bound of the orientation is not idle: some of it is used up.
    let mut world = World::new(16, 1.0, 0, 0.0, None, &mut generator(102));
    let all: Vec<usize> = (0..16).collect();
    // At a squared distance of 6, a difference below −6 (a bound of 5 %) has a probability of Φ(−√6) = 0.7 %.
    let apart = orientation(&world.comparison(&mut generator(103)), &all).unwrap().expected;
    world.expectation.prediction *= (6.0 / apart).sqrt();
    let turned = over_draws(&world, 12, |comparison| orientation(comparison, &all).unwrap().p_value);
    assert!(share_below(&turned, 0.05) > 0.002 && share_below(&turned, 0.05) < 0.014);
}

/// Known covariance, nothing free: the difference is normal about the squared distance q with variance 4q, so the bound of
/// 5 % is met with probability Φ(−(q + 6)/2√q) = Φ(−√6) = 0.7 % at q = 6.
#[test]
fn another_prediction_is_preferred_as_rarely_as_it_says() {
    for (parameters, mocks) in [(0, None), (3, None), (2, Some(40))] {
        let world = World::new(16, 0.8, parameters, 0.7, mocks, &mut generator(106));
        let other = &world.expectation.prediction * 0.4;
        let found = over_draws(&world, 107, |comparison| preference(comparison, &other).unwrap().p_value);
        check_bound(&found, &format!("preference, {parameters}, {mocks:?}"));
    }
    let world = World::new(16, 1.0, 0, 0.0, None, &mut generator(108));
    let apart =
        preference(&world.comparison(&mut generator(109)), &(&world.expectation.prediction * 0.5)).unwrap();
    let share = 1.0 - 0.5 * (6.0 / apart.expected).sqrt();
    let other = &world.expectation.prediction * share;
    let found = over_draws(&world, 110, |comparison| preference(comparison, &other).unwrap().p_value);
    assert!(share_below(&found, 0.05) > 0.002 && share_below(&found, 0.05) < 0.014);
    // Where the other is right it is preferred.
    let other = &world.expectation.prediction * 3.0;
    let mut random = generator(111);
    let data = world.data(&mut random) + &other - &world.expectation.prediction;
    let found = preference(&world.with(data, &mut random), &other).unwrap();
    assert!(found.difference < -0.5 * found.expected && found.p_value < 1e-3, "{found:?}");
}

#[test]
fn independent_surveys_are_no_duplicates() {
    for mocks in [None, Some(60)] {
        let mut random = generator(13);
        let (first, second) = (world(2, mocks), World::new(16, 0.0, 2, 0.7, mocks, &mut random));
        let pairs: Vec<(usize, usize)> = (0..12).map(|row| (row, 15 - row)).collect();
        let found: Vec<f64> = (0..DRAWS)
            .map(|_| {
                let data = [first.data(&mut random), second.data(&mut random)];
                let [a, b] = data;
                let (a, b) = (first.survey(a, &mut random), second.survey(b, &mut random));
                duplicate(&a, &b, &pairs).unwrap().p_value
            })
            .collect();
        check_bound(&found, "duplicates");
        // Without any signal the bound is the probability itself.
        let still: Vec<f64> = (0..DRAWS)
            .map(|_| {
                let [a, b] = [first.noise(&mut random), second.noise(&mut random)];
                let (a, b) = (first.survey(a, &mut random), second.survey(b, &mut random));
                duplicate(&a, &b, &pairs).unwrap().p_value
            })
            .collect();
        match mocks {
            None => assert!(distance_from_uniform(still) < 1.0),
            Some(_) => check_rates(&still, 0.15, "duplicates of noise, mocks"),
        }
    }
}

#[test]
fn nothing_is_no_signal() {
    for mocks in [None, Some(30)] {
        let world = World::new(12, 0.0, 0, 0.0, mocks, &mut generator(14));
        let found = over_draws(&world, 15, |comparison| {
            Normal::standard().sf(signal(comparison).unwrap().sigma.unwrap())
        });
        assert!(distance_from_uniform(found) < 1.0, "{mocks:?}");
        // The estimate of the squared signal-to-noise is unbiased: 12 rows at 1.2 each, correlated; sd of a χ² that is not
        // central, 4.5 Monte Carlo errors; less where it is clipped at 0, which never happens here.
        let world = World::new(12, 3.0, 0, 0.0, mocks, &mut generator(16));
        let wanted = Covariance::new(world.covariance.clone(), "truth").unwrap();
        let truth = wanted.matrix().clone().cholesky().unwrap().solve(&world.expectation.prediction);
        let truth = truth.dot(&world.expectation.prediction);
        let found = over_draws(&world, 17, |comparison| signal(comparison).unwrap().signal_to_noise.powi(2));
        let mean = found.iter().sum::<f64>() / DRAWS as f64;
        let spread = (found.iter().map(|x| (x - mean).powi(2)).sum::<f64>() / DRAWS as f64).sqrt();
        assert!((mean - truth).abs() < 4.5 * spread / (DRAWS as f64).sqrt(), "{mocks:?}: {mean} {truth}");
    }
}

#[test]
fn blocks_between_odd_and_even_rows() {
    let world = World::new(10, 0.0, 0, 0.0, Some(60), &mut generator(18));
    let (odd, even) = ([0, 2, 4, 9], [1, 3, 5, 6, 7, 8]);
    let truth = Covariance::new(world.covariance.clone(), "truth").unwrap();
    let independent = truth.with_empty_block(&odd, &even);
    let mut random = generator(19);
    let [mut against_truth, mut against_none] = [(); 2].map(|()| Vec::new());
    for _ in 0..DRAWS {
        let estimate = Covariance::new(world.estimate(&mut random), "mocks").unwrap();
        let p = |expected: Option<&Covariance>| {
            parity_block(&estimate, expected, &odd, &even, Some(60)).unwrap().p_value.unwrap()
        };
        against_truth.push(p(Some(&truth)));
        against_none.push(p(None));
    }
    check_rates(&against_truth, 0.15, "parity");
    // The truth has correlations between the groups, which an expectation of none misses.
    assert!(share_below(&against_none, 0.05) > 0.5, "{}", share_below(&against_none, 0.05));
    // An expectation of none, written as a covariance, is no expectation.
    let estimate = Covariance::new(world.estimate(&mut random), "mocks").unwrap();
    let p = |expected: Option<&Covariance>| parity_block(&estimate, expected, &odd, &even, Some(60)).unwrap();
    let (none, written) = (p(None), p(Some(&independent)));
    assert!((none.p_value.unwrap() / written.p_value.unwrap() - 1.0).abs() < 1e-6);
    assert_eq!(none.largest, written.largest);
}
