//! Gaussian noise with the estimated covariance inflated so that its inverse is unbiased.

use std::f64::consts::TAU;
use std::sync::Arc;

use super::{NoiseFamily, NoiseModel};

pub(super) const FAMILY: NoiseFamily = NoiseFamily {
    name: "hartlap",
    summary: "normal, with the inverse of a mock covariance made unbiased (does not restore coverage)",
    needs_mocks: true,
    build: |inputs| {
        let mocks = inputs.mocks("hartlap", 3)? as f64;
        let rows = inputs.rows as f64;
        let inflation = (mocks - 1.0) / (mocks - rows - 2.0);
        let constant = -0.5 * (rows * (TAU * inflation).ln() + inputs.log_determinant);
        Ok(Arc::new(Hartlap { shrink: inflation.recip(), constant }))
    },
};

/// C → C (n_s − 1)/(n_s − n_d − 2), in χ² and in the determinant; n_s > n_d + 2.
///
/// Hartlap, Simon & Schneider 2007, A&A 464, 399, Eq. 17. It makes the expectation of the
/// inverse right; the scatter of the estimate still widens the true error beyond what the posterior shows.
#[derive(Debug)]
struct Hartlap {
    /// (n_s − n_d − 2)/(n_s − 1), below 1.
    shrink: f64,
    constant: f64,
}

impl NoiseModel for Hartlap {
    fn name(&self) -> &'static str {
        FAMILY.name
    }

    fn log_likelihood(&self, chi_squared: f64) -> f64 {
        self.constant - 0.5 * self.shrink * chi_squared
    }

    fn weight(&self, _chi_squared: f64) -> f64 {
        self.shrink
    }
}
