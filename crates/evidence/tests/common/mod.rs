//! Densities whose evidence is known.

#![allow(dead_code, reason = "a test file that shares this module uses a part of it")]
#![allow(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use oddwell_evidence::{Estimate, Estimator, Problem, Watch};
use oddwell_sampler::{EvaluationFailure, PriorSet, Target, build_prior};
use statrs::function::gamma::ln_gamma;
use std::f64::consts::{PI, TAU};

/// The log likelihood of a point.
pub(crate) type LogLikelihood = Box<dyn Fn(&[f64]) -> f64 + Sync>;

/// A log likelihood over a box.
pub(crate) struct Boxed {
    pub(crate) name: &'static str,
    pub(crate) priors: PriorSet,
    pub(crate) log_likelihood: LogLikelihood,
    /// From a formula, or from quadrature.
    pub(crate) log_evidence: f64,
}

impl Target for Boxed {
    type Scratch = ();
    fn dimension(&self) -> usize {
        self.priors.dimension()
    }
    fn scratch(&self) {}
    fn log_prior(&self, point: &[f64]) -> f64 {
        self.priors.log_density(point)
    }
    fn log_likelihood(&self, point: &[f64], _: &mut ()) -> Result<f64, EvaluationFailure> {
        Ok((self.log_likelihood)(point))
    }
}

pub(crate) fn flat_box(dimension: usize, low: f64, high: f64) -> PriorSet {
    PriorSet::from_independent(vec![build_prior("uniform", &[low, high], None).unwrap(); dimension])
}

pub(crate) fn estimate(target: &Boxed, estimator: &dyn Estimator<Boxed>, seed: u64) -> Estimate {
    let problem = Problem { target, priors: &target.priors, seed, peak: None, chain: None, contained: None };
    estimator.estimate(&problem, &Watch::new()).unwrap()
}

/// A normal density with neighbouring coordinates correlated by 0.6 and widths from 0.1 to 1, in a box of ± 10: at least ten
/// standard deviations to each side, so that Z is the box's density to 1e-20.
pub(crate) fn normal(dimension: usize) -> Boxed {
    let (rho, low) = (0.6f64, 0.1f64);
    let widths: Vec<f64> =
        (0..dimension).map(|i| low.powf(1.0 - i as f64 / (dimension as f64 - 1.0).max(1.0))).collect();
    let log_constant = -0.5 * dimension as f64 * TAU.ln()
        - widths.iter().map(|width| width.ln()).sum::<f64>()
        - 0.5 * (dimension as f64 - 1.0) * (1.0 - rho * rho).ln();
    let log_likelihood = move |x: &[f64]| {
        // An autoregressive sequence: every coordinate given the one before.
        let z: Vec<f64> = x.iter().zip(&widths).map(|(x, width)| (x - 0.3) / width).collect();
        let steps = z.windows(2).map(|pair| (pair[1] - rho * pair[0]).powi(2) / (1.0 - rho * rho));
        log_constant - 0.5 * (z[0] * z[0] + steps.sum::<f64>())
    };
    Boxed {
        name: "normal",
        priors: flat_box(dimension, -10.0, 10.0),
        log_likelihood: Box::new(log_likelihood),
        log_evidence: -(dimension as f64) * 20f64.ln(),
    }
}

/// The Gaussian shells of Feroz, Hobson & Bridges 2009 (MNRAS 398, 1601, §6.2): two, of radius 2 and width 0.1, at ± 3.5 on
/// the first axis, in a box of ± 6.
///
/// ln Z by Simpson's rule over the radius: Z = 2 · area of the unit sphere · ∫ r^(d−1) N(r; 2, 0.1) dr / 12^d; a shell ends
/// 5 widths before the box does, and the two are 20 widths apart.
pub(crate) fn shells(dimension: usize) -> Boxed {
    let (radius, width) = (2.0f64, 0.1f64);
    let peak = move |r: f64| -0.5 * ((r - radius) / width).powi(2) - 0.5 * (TAU * width * width).ln();
    let log_likelihood = move |x: &[f64]| {
        let rest: f64 = x[1..].iter().map(|x| x * x).sum();
        let [left, right] = [-3.5, 3.5].map(|centre| peak(((x[0] - centre).powi(2) + rest).sqrt()));
        left.max(right) + (-(left - right).abs()).exp().ln_1p()
    };
    let d = dimension as f64;
    let log_area = 2f64.ln() + 0.5 * d * PI.ln() - ln_gamma(0.5 * d);
    let radial = simpson(|r| (peak(r) + (d - 1.0) * r.ln()).exp(), 1.0, 3.0, 4000);
    Boxed {
        name: "shells",
        priors: flat_box(dimension, -6.0, 6.0),
        log_likelihood: Box::new(log_likelihood),
        log_evidence: 2f64.ln() + log_area + radial.ln() - d * 12f64.ln(),
    }
}

/// Two normal modes of widths 0.25 and 0.3 with weights 0.3 and 0.7, at ± 3 on the first axis, in a box of ± 5: the wide mode
/// ends 6.7 standard deviations before the box, which cuts less than 1e-10 off. (Of a mode ten times narrower no draw of the
/// prior would know, in ten dimensions: no method that starts from the prior finds it.)
pub(crate) fn bimodal(dimension: usize) -> Boxed {
    let d = dimension as f64;
    let log_likelihood = move |x: &[f64]| {
        let mode = |centre: f64, width: f64, weight: f64| {
            let rest: f64 = x[1..].iter().map(|x| x * x).sum();
            let squares = (x[0] - centre).powi(2) + rest;
            weight.ln() - 0.5 * squares / (width * width) - 0.5 * d * (TAU * width * width).ln()
        };
        let (a, b) = (mode(-3.0, 0.25, 0.3), mode(3.0, 0.3, 0.7));
        a.max(b) + (-(a - b).abs()).exp().ln_1p()
    };
    Boxed {
        name: "bimodal",
        priors: flat_box(dimension, -5.0, 5.0),
        log_likelihood: Box::new(log_likelihood),
        log_evidence: -d * 10f64.ln(),
    }
}

/// A product of Cauchy densities of width 0.2 in a box of ± 10: Z = [(2/π) atan(10/0.2)/20]^d.
pub(crate) fn heavy_tailed(dimension: usize) -> Boxed {
    let width = 0.2f64;
    let log_likelihood =
        move |x: &[f64]| x.iter().map(|x| -(PI * width * (1.0 + (x / width).powi(2))).ln()).sum();
    Boxed {
        name: "heavy-tailed",
        priors: flat_box(dimension, -10.0, 10.0),
        log_likelihood: Box::new(log_likelihood),
        log_evidence: dimension as f64 * ((2.0 / PI) * (10.0f64 / width).atan() / 20.0).ln(),
    }
}

/// ln L = [2 + cos(x/2) cos(y/2)]⁵ over [0, 10π]²: eighteen equal peaks, by Simpson's rule in both coordinates (Feroz, Hobson
/// & Bridges 2009, §6.1).
pub(crate) fn egg_box() -> Boxed {
    let height = |x: f64, y: f64| (2.0 + (0.5 * x).cos() * (0.5 * y).cos()).powi(5);
    let top = 3f64.powi(5);
    let side = 10.0 * PI;
    let inner = |x: f64| simpson(|y| (height(x, y) - top).exp(), 0.0, side, 2000);
    let integral = simpson(inner, 0.0, side, 2000) / (side * side);
    Boxed {
        name: "egg-box",
        priors: flat_box(2, 0.0, side),
        log_likelihood: Box::new(move |x: &[f64]| height(x[0], x[1])),
        log_evidence: top + integral.ln(),
    }
}

pub(crate) fn simpson(f: impl Fn(f64) -> f64, low: f64, high: f64, steps: usize) -> f64 {
    let h = (high - low) / steps as f64;
    let inner: f64 = (1..steps).map(|i| if i % 2 == 1 { 4.0 } else { 2.0 } * f(low + h * i as f64)).sum();
    h / 3.0 * (f(low) + inner + f(high))
}
