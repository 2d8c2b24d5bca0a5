//! Student's t distribution.

use super::error::{finite, positive};
use super::special::invert_positive;
use super::{Prior, PriorError};
use statrs::function::beta::beta_reg;
use statrs::function::gamma::ln_gamma;
use std::f64::consts::PI;

/// Student t prior: p(x) ∝ (1 + z²/ν)^(−(ν+1)/2), z = (x − μ)/scale, ν degrees of freedom.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StudentT {
    mean: f64,
    scale: f64,
    dof: f64,
    constant: f64,
}

impl StudentT {
    /// Registry key.
    pub const KEY: &'static str = "student_t";
    /// Names of the arguments.
    pub const ARGUMENTS: &'static [&'static str] = &["mean", "scale", "dof"];
    /// One line for help and manual.
    pub const SUMMARY: &'static str = "Student t with this centre, scale and degrees of freedom: heavy tails";

    /// A Student t prior.
    ///
    /// # Errors
    /// Numbers that are not finite; scale ≤ 0 or dof ≤ 0, such as [0, 1, 0].
    pub fn new(mean: f64, scale: f64, dof: f64) -> Result<Self, PriorError> {
        let mean = finite(Self::KEY, "mean", mean)?;
        let scale = positive(Self::KEY, "scale", scale, "to hold the quantity, give a plain number")?;
        let dof = positive(Self::KEY, "dof", dof, "from 3 on, the standard deviation exists")?;
        let constant = ln_gamma(0.5 * (dof + 1.0)) - ln_gamma(0.5 * dof) - 0.5 * (dof * PI).ln() - scale.ln();
        Ok(Self { mean, scale, dof, constant })
    }

    /// Probability beyond `z` ≥ 0 on one side, in units of the scale.
    fn tail(&self, z: f64) -> f64 {
        let z2 = z * z;
        if z2 < self.dof {
            0.5 * (1.0 - beta_reg(0.5, 0.5 * self.dof, z2 / (self.dof + z2)))
        } else if z2 == f64::INFINITY {
            0.0
        } else {
            0.5 * beta_reg(0.5 * self.dof, 0.5, self.dof / (self.dof + z2))
        }
    }

    /// Distance from the centre, in units of the scale, beyond which one side holds `q` ≤ ½.
    fn tail_quantile(&self, q: f64) -> f64 {
        if q <= 0.0 {
            return f64::INFINITY;
        }
        if q >= 0.5 {
            return 0.0;
        }
        let density = |z: f64| -(self.scale * self.log_density(self.mean + self.scale * z).exp());
        invert_positive(|z| self.tail(z), density, q, (0.5, 2.0), 1e300)
    }
}

impl Prior for StudentT {
    fn family(&self) -> &'static str {
        Self::KEY
    }
    fn arguments(&self) -> Vec<f64> {
        vec![self.mean, self.scale, self.dof]
    }
    fn log_density(&self, x: f64) -> f64 {
        let z = (x - self.mean) / self.scale;
        self.constant - 0.5 * (self.dof + 1.0) * (z * z / self.dof).ln_1p()
    }
    fn cdf(&self, x: f64) -> f64 {
        let z = (x - self.mean) / self.scale;
        if z < 0.0 { self.tail(-z) } else { 1.0 - self.tail(z) }
    }
    fn survival(&self, x: f64) -> f64 {
        let z = (x - self.mean) / self.scale;
        if z < 0.0 { 1.0 - self.tail(-z) } else { self.tail(z) }
    }
    fn quantile(&self, p: f64) -> f64 {
        let z = if p < 0.5 { -self.tail_quantile(p) } else { self.tail_quantile(1.0 - p) };
        self.mean + self.scale * z
    }
    fn upper_quantile(&self, q: f64) -> f64 {
        let z = if q < 0.5 { self.tail_quantile(q) } else { -self.tail_quantile(1.0 - q) };
        self.mean + self.scale * z
    }
    fn support(&self) -> (f64, f64) {
        (f64::NEG_INFINITY, f64::INFINITY)
    }
    fn mean(&self) -> f64 {
        if self.dof > 1.0 { self.mean } else { f64::NAN }
    }
    fn standard_deviation(&self) -> f64 {
        if self.dof > 2.0 { self.scale * (self.dof / (self.dof - 2.0)).sqrt() } else { f64::INFINITY }
    }
    fn curvature(&self, x: f64) -> f64 {
        let z = (x - self.mean) / self.scale;
        let u = z * z / self.dof;
        (self.dof + 1.0) / (self.dof * self.scale * self.scale) * (1.0 - u) / ((1.0 + u) * (1.0 + u))
    }
    fn median(&self) -> f64 {
        self.mean
    }
}
