//! Whether the noise is normal.

use statrs::distribution::{ContinuousCDF, Normal};

use super::comparison::{Comparison, VerdictError};
use super::deviate::deviate_of_t;

/// Anderson and Darling's test of a normal distribution, mean and variance unknown.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Normality {
    /// A².
    pub statistic: f64,
    /// The probability of an A² at least this large; to about 10 % of itself between 10⁻⁶ and 0.5.
    pub p_value: f64,
    /// How many numbers were tested.
    pub count: usize,
}

/// The residuals d − p as independent numbers, standard normal for sound data.
///
/// z = L⁻¹(d − p), N + JΣJᵀ = L Lᵀ. Where the covariance comes from n mocks, z_i given z_1 … z_(i−1) is not normal: by
/// Bartlett's decomposition, z_i √[(n − i)/(n − 1)] / √(1 + Σ_(j<i) z_j²/(n − 1)) follows Student's t with n − i degrees of
/// freedom, whatever the true covariance, and is replaced by the normal deviate of the same tail. Exact where JΣJᵀ vanishes.
///
/// # Errors
/// A covariance that is not definite; no more (effective) mocks than rows.
pub fn whitened_residuals(comparison: &Comparison) -> Result<Vec<f64>, VerdictError> {
    let factored = comparison.factored()?;
    let mut residuals = factored.whiten(&comparison.residual());
    if let Some(mocks) = factored.mocks {
        // Half a mock more than none, since an effective number is rounded.
        if mocks < residuals.len() as f64 + 0.5 {
            let (least, mocks) = (residuals.len(), mocks.round() as usize);
            return Err(VerdictError::TooFewMocks { what: "a test of residuals", least, mocks });
        }
        let mut before = 0.0;
        for (index, residual) in residuals.iter_mut().enumerate() {
            let degrees = mocks - (index + 1) as f64;
            let scale = (1.0 + before / (mocks - 1.0)).sqrt() * ((mocks - 1.0) / degrees).sqrt();
            before += *residual * *residual;
            *residual = deviate_of_t(*residual / scale, degrees);
        }
    }
    Ok(residuals)
}

/// Tests the whitened residuals of a comparison for normality: for their shape, not for their size, which is χ²'s to
/// judge. `None` for fewer than eight rows.
///
/// # Errors
/// As [`whitened_residuals`].
pub fn normality(comparison: &Comparison) -> Result<Option<Normality>, VerdictError> {
    Ok(anderson_darling(&whitened_residuals(comparison)?))
}

/// Anderson and Darling's A² for a normal distribution whose mean and variance are estimated from the numbers themselves:
///
///   A² = −n − Σ_i (2i − 1)/n [ln Φ(y_i) + ln(1 − Φ(y_(n+1−i)))],  y sorted, of mean 0 and variance 1 (divisor n − 1).
///
/// p-value of A²(1 + 0.75/n + 2.25/n²) by Stephens' fit, in D'Agostino & Stephens 1986, Goodness-of-Fit Techniques, Table
/// 4.9. `None` for fewer than eight numbers, for which that does not hold, or where all are the same.
pub fn anderson_darling(numbers: &[f64]) -> Option<Normality> {
    let count = numbers.len();
    if count < 8 {
        return None;
    }
    let n = count as f64;
    let mean = numbers.iter().sum::<f64>() / n;
    let variance = numbers.iter().map(|x| (x - mean).powi(2)).sum::<f64>() / (n - 1.0);
    if !(variance > 0.0 && variance.is_finite()) {
        return None;
    }
    let mut sorted: Vec<f64> = numbers.iter().map(|x| (x - mean) / variance.sqrt()).collect();
    sorted.sort_unstable_by(f64::total_cmp);
    let normal = Normal::standard();
    let term = |i: usize| {
        let weight = (2 * i + 1) as f64 / n;
        // Far out a tail probability is 0 in doubles: its logarithm is then that of the smallest number.
        let log = |p: f64| p.max(f64::MIN_POSITIVE).ln();
        weight * (log(normal.cdf(sorted[i])) + log(normal.sf(sorted[count - 1 - i])))
    };
    let statistic = -n - (0..count).map(term).sum::<f64>();
    let a = statistic * (1.0 + 0.75 / n + 2.25 / (n * n));
    let p_value = match a {
        a if a < 0.2 => 1.0 - (-13.436 + 101.14 * a - 223.73 * a * a).exp(),
        a if a < 0.34 => 1.0 - (-8.318 + 42.796 * a - 59.938 * a * a).exp(),
        a if a < 0.6 => (0.9177 - 4.279 * a - 1.38 * a * a).exp(),
        // The fit's parabola turns round at 153, where p is long below what doubles hold.
        a => (1.2937 - 5.709 * a.min(100.0) + 0.0186 * a.min(100.0).powi(2)).exp(),
    };
    Some(Normality { statistic, p_value, count })
}
