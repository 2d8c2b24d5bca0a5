//! The uniform distribution.

use super::error::ordered;
use super::{Prior, PriorError, PriorShape};

/// Uniform prior: p(x) = 1/(high − low) on [low, high], ends included.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Uniform {
    low: f64,
    high: f64,
}

impl Uniform {
    /// Registry key.
    pub const KEY: &'static str = "uniform";
    /// Names of the arguments.
    pub const ARGUMENTS: &'static [&'static str] = &["low", "high"];
    /// One line for help and manual.
    pub const SUMMARY: &'static str = "the same density everywhere between two bounds, zero outside";

    /// A uniform prior.
    ///
    /// # Errors
    /// Numbers that are not finite; low ≥ high, such as [2, 1].
    pub fn new(low: f64, high: f64) -> Result<Self, PriorError> {
        let (low, high) = ordered(Self::KEY, low, high)?;
        Ok(Self { low, high })
    }
}

impl Prior for Uniform {
    fn family(&self) -> &'static str {
        Self::KEY
    }
    fn arguments(&self) -> Vec<f64> {
        vec![self.low, self.high]
    }
    fn log_density(&self, x: f64) -> f64 {
        if x >= self.low && x <= self.high { -(self.high - self.low).ln() } else { f64::NEG_INFINITY }
    }
    fn cdf(&self, x: f64) -> f64 {
        ((x - self.low) / (self.high - self.low)).clamp(0.0, 1.0)
    }
    fn survival(&self, x: f64) -> f64 {
        ((self.high - x) / (self.high - self.low)).clamp(0.0, 1.0)
    }
    fn quantile(&self, p: f64) -> f64 {
        (self.low + p.clamp(0.0, 1.0) * (self.high - self.low)).min(self.high)
    }
    fn upper_quantile(&self, q: f64) -> f64 {
        (self.high - q.clamp(0.0, 1.0) * (self.high - self.low)).max(self.low)
    }
    fn support(&self) -> (f64, f64) {
        (self.low, self.high)
    }
    fn mean(&self) -> f64 {
        0.5 * (self.low + self.high)
    }
    fn standard_deviation(&self) -> f64 {
        (self.high - self.low) / 12f64.sqrt()
    }
    fn shape(&self) -> PriorShape {
        PriorShape::Flat { low: self.low, high: self.high }
    }
    fn curvature(&self, _x: f64) -> f64 {
        0.0
    }
}
