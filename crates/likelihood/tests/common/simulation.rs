//! Clean measurements to be judged: drawn from the very distribution that an expectation describes.

#![allow(dead_code, reason = "each test binary uses a part")]

use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::verdicts::{Comparison, Expectation};
use oddwell_likelihood::{NoiseChoice, SurveyLikelihood};
use rand::Rng;

use crate::common::{covariance, normal_matrix, normal_vector};

/// A survey's truth: what is expected, with which noise.
pub(crate) struct World {
    pub(crate) expectation: Expectation,
    pub(crate) covariance: DMatrix<f64>,
    root: DMatrix<f64>,
    prior_root: DMatrix<f64>,
    /// Mocks from which each analysis estimates the covariance; `None` where it knows it.
    pub(crate) mocks: Option<usize>,
}

impl World {
    /// `rows` rows of signal-to-noise about `strength` each, and parameters whose priors move the prediction by about
    /// `spread` standard deviations of the noise a row.
    pub(crate) fn new(
        rows: usize,
        strength: f64,
        parameters: usize,
        spread: f64,
        mocks: Option<usize>,
        generator: &mut impl Rng,
    ) -> Self {
        let covariance = covariance(rows, generator);
        let scales = covariance.diagonal().map(f64::sqrt);
        let prediction = normal_vector(rows, generator).component_mul(&scales) * strength;
        let mut jacobian = normal_matrix(rows, parameters, generator) * spread;
        for (mut row, scale) in jacobian.row_iter_mut().zip(scales.iter()) {
            row *= *scale;
        }
        let prior_root = DMatrix::from_fn(parameters, parameters, |i, j| match (i, j) {
            (i, j) if i == j => 1.0,
            (i, j) if i > j => 0.4,
            _ => 0.0,
        });
        let prior_covariance = &prior_root * prior_root.transpose();
        let root = covariance.clone().cholesky().unwrap().unpack();
        let expectation = Expectation { prediction, jacobian, prior_covariance };
        Self { expectation, covariance, root, prior_root, mocks }
    }

    pub(crate) fn rows(&self) -> usize {
        self.covariance.nrows()
    }

    /// Noise of this world.
    pub(crate) fn noise(&self, generator: &mut impl Rng) -> DVector<f64> {
        &self.root * normal_vector(self.rows(), generator)
    }

    /// What would be measured without noise, parameters drawn from their priors.
    pub(crate) fn signal(&self, generator: &mut impl Rng) -> DVector<f64> {
        let Expectation { prediction, jacobian, .. } = &self.expectation;
        let parameters = &self.prior_root * normal_vector(jacobian.ncols(), generator);
        prediction + jacobian * parameters
    }

    /// Measurements with parameters drawn from their priors.
    pub(crate) fn data(&self, generator: &mut impl Rng) -> DVector<f64> {
        self.signal(generator) + self.noise(generator)
    }

    /// What an analysis takes for the covariance.
    pub(crate) fn estimate(&self, generator: &mut impl Rng) -> DMatrix<f64> {
        match self.mocks {
            None => self.covariance.clone(),
            Some(mocks) => {
                let sample = normal_matrix(mocks, self.rows(), generator) * self.root.transpose();
                oddwell_likelihood::MockSet::new(sample, "mocks")
                    .unwrap()
                    .covariance()
                    .unwrap()
                    .matrix()
                    .clone()
            }
        }
    }

    /// A survey of given measurements.
    pub(crate) fn survey(&self, data: DVector<f64>, generator: &mut impl Rng) -> SurveyLikelihood {
        let noise = NoiseChoice::new("gaussian", self.mocks).unwrap();
        SurveyLikelihood::new(data, self.estimate(generator), &noise).unwrap()
    }

    /// Clean measurements beside what is expected.
    pub(crate) fn comparison(&self, generator: &mut impl Rng) -> Comparison {
        let data = self.data(generator);
        self.with(data, generator)
    }

    /// Given measurements beside what is expected.
    pub(crate) fn with(&self, data: DVector<f64>, generator: &mut impl Rng) -> Comparison {
        Comparison::of_survey(&self.survey(data, generator), &self.expectation).unwrap()
    }
}

/// Kolmogorov and Smirnov's largest distance of numbers from the uniform distribution, over 1.95/√N: below 1 for all but 1
/// in 1000 samples of one.
pub(crate) fn distance_from_uniform(mut sample: Vec<f64>) -> f64 {
    sample.sort_unstable_by(f64::total_cmp);
    let count = sample.len() as f64;
    let distance = |(i, p): (usize, &f64)| (p - i as f64 / count).max((i as f64 + 1.0) / count - p);
    sample.iter().enumerate().map(distance).fold(0.0, f64::max) * count.sqrt() / 1.95
}

/// How many of the numbers lie below a threshold.
pub(crate) fn share_below(sample: &[f64], threshold: f64) -> f64 {
    sample.iter().filter(|p| **p < threshold).count() as f64 / sample.len() as f64
}

/// The binomial error of a share.
pub(crate) fn binomial_error(share: f64, count: usize) -> f64 {
    (share * (1.0 - share) / count as f64).sqrt()
}
