//! The beta distribution.

use super::error::positive;
use super::special::invert_positive;
use super::{Prior, PriorError};
use statrs::function::beta::{beta_reg, ln_beta};

/// Beta prior: p(x) = x^(a−1) (1−x)^(b−1) / B(a, b) on [0, 1].
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Beta {
    a: f64,
    b: f64,
    ln_beta: f64,
}

impl Beta {
    /// Registry key.
    pub const KEY: &'static str = "beta";
    /// Names of the arguments.
    pub const ARGUMENTS: &'static [&'static str] = &["a", "b"];
    /// One line for help and manual.
    pub const SUMMARY: &'static str = "beta with these shape parameters, between 0 and 1";

    /// A beta prior.
    ///
    /// # Errors
    /// Numbers that are not finite; a ≤ 0 or b ≤ 0, such as [0, 1].
    pub fn new(a: f64, b: f64) -> Result<Self, PriorError> {
        let a = positive(Self::KEY, "a", a, "a flat density is [1, 1]")?;
        let b = positive(Self::KEY, "b", b, "a flat density is [1, 1]")?;
        Ok(Self { a, b, ln_beta: ln_beta(a, b) })
    }

    /// (exponent) · ln(base) with 0 · ln 0 = 0.
    fn power(exponent: f64, ln_base: f64) -> f64 {
        if exponent == 0.0 { 0.0 } else { exponent * ln_base }
    }

    /// Quantile of `p` ≤ ½ or so for shape (a, b); the caller swaps for the upper tail.
    fn lower(&self, p: f64, a: f64, b: f64) -> f64 {
        if p <= 0.0 {
            return 0.0;
        }
        if p >= 1.0 {
            return 1.0;
        }
        let density =
            |x: f64| (Self::power(a - 1.0, x.ln()) + Self::power(b - 1.0, (-x).ln_1p()) - self.ln_beta).exp();
        let middle = (a / (a + b)).clamp(1e-300, 1.0 - 1e-15);
        invert_positive(|x| beta_reg(a, b, x), density, p, (0.5 * middle, 0.5 + 0.5 * middle), 1.0)
    }
}

impl Prior for Beta {
    fn family(&self) -> &'static str {
        Self::KEY
    }
    fn arguments(&self) -> Vec<f64> {
        vec![self.a, self.b]
    }
    fn log_density(&self, x: f64) -> f64 {
        if !(0.0..=1.0).contains(&x) {
            return f64::NEG_INFINITY;
        }
        let value =
            Self::power(self.a - 1.0, x.ln()) + Self::power(self.b - 1.0, (-x).ln_1p()) - self.ln_beta;
        if value == f64::INFINITY { f64::NEG_INFINITY } else { value }
    }
    fn cdf(&self, x: f64) -> f64 {
        if x <= 0.0 {
            0.0
        } else if x >= 1.0 {
            1.0
        } else {
            beta_reg(self.a, self.b, x)
        }
    }
    fn survival(&self, x: f64) -> f64 {
        if x <= 0.0 {
            1.0
        } else if x >= 1.0 {
            0.0
        } else {
            beta_reg(self.b, self.a, 1.0 - x)
        }
    }
    fn quantile(&self, p: f64) -> f64 {
        self.lower(p, self.a, self.b)
    }
    fn upper_quantile(&self, q: f64) -> f64 {
        1.0 - self.lower(q, self.b, self.a)
    }
    fn support(&self) -> (f64, f64) {
        (0.0, 1.0)
    }
    fn mean(&self) -> f64 {
        self.a / (self.a + self.b)
    }
    fn standard_deviation(&self) -> f64 {
        let sum = self.a + self.b;
        (self.a * self.b / (sum + 1.0)).sqrt() / sum
    }
    fn curvature(&self, x: f64) -> f64 {
        (self.a - 1.0) / (x * x) + (self.b - 1.0) / ((1.0 - x) * (1.0 - x))
    }
}
