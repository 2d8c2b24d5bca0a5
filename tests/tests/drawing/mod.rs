//! Measurements of a study drawn again and again in memory: a truth from the priors, noise with the study's covariances.

#![allow(
    dead_code,
    clippy::unwrap_used,
    clippy::panic,
    reason = "a test stops at the first surprise, and each uses a part"
)]

use nalgebra::{DMatrix, DVector};
use oddwell_sampler::Target;
use oddwell_study::assemble::{Measurements, Posterior, PosteriorScratch, read_measurements};
use oddwell_study::{Hypothesis, Study};
use rand::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use rand_xoshiro::Xoshiro256PlusPlus;

/// Draws measurements.
pub(crate) struct Drawing {
    measurements: Measurements,
    posterior: Posterior,
    scratch: PosteriorScratch,
    factors: Vec<DMatrix<f64>>,
    pub(crate) random: Xoshiro256PlusPlus,
}

impl Drawing {
    /// From a hypothesis of a study.
    pub(crate) fn new(study: &Study, hypothesis: &Hypothesis, seed: u64) -> Drawing {
        let measurements = read_measurements(study).unwrap();
        let posterior = Posterior::new(study, hypothesis, &measurements).unwrap();
        let factor = |covariance: &DMatrix<f64>| covariance.clone().cholesky().unwrap().unpack();
        let groups = measurements.groups.iter();
        let factors = groups.map(|group| factor(group.likelihood.covariance().matrix())).collect();
        let scratch = posterior.scratch();
        let random = Xoshiro256PlusPlus::seed_from_u64(seed);
        Drawing { measurements, posterior, scratch, factors, random }
    }

    /// The names of the hypothesis's parameters.
    pub(crate) fn names(&self) -> &[String] {
        self.posterior.map.names()
    }

    /// A truth from the priors, and measurements of it.
    pub(crate) fn draw(&mut self) -> (Vec<f64>, Measurements) {
        let mut truth = vec![0.0; self.posterior.dimension()];
        self.posterior.priors.sample(&mut self.random, &mut truth);
        let mut data = self.posterior.predict(&truth, &mut self.scratch).unwrap();
        let mut first = 0;
        for factor in &self.factors {
            let normals = DVector::from_fn(factor.nrows(), |_, _| StandardNormal.sample(&mut self.random));
            let noise = factor * normals;
            data[first..].iter_mut().zip(noise.iter()).for_each(|(value, noise)| *value += noise);
            first += factor.nrows();
        }
        (truth, self.measurements.with_values(&data))
    }
}
