//! The log-uniform (reciprocal) distribution.

use super::error::{ordered, positive};
use super::{Prior, PriorError};

/// Log-uniform prior: p(x) = 1 / (x ln(high/low)) on [low, high], 0 < low.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LogUniform {
    low: f64,
    high: f64,
    ln_ratio: f64,
}

impl LogUniform {
    /// Registry key.
    pub const KEY: &'static str = "log_uniform";
    /// Names of the arguments.
    pub const ARGUMENTS: &'static [&'static str] = &["low", "high"];
    /// One line for help and manual.
    pub const SUMMARY: &'static str =
        "the same density of the logarithm everywhere between two positive bounds";

    /// A log-uniform prior.
    ///
    /// # Errors
    /// Numbers that are not finite; low ≥ high; low ≤ 0, such as [0, 1].
    pub fn new(low: f64, high: f64) -> Result<Self, PriorError> {
        let (low, high) = ordered(Self::KEY, low, high)?;
        positive(Self::KEY, "low", low, "a logarithm needs positive bounds; `uniform` takes any")?;
        Ok(Self { low, high, ln_ratio: ((high - low) / low).ln_1p() })
    }
}

impl Prior for LogUniform {
    fn family(&self) -> &'static str {
        Self::KEY
    }
    fn arguments(&self) -> Vec<f64> {
        vec![self.low, self.high]
    }
    fn log_density(&self, x: f64) -> f64 {
        if x >= self.low && x <= self.high { -x.ln() - self.ln_ratio.ln() } else { f64::NEG_INFINITY }
    }
    fn cdf(&self, x: f64) -> f64 {
        if x <= self.low {
            return 0.0;
        }
        (((x - self.low) / self.low).ln_1p() / self.ln_ratio).min(1.0)
    }
    fn survival(&self, x: f64) -> f64 {
        if x >= self.high {
            return 0.0;
        }
        if x <= self.low {
            return 1.0;
        }
        (((self.high - x) / x).ln_1p() / self.ln_ratio).min(1.0)
    }
    fn quantile(&self, p: f64) -> f64 {
        (self.low * (p.clamp(0.0, 1.0) * self.ln_ratio).exp()).clamp(self.low, self.high)
    }
    fn upper_quantile(&self, q: f64) -> f64 {
        (self.high * (-q.clamp(0.0, 1.0) * self.ln_ratio).exp()).clamp(self.low, self.high)
    }
    fn support(&self) -> (f64, f64) {
        (self.low, self.high)
    }
    fn mean(&self) -> f64 {
        (self.high - self.low) / self.ln_ratio
    }
    /// mean · √(y coth y − 1), y = ln(high/low)/2: the textbook difference of squares loses all digits for close bounds.
    fn standard_deviation(&self) -> f64 {
        let y = 0.5 * self.ln_ratio;
        let excess = if y < 0.05 {
            let y2 = y * y;
            y2 / 3.0 * (1.0 - y2 / 15.0 * (1.0 - y2 * 2.0 / 21.0))
        } else {
            y / y.tanh() - 1.0
        };
        self.mean() * excess.sqrt()
    }
    fn curvature(&self, x: f64) -> f64 {
        -1.0 / (x * x)
    }
}
