//! Targets whose moments are known in closed form.
#![allow(
    dead_code,
    unreachable_pub,
    clippy::unwrap_used,
    reason = "test helpers, of which each test binary uses a part"
)]

use nalgebra::{Cholesky, DMatrix, DVector};
use oddwell_sampler::{EvaluationFailure, PriorSet, Target, build_prior};
use rand::{RngExt, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;

/// A target made of a prior set and a likelihood without working memory.
pub struct Simple<F> {
    pub priors: PriorSet,
    pub likelihood: F,
}

impl<F: Fn(&[f64]) -> f64 + Sync> Target for Simple<F> {
    type Scratch = ();
    fn dimension(&self) -> usize {
        self.priors.dimension()
    }
    fn scratch(&self) {}
    fn log_prior(&self, point: &[f64]) -> f64 {
        self.priors.log_density(point)
    }
    fn log_likelihood(&self, point: &[f64], _: &mut ()) -> Result<f64, EvaluationFailure> {
        Ok((self.likelihood)(point))
    }
}

/// The same uniform prior in every dimension.
pub fn flat(dimension: usize, low: f64, high: f64) -> PriorSet {
    PriorSet::from_independent(
        (0..dimension).map(|_| build_prior("uniform", &[low, high], None).unwrap()).collect(),
    )
}

/// A normal density of given condition number with a random orientation.
pub struct Gaussian {
    pub mean: DVector<f64>,
    pub covariance: DMatrix<f64>,
    whitening: Vec<f64>,
}

impl Gaussian {
    /// Variances of the principal axes rise geometrically from 1/condition to 1; axes from the QR decomposition of
    /// random numbers; means between −3 and 3.
    pub fn new(dimension: usize, condition: f64, seed: u64) -> Self {
        let mut random = Xoshiro256PlusPlus::seed_from_u64(seed);
        let noise = DMatrix::from_fn(dimension, dimension, |_, _| random.random::<f64>() - 0.5);
        let axes = noise.qr().q();
        let last = (dimension - 1).max(1) as f64;
        let variances = DVector::from_fn(dimension, |i, _| condition.powf(i as f64 / last - 1.0));
        let covariance = &axes * DMatrix::from_diagonal(&variances) * axes.transpose();
        let covariance = 0.5 * (&covariance + covariance.transpose());
        let mean = DVector::from_fn(dimension, |_, _| 6.0 * random.random::<f64>() - 3.0);
        let lower = Cholesky::new(covariance.clone()).unwrap().l();
        let inverse = lower.solve_lower_triangular(&DMatrix::identity(dimension, dimension)).unwrap();
        let mut whitening = vec![];
        for row in 0..dimension {
            whitening.extend((0..=row).map(|column| inverse[(row, column)]));
        }
        Self { mean, covariance, whitening }
    }

    /// −½ (x−μ)ᵀ C⁻¹ (x−μ).
    pub fn log_density(&self, x: &[f64]) -> f64 {
        let (mut squares, mut from) = (0.0, 0);
        for row in 0..x.len() {
            let weights = &self.whitening[from..=from + row];
            let whitened: f64 =
                weights.iter().zip(x).zip(self.mean.iter()).map(|((w, x), m)| w * (x - m)).sum();
            squares += whitened * whitened;
            from += row + 1;
        }
        -0.5 * squares
    }
}

/// Log density of Rosenbrock's function: x normal of mean 1 and variance 10, y normal about x² with variance 0.1. Then
/// ⟨y⟩ = 11 and Var y = 0.1 + 4·10 + 2·10² = 240.1.
pub fn rosenbrock(point: &[f64]) -> f64 {
    let (x, y) = (point[0], point[1]);
    -((x - 1.0) * (x - 1.0) / 20.0) - 5.0 * (y - x * x) * (y - x * x)
}
