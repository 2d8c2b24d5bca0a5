//! The gamma distribution.

use super::error::positive;
use super::special::invert_positive;
use super::{Prior, PriorError};
use rand::Rng;
use rand_distr::Distribution;
use statrs::function::gamma::{gamma_lr, gamma_ur, ln_gamma};

/// Gamma prior: p(x) = (x/θ)^(k−1) e^(−x/θ) / (θ Γ(k)) for x ≥ 0, shape k and scale θ.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Gamma {
    shape: f64,
    scale: f64,
    constant: f64,
}

impl Gamma {
    /// Registry key.
    pub const KEY: &'static str = "gamma";
    /// Names of the arguments.
    pub const ARGUMENTS: &'static [&'static str] = &["shape", "scale"];
    /// One line for help and manual.
    pub const SUMMARY: &'static str = "gamma with this shape and scale (mean = shape × scale), above 0";

    /// A gamma prior.
    ///
    /// # Errors
    /// Numbers that are not finite; shape ≤ 0 or scale ≤ 0, such as [2, 0].
    pub fn new(shape: f64, scale: f64) -> Result<Self, PriorError> {
        let shape = positive(Self::KEY, "shape", shape, "an exponential density is [1, scale]")?;
        let scale = positive(Self::KEY, "scale", scale, "the mean is shape × scale")?;
        Ok(Self { shape, scale, constant: -ln_gamma(shape) - scale.ln() })
    }

    fn unit_density(&self, y: f64) -> f64 {
        ((self.shape - 1.0) * y.ln() - y - ln_gamma(self.shape)).exp()
    }

    fn bracket(&self) -> (f64, f64) {
        (0.5 * self.shape, 2.0 * self.shape + 1.0)
    }
}

impl Prior for Gamma {
    fn family(&self) -> &'static str {
        Self::KEY
    }
    fn arguments(&self) -> Vec<f64> {
        vec![self.shape, self.scale]
    }
    fn log_density(&self, x: f64) -> f64 {
        if x.is_nan() || x < 0.0 || x == f64::INFINITY {
            return f64::NEG_INFINITY;
        }
        let y = x / self.scale;
        let power = if self.shape == 1.0 { 0.0 } else { (self.shape - 1.0) * y.ln() };
        let value = self.constant + power - y;
        if value == f64::INFINITY { f64::NEG_INFINITY } else { value }
    }
    fn cdf(&self, x: f64) -> f64 {
        if x <= 0.0 {
            0.0
        } else if x == f64::INFINITY {
            1.0
        } else {
            gamma_lr(self.shape, x / self.scale)
        }
    }
    fn survival(&self, x: f64) -> f64 {
        if x <= 0.0 {
            1.0
        } else if x == f64::INFINITY {
            0.0
        } else {
            gamma_ur(self.shape, x / self.scale)
        }
    }
    fn quantile(&self, p: f64) -> f64 {
        if p <= 0.0 {
            return 0.0;
        }
        if p >= 1.0 {
            return f64::INFINITY;
        }
        let lower = |y: f64| gamma_lr(self.shape, y);
        self.scale * invert_positive(lower, |y| self.unit_density(y), p, self.bracket(), 1e300)
    }
    fn upper_quantile(&self, q: f64) -> f64 {
        if q <= 0.0 {
            return f64::INFINITY;
        }
        if q >= 1.0 {
            return 0.0;
        }
        let upper = |y: f64| gamma_ur(self.shape, y);
        self.scale * invert_positive(upper, |y| -self.unit_density(y), q, self.bracket(), 1e300)
    }
    fn support(&self) -> (f64, f64) {
        (0.0, f64::INFINITY)
    }
    fn mean(&self) -> f64 {
        self.shape * self.scale
    }
    fn standard_deviation(&self) -> f64 {
        self.shape.sqrt() * self.scale
    }
    fn curvature(&self, x: f64) -> f64 {
        (self.shape - 1.0) / (x * x)
    }
    fn sample(&self, rng: &mut dyn Rng) -> f64 {
        match rand_distr::Gamma::new(self.shape, self.scale) {
            Ok(gamma) => gamma.sample(rng),
            Err(_) => self.mean(),
        }
    }
}
