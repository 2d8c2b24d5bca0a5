//! The normal distribution.

use super::error::{finite, positive};
use super::special::{LN_SQRT_TWO_PI, normal_cdf, normal_quantile};
use super::{Prior, PriorError, PriorShape};
use rand::Rng;
use rand_distr::{Distribution, StandardNormal};

/// Normal prior: p(x) = exp(−z²/2) / (σ√(2π)), z = (x − μ)/σ.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Normal {
    mean: f64,
    sd: f64,
    constant: f64,
}

impl Normal {
    /// Registry key.
    pub const KEY: &'static str = "normal";
    /// Names of the arguments.
    pub const ARGUMENTS: &'static [&'static str] = &["mean", "sd"];
    /// One line for help and manual.
    pub const SUMMARY: &'static str = "normal with this mean and standard deviation";

    /// A normal prior.
    ///
    /// # Errors
    /// Numbers that are not finite; `sd` ≤ 0, such as −1.
    pub fn new(mean: f64, sd: f64) -> Result<Self, PriorError> {
        let mean = finite(Self::KEY, "mean", mean)?;
        let sd = positive(Self::KEY, "sd", sd, "to hold the quantity, give a plain number")?;
        Ok(Self { mean, sd, constant: -LN_SQRT_TWO_PI - sd.ln() })
    }
}

impl Prior for Normal {
    fn family(&self) -> &'static str {
        Self::KEY
    }
    fn arguments(&self) -> Vec<f64> {
        vec![self.mean, self.sd]
    }
    fn log_density(&self, x: f64) -> f64 {
        let z = (x - self.mean) / self.sd;
        self.constant - 0.5 * z * z
    }
    fn cdf(&self, x: f64) -> f64 {
        normal_cdf((x - self.mean) / self.sd)
    }
    fn survival(&self, x: f64) -> f64 {
        normal_cdf((self.mean - x) / self.sd)
    }
    fn quantile(&self, p: f64) -> f64 {
        self.mean + self.sd * normal_quantile(p)
    }
    fn upper_quantile(&self, q: f64) -> f64 {
        self.mean - self.sd * normal_quantile(q)
    }
    fn support(&self) -> (f64, f64) {
        (f64::NEG_INFINITY, f64::INFINITY)
    }
    fn mean(&self) -> f64 {
        self.mean
    }
    fn standard_deviation(&self) -> f64 {
        self.sd
    }
    fn shape(&self) -> PriorShape {
        PriorShape::Normal { mean: self.mean, sd: self.sd }
    }
    fn curvature(&self, _x: f64) -> f64 {
        self.sd.powi(-2)
    }
    fn sample(&self, rng: &mut dyn Rng) -> f64 {
        let z: f64 = StandardNormal.sample(rng);
        self.mean + self.sd * z
    }
}
