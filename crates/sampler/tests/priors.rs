//! Prior families against SciPy and mpmath, and their rules.

#![allow(clippy::unwrap_used, clippy::panic, reason = "test helpers may stop where they fail")]

use nalgebra::DMatrix;
use oddwell_sampler::{
    JointNormal, PriorError, PriorSet, PriorShape, SharedPrior, build_prior, prior_families,
};
use rand::{RngExt, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;

const TABLE: &str = include_str!("reference/priors.csv");

fn numbers(text: &str) -> Vec<f64> {
    text.split_whitespace().map(|number| number.parse().unwrap()).collect()
}

/// SciPy promises no digits; where two of its routes can be compared they agree to about 1e-13 here, and the tolerance
/// leaves a factor ten of that. The continued fractions of the incomplete beta and gamma functions lose some: 1e-10 of a
/// probability, which is nothing in a prior. Log densities are compared absolutely near 0, the rest relatively.
#[test]
fn families_agree_with_the_frozen_table() {
    let mut compared = 0;
    let mut worst = std::collections::BTreeMap::<String, (f64, String)>::new();
    for line in TABLE.lines().skip(1) {
        let fields: Vec<&str> = line.split(',').collect();
        let [kind, family, arguments, within, at, wanted] = fields[..] else { panic!("{line}") };
        let within = numbers(within);
        let window = (within.len() == 2).then(|| (within[0], within[1]));
        let prior = build_prior(family, &numbers(arguments), window).unwrap();
        let (at, wanted): (f64, f64) = (at.parse().unwrap(), wanted.parse().unwrap());
        if !wanted.is_finite() {
            continue;
        }
        let got = match kind {
            "log_density" => prior.log_density(at),
            "cdf" => prior.cdf(at),
            "survival" => prior.survival(at),
            "quantile" => prior.quantile(at),
            "upper_quantile" => prior.upper_quantile(at),
            "mean" => prior.mean(),
            "sd" => prior.standard_deviation(),
            _ => panic!("{line}"),
        };
        // A quantile far out in the tail of a value near another is only as sharp as its own spacing.
        let scale = match kind {
            "log_density" => wanted.abs().max(1.0),
            "cdf" | "survival" => wanted.abs(),
            _ => wanted.abs().max(1e-3 * prior.spread()),
        };
        // A probability is no sharper than the last digit of the value it belongs to.
        let conditioned = if matches!(kind, "cdf" | "survival") {
            4.0 * f64::EPSILON * at.abs() * prior.log_density(at).exp()
        } else {
            0.0
        };
        let error = ((got - wanted).abs() - conditioned).max(0.0) / scale;
        let incomplete =
            matches!(family, "beta" | "gamma" | "student_t") && matches!(kind, "cdf" | "survival");
        let group = if incomplete { "incomplete" } else { "" };
        let entry = worst
            .entry(format!("{kind} {}{group}", if window.is_some() { "within " } else { "" }))
            .or_default();
        if !(error <= entry.0) {
            *entry = (error, format!("{line}: {got:e}"));
        }
        compared += 1;
    }
    for (kind, (error, line)) in &worst {
        let tolerance = match () {
            () if kind.contains("incomplete") => 1e-10,
            () if kind.contains("mean within") || kind.contains("sd within") => 1e-9,
            () => 2e-12,
        };
        assert!(*error < tolerance, "{kind}: off by {error:e} at {line}");
    }
    assert!(compared > 1200, "only {compared} numbers compared");
}

/// Priors of every family, plain and cut.
fn samples() -> Vec<SharedPrior> {
    let arguments = |key: &str| match key {
        "normal" => vec![1.0, 2.0],
        "uniform" => vec![-1.0, 3.0],
        "log_uniform" => vec![0.1, 20.0],
        "half_normal" => vec![2.0],
        "beta" => vec![2.0, 3.0],
        "gamma" => vec![3.0, 0.5],
        "student_t" => vec![1.0, 0.5, 4.0],
        other => panic!("family {other} has no example in this test"),
    };
    prior_families()
        .iter()
        .flat_map(|family| {
            let numbers = arguments(family.key);
            let window = Some((0.3, 0.9));
            [None, window].map(|within| build_prior(family.key, &numbers, within).unwrap())
        })
        .collect()
}

#[test]
fn every_family_is_consistent_with_itself() {
    for prior in samples() {
        let (low, high) = prior.support();
        for p in [0.01, 0.2, 0.5, 0.9] {
            let x = prior.quantile(p);
            assert!(x >= low && x <= high);
            assert!((prior.cdf(x) - p).abs() < 1e-10, "{prior:?} at {p}");
            assert!((prior.survival(x) - (1.0 - p)).abs() < 1e-10, "{prior:?} at {p}");
            assert!((prior.upper_quantile(1.0 - p) - x).abs() < 1e-9 * prior.spread(), "{prior:?} at {p}");
            // Central differences: truncation h²/6 of a relative 1e-6, rounding 1e-11.
            let h = 1e-3 * prior.spread().min(x - low).min(high - x);
            let slope = (prior.cdf(x + h) - prior.cdf(x - h)) / (2.0 * h);
            assert!((slope / prior.log_density(x).exp() - 1.0).abs() < 1e-4, "{prior:?} at {p}");
            let bend = prior.log_density(x + h) + prior.log_density(x - h) - 2.0 * prior.log_density(x);
            let curvature = prior.curvature(x);
            let unit = prior.spread().min(x - low).min(high - x).powi(-2);
            assert!(
                (-bend / (h * h) - curvature).abs() < 1e-4 * (curvature.abs() + 10.0 * unit),
                "{prior:?} at {p}"
            );
        }
        let nowhere = prior.log_density(f64::NAN);
        assert!(nowhere.is_nan() || nowhere == f64::NEG_INFINITY, "{prior:?}");
        if low.is_finite() {
            assert_eq!(prior.log_density(low - 1e-6), f64::NEG_INFINITY);
            assert_eq!(prior.cdf(low - 1e-6), 0.0);
        }
        if high.is_finite() {
            assert_eq!(prior.log_density(high + 1e-6), f64::NEG_INFINITY);
            assert_eq!(prior.survival(high + 1e-6), 0.0);
        }
    }
}

/// Kolmogorov–Smirnov: √n·D exceeds 2.0 with probability 2e^(−8) = 7e-4; fourteen priors, so 1 % for one fixed seed.
#[test]
fn draws_follow_the_distribution_function() {
    let mut random = Xoshiro256PlusPlus::seed_from_u64(17);
    for prior in samples() {
        let count = 20_000;
        let mut heights: Vec<f64> = (0..count).map(|_| prior.cdf(prior.sample(&mut random))).collect();
        heights.sort_unstable_by(f64::total_cmp);
        let distance = heights
            .iter()
            .enumerate()
            .map(|(rank, height)| {
                let (below, above) = (rank as f64 / f64::from(count), (rank + 1) as f64 / f64::from(count));
                (height - below).abs().max((above - height).abs())
            })
            .fold(0.0, f64::max);
        assert!(distance * f64::from(count).sqrt() < 2.0, "{prior:?}: {distance}");
    }
}

#[test]
fn wrong_priors_are_refused_with_their_rule() {
    let text =
        |key: &str, numbers: &[f64], within| build_prior(key, numbers, within).unwrap_err().to_string();
    let cases = [
        (
            text("normal", &[0.0, -1.0], None),
            "normal prior: sd must be above 0, got -1; to hold the quantity, give a plain number",
        ),
        (text("normal", &[0.0], None), "normal prior: needs 2 numbers (mean, sd), got 1"),
        (text("half_normal", &[1.0, 2.0], None), "half_normal prior: needs 1 number (sd), got 2"),
        (text("normal", &[f64::NAN, 1.0], None), "normal prior: mean must be a finite number, got NaN"),
        (
            text("uniform", &[2.0, 1.0], None),
            "uniform prior: low must be below high, got [2, 1]; swap them, or give a plain number to hold the quantity",
        ),
        (
            text("log_uniform", &[0.0, 1.0], None),
            "log_uniform prior: low must be above 0, got 0; a logarithm needs positive bounds; `uniform` takes any",
        ),
        (text("beta", &[0.0, 1.0], None), "beta prior: a must be above 0, got 0; a flat density is [1, 1]"),
        (
            text("gamma", &[2.0, 0.0], None),
            "gamma prior: scale must be above 0, got 0; the mean is shape × scale",
        ),
        (
            text("student_t", &[0.0, 1.0, 0.0], None),
            "student_t prior: dof must be above 0, got 0; from 3 on, the standard deviation exists",
        ),
        (
            text("normal", &[0.0, 1.0], Some((1.0, 0.0))),
            "normal prior: within must have low below high, got [1, 0]; swap them",
        ),
        (
            text("uniform", &[0.0, 1.0], Some((2.0, 3.0))),
            "uniform prior: within = [2, 3] leaves it no probability (its mass there is 0e0, its support [0, 1]); widen the window or move the prior",
        ),
        (text("norml", &[0.0, 1.0], None), "unknown prior family `norml`; did you mean `normal`?"),
        (
            text("xyz", &[], None),
            "unknown prior family `xyz`; known: normal, uniform, log_uniform, half_normal, beta, gamma, student_t",
        ),
    ];
    for (got, wanted) in cases {
        assert_eq!(got, wanted);
    }
}

/// SciPy inverts the covariance by eigenvalues, this crate by Cholesky: both to 1e-13 at these condition numbers.
#[test]
fn joint_normals_agree_with_the_frozen_table() {
    for line in include_str!("reference/joint.csv").lines().skip(1) {
        let fields: Vec<&str> = line.split(',').collect();
        let (mean, covariance, at) = (numbers(fields[0]), numbers(fields[1]), numbers(fields[2]));
        let rows: Vec<Vec<f64>> = covariance.chunks(mean.len()).map(<[f64]>::to_vec).collect();
        let joint = JointNormal::new((0..mean.len()).collect(), &mean, &rows).unwrap();
        let (got, wanted) = (joint.log_density(&at), fields[3].parse::<f64>().unwrap());
        assert!((got - wanted).abs() < 1e-12 * wanted.abs().max(1.0), "{line}: {got}");
    }
}

#[test]
fn wrong_joint_priors_are_refused() {
    let refuse = |of: Vec<usize>, mean: &[f64], covariance: &[Vec<f64>]| {
        JointNormal::new(of, mean, covariance).unwrap_err()
    };
    let unit = [vec![1.0, 0.0], vec![0.0, 1.0]];
    assert!(matches!(refuse(vec![0, 1], &[0.0], &unit), PriorError::JointShape { of: 2, mean: 1, .. }));
    assert!(matches!(refuse(vec![0, 0], &[0.0, 0.0], &unit), PriorError::TwoPriors { dimension: 0 }));
    let asymmetric = [vec![1.0, 0.5], vec![0.4, 1.0]];
    assert!(matches!(
        refuse(vec![0, 1], &[0.0, 0.0], &asymmetric),
        PriorError::JointAsymmetric { row: 1, column: 0, .. }
    ));
    let indefinite = [vec![1.0, 2.0], vec![2.0, 1.0]];
    assert!(matches!(
        refuse(vec![0, 1], &[0.0, 0.0], &indefinite),
        PriorError::JointIndefinite { smallest, .. } if (smallest + 1.0).abs() < 1e-12
    ));
    let nan = [vec![1.0, 0.0], vec![f64::NAN, 1.0]];
    assert!(matches!(
        refuse(vec![0, 1], &[0.0, 0.0], &nan),
        PriorError::JointNotFinite { part: "covariance", position: (1, 0), .. }
    ));
}

fn mixed_set() -> PriorSet {
    let joint = JointNormal::new(vec![3, 0], &[1.0, -1.0], &[vec![4.0, 1.0], vec![1.0, 2.0]]).unwrap();
    let prior = |key, numbers: &[f64], within| build_prior(key, numbers, within).unwrap();
    let independent = vec![
        (1, prior("uniform", &[-1.0, 1.0], None)),
        (2, prior("normal", &[0.5, 0.1], None)),
        (4, prior("gamma", &[2.0, 1.0], None)),
        (5, prior("normal", &[0.0, 1.0], Some((0.0, 2.0)))),
    ];
    PriorSet::new(6, independent, vec![joint]).unwrap()
}

#[test]
fn a_set_is_the_product_of_its_parts() {
    let set = mixed_set();
    let point = [-0.5, 0.2, 0.45, 1.7, 1.1, 0.6];
    let parts: f64 = [1, 2, 4, 5].iter().map(|at| set.marginal(*at).log_density(point[*at])).sum();
    let wanted = parts + set.joint()[0].log_density(&point);
    assert!((set.log_density(&point) - wanted).abs() < 1e-13);
    assert_eq!(set.log_density(&[-0.5, 1.2, 0.45, 1.7, 1.1, 0.6]), f64::NEG_INFINITY);
    assert_eq!(set.log_density(&[-0.5, f64::NAN, 0.45, 1.7, 1.1, 0.6]), f64::NEG_INFINITY);
    assert_eq!(set.log_density(&[f64::NAN, 0.2, 0.45, 1.7, 1.1, 0.6]), f64::NEG_INFINITY);
    assert_eq!((set.mean(3), set.standard_deviation(0)), (1.0, 2f64.sqrt()));
    assert_eq!(set.support(5), (0.0, 2.0));
    assert_eq!(set.marginal(1).shape(), PriorShape::Flat { low: -1.0, high: 1.0 });
}

/// The precision matrix against second differences of the log density: truncation and rounding stay under 1e-5.
#[test]
fn the_precision_of_a_set_is_its_curvature() {
    let set = mixed_set();
    let point = [-0.5, 0.2, 0.45, 1.7, 1.1, 0.6];
    let h = 1e-3;
    let value = |i: usize, a: f64, j: usize, b: f64| {
        let mut moved = point;
        moved[i] += a * h;
        moved[j] += b * h;
        set.log_density(&moved)
    };
    let numeric = DMatrix::from_fn(6, 6, |i, j| {
        -(value(i, 0.5, j, 0.5) - value(i, 0.5, j, -0.5) - value(i, -0.5, j, 0.5) + value(i, -0.5, j, -0.5))
            / (h * h)
    });
    let difference = (set.precision(&point) - numeric).abs().max();
    assert!(difference < 1e-5, "{difference:e}");
}

/// Means and covariances of 40,000 draws, five standard errors allowed; draws and the cube's map must agree in law.
#[test]
fn draws_of_a_set_have_its_moments() {
    let set = mixed_set();
    let mut random = Xoshiro256PlusPlus::seed_from_u64(3);
    let count = 40_000;
    for through_cube in [false, true] {
        let mut point = [0.0; 6];
        let (mut first, mut cross) = ([0.0; 6], 0.0);
        for _ in 0..count {
            if through_cube {
                let unit: [f64; 6] = std::array::from_fn(|_| random.random::<f64>());
                set.from_unit_cube(&unit, &mut point);
            } else {
                set.sample(&mut random, &mut point);
            }
            for (sum, x) in first.iter_mut().zip(point) {
                *sum += x / f64::from(count);
            }
            cross += (point[0] + 1.0) * (point[3] - 1.0) / f64::from(count);
        }
        for (dimension, mean) in first.iter().enumerate() {
            let error = set.standard_deviation(dimension) / f64::from(count).sqrt();
            assert!((mean - set.mean(dimension)).abs() < 5.0 * error, "{dimension}: {mean}");
        }
        // Var(xy) = σx²σy² + c² = 9 for a covariance of 1 between variances 2 and 4.
        assert!((cross - 1.0).abs() < 5.0 * 3.0 / f64::from(count).sqrt(), "{cross}");
    }
}

#[test]
fn a_set_needs_one_prior_a_dimension() {
    let unit = || build_prior("normal", &[0.0, 1.0], None).unwrap();
    let make = |dimensions: &[usize]| {
        PriorSet::new(2, dimensions.iter().map(|at| (*at, unit())).collect(), vec![]).unwrap_err()
    };
    assert_eq!(make(&[0]), PriorError::NoPrior { dimension: 1 });
    assert_eq!(make(&[0, 0, 1]), PriorError::TwoPriors { dimension: 0 });
    assert_eq!(make(&[0, 2]), PriorError::NoDimension { dimension: 2, count: 2 });
}
