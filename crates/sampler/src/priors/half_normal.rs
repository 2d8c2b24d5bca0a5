//! The half-normal distribution.

use super::error::positive;
use super::special::{LN_SQRT_TWO_PI, normal_cdf, normal_quantile};
use super::{Prior, PriorError};
use rand::Rng;
use rand_distr::{Distribution, StandardNormal};
use std::f64::consts::{LN_2, PI};

/// Half-normal prior: the absolute value of a normal of mean zero; p(x) = 2 exp(−x²/2σ²) / (σ√(2π)) for x ≥ 0.
///
/// `sd` is that of the normal, not of its absolute value (which is sd·√(1 − 2/π)).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct HalfNormal {
    sd: f64,
    constant: f64,
}

impl HalfNormal {
    /// Registry key.
    pub const KEY: &'static str = "half_normal";
    /// Names of the arguments.
    pub const ARGUMENTS: &'static [&'static str] = &["sd"];
    /// One line for help and manual.
    pub const SUMMARY: &'static str = "absolute value of a normal of mean zero and this standard deviation";

    /// A half-normal prior.
    ///
    /// # Errors
    /// An `sd` that is not finite, or ≤ 0, such as 0.
    pub fn new(sd: f64) -> Result<Self, PriorError> {
        let sd = positive(Self::KEY, "sd", sd, "to hold the quantity, give a plain number")?;
        Ok(Self { sd, constant: LN_2 - LN_SQRT_TWO_PI - sd.ln() })
    }
}

impl Prior for HalfNormal {
    fn family(&self) -> &'static str {
        Self::KEY
    }
    fn arguments(&self) -> Vec<f64> {
        vec![self.sd]
    }
    fn log_density(&self, x: f64) -> f64 {
        let z = x / self.sd;
        if x >= 0.0 { self.constant - 0.5 * z * z } else { f64::NEG_INFINITY }
    }
    fn cdf(&self, x: f64) -> f64 {
        if x <= 0.0 { 0.0 } else { libm::erf(x / self.sd * std::f64::consts::FRAC_1_SQRT_2) }
    }
    fn survival(&self, x: f64) -> f64 {
        if x <= 0.0 { 1.0 } else { 2.0 * normal_cdf(-x / self.sd) }
    }
    fn quantile(&self, p: f64) -> f64 {
        if p < 0.5 {
            (self.sd * std::f64::consts::SQRT_2 * statrs::function::erf::erf_inv(p.max(0.0))).max(0.0)
        } else {
            self.upper_quantile(1.0 - p)
        }
    }
    fn upper_quantile(&self, q: f64) -> f64 {
        if q > 0.5 { self.quantile(1.0 - q.min(1.0)) } else { -self.sd * normal_quantile(0.5 * q) }
    }
    fn support(&self) -> (f64, f64) {
        (0.0, f64::INFINITY)
    }
    fn mean(&self) -> f64 {
        self.sd * (2.0 / PI).sqrt()
    }
    fn standard_deviation(&self) -> f64 {
        self.sd * (1.0 - 2.0 / PI).sqrt()
    }
    fn curvature(&self, _x: f64) -> f64 {
        self.sd.powi(-2)
    }
    fn sample(&self, rng: &mut dyn Rng) -> f64 {
        let z: f64 = StandardNormal.sample(rng);
        self.sd * z.abs()
    }
}
