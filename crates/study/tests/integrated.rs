//! Linear quantities integrated out: which, what the integral is, and what the chain holds.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::Folder;
use nalgebra::{DMatrix, DVector};
use oddwell_sampler::{Control, EnsembleSettings, Target, moves::Random, sample};
use oddwell_study::Study;
use oddwell_study::assemble::{IntegratedPosterior, Posterior, read_measurements};
use rand::SeedableRng;
use std::f64::consts::TAU;

const TABLE: &str = "bin,multipole,separation,low,high,value,error\nnear,1,30,26,34,0.0010,2e-4\nnear,1,60,56,64,0.0005,1e-4\nnear,3,90,86,94,0.00005,5e-5\nfar,1,30,26,34,0.0007,2e-4\nfar,1,60,56,64,0.0003,1e-4\n";

/// Linear and free: offsets, evolution (two of them with a joint prior), a systematic, τ. Not linear: biases, σ8. Linear, but
/// with a prior that has ends, besides τ: a magnification.
fn text(tau: &str, noise: &str) -> String {
    format!(
        r#"
[background]
omega_m = 0.31
omega_b = 0.049
h = 0.68
n_s = 0.965
sigma8 = {{ normal = [0.81, 0.02] }}

[[survey]]
name = "s"
multipoles = "s.csv"
{noise}

[[survey.bin]]
name = "near"
redshift = 0.3
offset = {{ normal = [2.0, 5.0] }}
first = {{ bias = {{ normal = [2.1, 0.1] }}, magnification = 0.5, evolution = 0.1, bias_slope = -0.4 }}
second = {{ bias = 1.2, magnification = {{ normal = [0.25, 0.2], within = [0.0, 0.5] }}, evolution = {{ normal = [0.2, 0.2] }}, bias_slope = 0.2 }}

[[survey.bin]]
name = "far"
redshift = 0.6
offset = {{ normal = [-1.0, 5.0], within = [-40.0, 40.0] }}
first = {{ bias = {{ normal = [2.2, 0.1] }}, magnification = 0.5, evolution = 0.1 }}
second = {{ bias = 1.3, magnification = 0.2, evolution = 0.0 }}

[[joint_prior]]
of = ["s.near.first.evolution", "s.far.first.evolution"]
mean = [0.1, 0.2]
covariance = [[0.09, 0.05], [0.05, 0.09]]

[[systematic]]
name = "luminosity-function"
amplitude = {{ normal = [0.0, 1.0] }}
moves = [{{ quantity = "s.*.first.evolution", by = 0.3 }}, {{ quantity = "s.*.second.magnification", by = 0.02 }}]

[[hypothesis]]
name = "constant"
departure = "constant"
felt_by = "light"
tau = {tau}
"#
    )
}

const NORMAL: &str = "{ normal = [0.5, 3.0] }";
const FLAT: &str = "{ uniform = [-60.0, 60.0] }";

fn posterior(folder: &Folder, tau: &str, noise: &str) -> (Study, Posterior) {
    folder.write("s.csv", TABLE);
    let study = folder.study(&text(tau, noise));
    let measurements = read_measurements(&study).unwrap();
    let posterior = Posterior::new(&study, study.default_hypothesis(), &measurements).unwrap();
    (study, posterior)
}

#[test]
fn what_is_linear_with_a_normal_prior_is_integrated_out_and_one_flat_quantity() {
    let folder = Folder::new();
    let (_, posterior) = posterior(&folder, FLAT, "");
    let integrated = IntegratedPosterior::new(&posterior).unwrap().unwrap();
    let names = |places: &[usize]| -> Vec<&str> {
        places.iter().map(|&of| posterior.map.names()[of].as_str()).collect()
    };
    assert_eq!(
        names(integrated.sampled()),
        [
            "background.sigma8",
            "s.near.first.bias",
            "s.near.second.magnification",
            "s.far.offset",
            "s.far.first.bias"
        ]
    );
    assert_eq!(
        names(integrated.integrated()),
        [
            "s.near.offset",
            "s.near.first.evolution",
            "s.near.second.evolution",
            "s.far.first.evolution",
            "systematic.luminosity-function",
            "departure.tau"
        ]
    );
    assert_eq!(integrated.completed_dimension(), Some(posterior.dimension()));
}

/// The log of a normal integral is its height at the top plus (n/2) ln 2π − ½ ln det of the curvature. The posterior is
/// quadratic in the linear quantities, so central differences over a standard deviation have no error but rounding, 1e-12 of
/// heights near 60; determinants of six rows then hold to 1e-9.
#[test]
fn the_integral_is_the_gaussian_one() {
    for (tau, noise) in [(NORMAL, ""), (FLAT, ""), (NORMAL, "noise = \"hartlap\"\nmock_count = 30")] {
        let folder = Folder::new();
        let (_, posterior) = posterior(&folder, tau, noise);
        let integrated = IntegratedPosterior::new(&posterior).unwrap().unwrap();
        let (mut scratch, mut full) = (integrated.scratch(), posterior.scratch());
        for point in [[0.81, 2.1, 0.2, 0.0, 2.2], [0.79, 1.9, 0.4, -8.0, 2.35]] {
            let found = integrated.log_likelihood(&point, &mut scratch).unwrap();
            let top = integrated.most_probable(&point, &mut scratch).unwrap();
            let linear = integrated.integrated();
            let widths: Vec<f64> = linear.iter().map(|&of| posterior.priors.spread(of).min(3.0)).collect();
            let mut height = |x: &[f64]| {
                let mut theta = top.clone();
                linear.iter().zip(&widths).zip(x).for_each(|((of, width), x)| theta[*of] += width * x);
                posterior.log_prior(&theta) + posterior.log_likelihood(&theta, &mut full).unwrap()
            };
            let count = linear.len();
            let unit = |i: usize, j: usize, a: f64, b: f64| {
                let mut x = vec![0.0; count];
                x[i] += a;
                x[j] += b;
                x
            };
            let curvature = DMatrix::from_fn(count, count, |i, j| {
                let mixed = height(&unit(i, j, 1.0, 1.0))
                    - height(&unit(i, j, 1.0, -1.0))
                    - height(&unit(i, j, -1.0, 1.0))
                    + height(&unit(i, j, -1.0, -1.0));
                -mixed / 4.0
            });
            let slope = DVector::from_fn(count, |i, _| {
                height(&unit(i, i, 0.5, 0.0)) - height(&unit(i, i, -0.5, 0.0))
            });
            assert!(slope.norm() < 1e-8, "{tau}: not at the top, {slope}");
            let expected = height(&vec![0.0; count]) + 0.5 * count as f64 * TAU.ln()
                - 0.5 * curvature.determinant().ln()
                + widths.iter().map(|width| width.ln()).sum::<f64>()
                - integrated.log_prior(&point);
            assert!((found - expected).abs() < 1e-8, "{tau} {noise}: {found} {expected}");
        }
    }
}

/// The chain holds the full point's own log prior and log likelihood, bit by bit.
#[test]
fn a_draw_is_completed_with_its_own_heights() {
    let folder = Folder::new();
    let (_, posterior) = posterior(&folder, FLAT, "");
    let integrated = IntegratedPosterior::new(&posterior).unwrap().unwrap();
    let (mut scratch, mut full) = (integrated.scratch(), posterior.scratch());
    let point = [0.8, 2.0, 0.3, 1.0, 2.3];
    let mut draw = vec![0.0; posterior.dimension()];
    let mut random = Random::seed_from_u64(3);
    for _ in 0..20 {
        let (log_prior, log_likelihood) =
            integrated.complete(&point, &mut random, &mut scratch, &mut draw).unwrap();
        assert_eq!(log_prior.to_bits(), posterior.log_prior(&draw).to_bits());
        let own = posterior.log_likelihood(&draw, &mut full).unwrap();
        assert_eq!(log_likelihood.to_bits(), own.to_bits());
        assert!(integrated.sampled().iter().zip(point).all(|(of, value)| draw[*of] == value));
    }
}

/// Both ways give the same posterior: means within 4.5 joint standard errors (of eleven parameters), widths within five times
/// their own error, 1/√(2n).
#[test]
fn both_chains_are_of_the_same_posterior() {
    let folder = Folder::new();
    let (_, posterior) = posterior(&folder, FLAT, "");
    let integrated = IntegratedPosterior::new(&posterior).unwrap().unwrap();
    let settings =
        EnsembleSettings { watched: posterior.hypothesis.watched(), ..EnsembleSettings::default() };
    let direct =
        sample(&posterior, &posterior.priors, &settings, &mut |_| Control::Continue).unwrap().diagnostics;
    let settings = EnsembleSettings { seed: 2, ..settings };
    let chain = sample(&integrated, &integrated.priors, &settings, &mut |_| Control::Continue).unwrap();
    assert!(chain.outcome.converged);
    assert_eq!(chain.dimension, posterior.dimension());
    for ((one, other), name) in direct.iter().zip(&chain.diagnostics).zip(posterior.map.names()) {
        let off = (one.mean - other.mean) / one.mcse.hypot(other.mcse);
        assert!(off.abs() < 4.5, "{name}: means {off} errors apart");
        let error = 0.5f64.sqrt() * one.ess_mean.sqrt().recip().hypot(other.ess_mean.sqrt().recip());
        let off = (one.sd / other.sd - 1.0) / error;
        assert!(off.abs() < 5.0, "{name}: widths {off} errors apart");
    }
}

#[test]
fn noise_that_is_not_normal_leaves_everything_to_be_sampled() {
    let folder = Folder::new();
    let (_, posterior) = posterior(&folder, NORMAL, "noise = \"t\"\nmock_count = 30");
    assert!(IntegratedPosterior::new(&posterior).unwrap().is_none());
}
