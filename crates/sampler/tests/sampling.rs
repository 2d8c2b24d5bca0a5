//! The sampler as a distribution: targets of known moments, fixed seeds.
//!
//! Thresholds: a mean of draws is off by z Monte Carlo standard errors, the error by the chain's own effective samples; |z| is
//! normal up to the error of that error (some 5 %). With N numbers looked at and one fixed seed, 4.5 is exceeded by chance
//! with probability 7e-6 N, under 1 % for the largest N here; a bias of a tenth of a standard deviation gives 6 and more.

#![allow(clippy::unwrap_used, clippy::panic, reason = "test helpers may stop where they fail")]

mod common;

use common::{Gaussian, Simple, flat, rosenbrock};
use oddwell_sampler::{Chain, Control, EnsembleSettings, PriorSet, Target, build_prior, sample};

const ERRORS: f64 = 4.5;

fn run(target: &impl Target, priors: &PriorSet, settings: &EnsembleSettings) -> Chain {
    sample(target, priors, settings, &mut |_| Control::Continue).unwrap()
}

fn converged(target: &impl Target, priors: &PriorSet, settings: &EnsembleSettings) -> Chain {
    let chain = run(target, priors, settings);
    assert!(chain.outcome.converged && chain.outcome.failing.is_empty(), "{:?}", chain.outcome);
    for found in &chain.diagnostics {
        assert!(found.rhat < 1.01 && found.ess_bulk >= 400.0 && found.ess_tail >= 400.0, "{found:?}");
    }
    chain
}

/// The mean of `quantity` over the draws against its known value.
fn mean_is(chain: &Chain, what: &str, wanted: f64, quantity: impl Fn(&[f64]) -> f64) {
    let values: Vec<f64> = chain.draws().map(|draw| quantity(draw.point)).collect();
    let found = chain.diagnose(&values);
    let errors = (found.mean - wanted) / found.mcse;
    assert!(
        errors.abs() < ERRORS,
        "{what}: {} ± {}, wanted {wanted} ({errors:.1} errors)",
        found.mean,
        found.mcse
    );
}

/// Means, variances and correlations, all in units of the known standard deviations.
fn gaussian_moments(dimension: usize, settings: &EnsembleSettings) {
    let gaussian = Gaussian::new(dimension, 1e4, 3);
    let target =
        Simple { priors: flat(dimension, -50.0, 50.0), likelihood: |x: &[f64]| gaussian.log_density(x) };
    let chain = converged(&target, &target.priors, settings);
    let scaled = |x: &[f64], i: usize| (x[i] - gaussian.mean[i]) / gaussian.covariance[(i, i)].sqrt();
    for i in 0..dimension {
        mean_is(&chain, &format!("mean {i} of {dimension}"), 0.0, |x| scaled(x, i));
        for j in 0..=i {
            let wanted = gaussian.covariance[(i, j)]
                / (gaussian.covariance[(i, i)] * gaussian.covariance[(j, j)]).sqrt();
            let what = format!("covariance {i}, {j} of {dimension}");
            mean_is(&chain, &what, wanted, |x| scaled(x, i) * scaled(x, j));
        }
    }
    let watched = chain.diagnostics[0].ess_bulk;
    assert!(watched >= settings.effective_samples, "{watched}");
}

#[test]
fn gaussians_of_condition_ten_thousand() {
    for dimension in [2, 10, 30] {
        let settings = EnsembleSettings { watched: vec![0], ..EnsembleSettings::default() };
        gaussian_moments(dimension, &settings);
    }
}

/// The moves of the ensemble have to do without independent proposals, too.
#[test]
fn gaussians_by_moves_of_the_ensemble_alone() {
    let moves = ["stretch", "differential_evolution", "snooker"];
    for (dimension, weights) in [(2, [1.0, 0.0, 0.0]), (2, [0.0, 0.1, 0.9]), (10, [0.25, 0.6, 0.15])] {
        let move_weights =
            moves.iter().zip(weights).map(|(name, weight)| ((*name).to_owned(), weight)).collect();
        let settings = EnsembleSettings { move_weights, seed: 5, ..EnsembleSettings::default() };
        gaussian_moments(dimension, &EnsembleSettings { watched: vec![0], ..settings });
    }
}

/// ⟨x⟩ = 1, Var x = 10, ⟨y⟩ = 11, Var y = 240.1, and y − x² a normal of variance 0.1, independent of x.
#[test]
fn moments_of_a_rosenbrock_density() {
    let target = Simple { priors: flat(2, -400.0, 800.0), likelihood: rosenbrock };
    let settings =
        EnsembleSettings { effective_samples: 10_000.0, watched: vec![0, 1], ..EnsembleSettings::default() };
    let chain = run(&target, &target.priors, &settings);
    assert!(chain.outcome.converged, "{:?}", chain.outcome);
    mean_is(&chain, "mean of x", 1.0, |point| point[0]);
    mean_is(&chain, "variance of x", 10.0, |point| (point[0] - 1.0).powi(2));
    mean_is(&chain, "mean of y", 11.0, |point| point[1]);
    mean_is(&chain, "variance of y", 240.1, |point| (point[1] - 11.0).powi(2));
    mean_is(&chain, "variance across", 0.1, |point| (point[1] - point[0] * point[0]).powi(2));
}

/// Normals cut off by their priors: at −1 and at +2 standard deviations by uniform ones, at 0 by half-normal ones. Means and
/// variances of truncated normals after Johnson, Kotz & Balakrishnan (1994, §10.1).
#[test]
fn bounded_priors() {
    let prior = |key, numbers: &[f64]| build_prior(key, numbers, None).unwrap();
    let priors = PriorSet::from_independent(vec![
        prior("uniform", &[-1.0, 30.0]),
        prior("uniform", &[2.0, 5.0]),
        prior("half_normal", &[1.0]),
        prior("half_normal", &[2.0]),
    ]);
    let likelihood = |x: &[f64]| -0.5 * (x[0] * x[0] + x[1] * x[1] + (x[3] - 1.0).powi(2));
    let target = Simple { priors, likelihood };
    let settings = EnsembleSettings { watched: vec![0, 1, 2, 3], ..EnsembleSettings::default() };
    let chain = converged(&target, &target.priors, &settings);
    // ϕ(1)/Φ(1) and so on, from SciPy 1.17.1 truncnorm(-1, 30), truncnorm(2, 5), halfnorm() and, with the product of the
    // half-normal and the likelihood a normal of mean 0.8 and variance 0.8 above 0, truncnorm(-0.8/√0.8, ∞, 0.8, √0.8).
    let wanted = [
        (0.287_599_970_939_178_4, 0.629_686_285_776_605_5),
        (2.373_180_084_953_138, 0.114_180_402_029_888_44),
        (0.797_884_560_802_865_4, 0.363_380_227_632_418_6),
        (1.093_677_768_214_962, 0.478_811_153_884_309_56),
    ];
    for (i, (mean, variance)) in wanted.into_iter().enumerate() {
        mean_is(&chain, &format!("mean {i}"), mean, |x| x[i]);
        mean_is(&chain, &format!("variance {i}"), variance, |x| (x[i] - mean).powi(2));
    }
    for draw in chain.draws() {
        assert!(
            draw.log_prior.is_finite()
                && draw.point[0] >= -1.0
                && draw.point[1] >= 2.0
                && draw.point[2] >= 0.0
        );
    }
}

/// Three independent Student t of 3 degrees of freedom: no fourth moment, so probabilities at known quantiles (SciPy 1.17.1,
/// `scipy.stats.t.ppf(p, 3)`). Farther out than 1 % the draws are too few to know their own error.
#[test]
fn a_heavy_tailed_prior() {
    let prior = build_prior("student_t", &[0.0, 1.0, 3.0], None).unwrap();
    let target = Simple { priors: PriorSet::from_independent(vec![prior; 3]), likelihood: |_: &[f64]| 0.0 };
    let settings = EnsembleSettings {
        effective_samples: 20_000.0,
        watched: vec![0, 1, 2],
        ..EnsembleSettings::default()
    };
    let chain = converged(&target, &target.priors, &settings);
    let quantiles = [
        (0.01, -4.540_702_858_568_133_5),
        (0.05, -2.353_363_434_801_824),
        (0.25, -0.764_892_328_404_344_4),
        (0.5, 0.0),
        (0.9, 1.637_744_353_696_209),
        (0.99, 4.540_702_858_568_133_5),
    ];
    for i in 0..3 {
        for (probability, quantile) in quantiles {
            let what = format!("probability {probability} of {i}");
            mean_is(&chain, &what, probability, |x| f64::from(u8::from(x[i] <= quantile)));
        }
    }
}

/// Two normals twelve standard deviations apart, two to one: both are found, and their weights. (A search that climbs from one
/// place alone, and walkers that start around it, see one of them, and nothing amiss.)
#[test]
fn two_modes() {
    let likelihood = |x: &[f64]| {
        let at = |centre: f64| -0.5 * (2.0 * (x[0] - centre)).powi(2) - 0.5 * (x[1] * x[1] + x[2] * x[2]);
        (2.0 * at(-3.0).exp() + at(3.0).exp()).max(1e-300).ln()
    };
    let target = Simple { priors: flat(3, -20.0, 20.0), likelihood };
    for seed in 1..=4 {
        let settings = EnsembleSettings { watched: vec![0], seed, ..EnsembleSettings::default() };
        let chain = run(&target, &target.priors, &settings);
        assert!(chain.outcome.converged, "{:?}", chain.outcome);
        assert!(!chain.peak.as_ref().unwrap().others.is_empty());
        mean_is(&chain, "share of the left", 2.0 / 3.0, |x| f64::from(u8::from(x[0] < 0.0)));
        mean_is(&chain, "mean", -1.0, |x| x[0]);
        mean_is(&chain, "variance", 8.25, |x| (x[0] + 1.0).powi(2));
    }
}

/// Neal's (2003, Ann. Stat. 31, 705) funnel in five dimensions: the first coordinate is normal of sd 2 whatever the others do.
#[test]
fn a_funnel() {
    let likelihood = |x: &[f64]| {
        let width = (-x[0]).exp();
        -0.125 * x[0] * x[0] - x[1..].iter().map(|y| 0.5 * y * y * width + 0.5 * x[0]).sum::<f64>()
    };
    let target = Simple { priors: flat(5, -300.0, 300.0), likelihood };
    let settings = EnsembleSettings { maximum_rhat: 1.03, ..EnsembleSettings::default() };
    let chain = run(&target, &target.priors, &settings);
    assert!(chain.outcome.converged, "{:?}", chain.outcome);
    mean_is(&chain, "mean", 0.0, |x| x[0]);
    mean_is(&chain, "variance", 4.0, |x| x[0] * x[0]);
}

/// A joint prior and no data: the posterior is the prior.
#[test]
fn a_joint_prior() {
    let covariance = [vec![1.0, 0.95], vec![0.95, 1.0]];
    let joint = oddwell_sampler::JointNormal::new(vec![2, 0], &[3.0, -1.0], &covariance).unwrap();
    let independent = vec![(1, build_prior("gamma", &[2.0, 0.5], None).unwrap())];
    let priors = PriorSet::new(3, independent, vec![joint]).unwrap();
    let target = Simple { priors, likelihood: |_: &[f64]| -7.0 };
    let chain = converged(&target, &target.priors, &EnsembleSettings::default());
    mean_is(&chain, "mean 0", -1.0, |x| x[0]);
    mean_is(&chain, "mean 2", 3.0, |x| x[2]);
    mean_is(&chain, "covariance", 0.95, |x| (x[0] + 1.0) * (x[2] - 3.0));
    mean_is(&chain, "mean 1", 1.0, |x| x[1]);
    mean_is(&chain, "variance 1", 0.5, |x| (x[1] - 1.0).powi(2));
    assert!(chain.log_likelihood.iter().all(|value| *value == -7.0));
}
