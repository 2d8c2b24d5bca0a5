//! Gaussian noise with a covariance that is known.

use std::f64::consts::TAU;
use std::sync::Arc;

use super::{NoiseFamily, NoiseModel};

pub(super) const FAMILY: NoiseFamily = NoiseFamily {
    name: "gaussian",
    summary: "normal, with the covariance taken as known",
    needs_mocks: false,
    build: |inputs| {
        let constant = -0.5 * (inputs.rows as f64 * TAU.ln() + inputs.log_determinant);
        Ok(Arc::new(Gaussian { constant }))
    },
};

/// ln L = −½ χ² − ½ ln det(2πC).
#[derive(Debug)]
struct Gaussian {
    constant: f64,
}

impl NoiseModel for Gaussian {
    fn name(&self) -> &'static str {
        FAMILY.name
    }

    fn log_likelihood(&self, chi_squared: f64) -> f64 {
        self.constant - 0.5 * chi_squared
    }

    fn weight(&self, _chi_squared: f64) -> f64 {
        1.0
    }
}
