//! The multivariate t density that follows when the true covariance is integrated out.

use std::f64::consts::PI;
use std::sync::Arc;

use statrs::function::gamma::ln_gamma;

use super::{NoiseFamily, NoiseModel};

pub(super) const FAMILY: NoiseFamily = NoiseFamily {
    name: "t",
    summary: "multivariate t: a mock covariance with its own uncertainty integrated out",
    needs_mocks: true,
    build: |inputs| {
        let mocks = inputs.mocks("t", 1)? as f64;
        let rows = inputs.rows as f64;
        let constant = ln_gamma(0.5 * mocks)
            - ln_gamma(0.5 * (mocks - rows))
            - 0.5 * rows * (PI * (mocks - 1.0)).ln()
            - 0.5 * inputs.log_determinant;
        Ok(Arc::new(StudentT { mocks, constant }))
    },
};

/// ln L = lnΓ(n_s/2) − lnΓ((n_s−n_d)/2) − (n_d/2) ln[π(n_s−1)] − ½ ln det C − (n_s/2) ln[1 + χ²/(n_s−1)], n_s > n_d.
///
/// Sellentin & Heavens 2016, MNRAS 456, L132, Eq. 12: a multivariate t with n_s − n_d degrees of freedom and shape
/// C (n_s − 1)/(n_s − n_d).
#[derive(Debug)]
struct StudentT {
    mocks: f64,
    constant: f64,
}

impl NoiseModel for StudentT {
    fn name(&self) -> &'static str {
        FAMILY.name
    }

    fn log_likelihood(&self, chi_squared: f64) -> f64 {
        self.constant - 0.5 * self.mocks * (chi_squared / (self.mocks - 1.0)).ln_1p()
    }

    fn weight(&self, chi_squared: f64) -> f64 {
        self.mocks / (self.mocks - 1.0 + chi_squared)
    }
}
