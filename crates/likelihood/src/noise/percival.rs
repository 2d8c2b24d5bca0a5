//! The t-like likelihood whose intervals cover as frequentist ones do.

use std::f64::consts::PI;
use std::sync::Arc;

use statrs::function::gamma::ln_gamma;

use super::{NoiseError, NoiseFamily, NoiseModel};

pub(super) const FAMILY: NoiseFamily = NoiseFamily {
    name: "percival",
    summary: "t-like, with the exponent that makes intervals cover for a mock covariance",
    needs_mocks: true,
    build: |inputs| {
        let mocks = inputs.mocks("percival", 5)? as f64;
        let determined = inputs.determined.ok_or(NoiseError::NeedsDetermined { name: "percival" })?;
        if determined > inputs.rows {
            let rows = inputs.rows;
            return Err(NoiseError::TooManyDetermined { name: "percival", determined, rows });
        }
        let rows = inputs.rows as f64;
        let exponent = exponent(mocks, rows, determined as f64);
        let constant = (exponent > rows).then(|| {
            ln_gamma(0.5 * exponent)
                - ln_gamma(0.5 * (exponent - rows))
                - 0.5 * rows * (PI * (mocks - 1.0)).ln()
                - 0.5 * inputs.log_determinant
        });
        Ok(Arc::new(Percival { mocks, exponent, constant }))
    },
};

/// p = n_θ + 2 + (n_s − 1 + B(n_d−n_θ))/(1 + B(n_d−n_θ)), B = (n_s−n_d−2)/((n_s−n_d−1)(n_s−n_d−4)).
fn exponent(mocks: f64, rows: f64, determined: f64) -> f64 {
    let spare = mocks - rows;
    let spread = (spare - 2.0) / ((spare - 1.0) * (spare - 4.0)) * (rows - determined);
    determined + 2.0 + (mocks - 1.0 + spread) / (1.0 + spread)
}

/// ln L = const − (p/2) ln[1 + χ²/(n_s−1)]; n_s > n_d + 4, n_θ ≤ n_d.
///
/// Percival, Friedrich, Sellentin & Heavens 2022, MNRAS 510, 3207. For p > n_d the constant is that of a
/// density, lnΓ(p/2) − lnΓ((p−n_d)/2) − (n_d/2) ln[π(n_s−1)] − ½ ln det C; else no density has this form and the
/// constant is left out.
#[derive(Debug)]
struct Percival {
    mocks: f64,
    exponent: f64,
    constant: Option<f64>,
}

impl NoiseModel for Percival {
    fn name(&self) -> &'static str {
        FAMILY.name
    }

    fn log_likelihood(&self, chi_squared: f64) -> f64 {
        let shape = 0.5 * self.exponent * (chi_squared / (self.mocks - 1.0)).ln_1p();
        self.constant.unwrap_or_default() - shape
    }

    fn weight(&self, chi_squared: f64) -> f64 {
        self.exponent / (self.mocks - 1.0 + chi_squared)
    }

    fn is_normalised(&self) -> bool {
        self.constant.is_some()
    }
}
