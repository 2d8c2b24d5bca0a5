//! How differently clocks tick a given distance apart.

use std::f64::consts::PI;

use crate::background::{Background, HUBBLE_DISTANCE};
use crate::errors::CosmologyError;
use crate::power::LinearPower;
use crate::quadrature::composite;

/// Seconds in a Julian year: what a difference in rate of 1 amounts to in a year.
pub const SECONDS_PER_YEAR: f64 = 365.25 * 86_400.0;

/// The rms difference in rate between two clocks.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ClockContrast {
    /// c: the rms of the difference in rate, dimensionless.
    pub ratio: f64,
    /// Share of c² that comes from the wavenumbers that were asked about, 0 to 1.
    pub share: f64,
}

impl ClockContrast {
    /// The rms difference in seconds a year: c · 365.25 · 86400.
    pub fn seconds_per_year(&self) -> f64 {
        self.ratio * SECONDS_PER_YEAR
    }
}

/// Two places a comoving `distance` (Mpc/h) apart at `redshift`, and the wavenumbers that a measurement reached.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ClockSetting {
    /// z ≥ 0.
    pub redshift: f64,
    /// Comoving distance between the clocks, Mpc/h, above 0.
    pub distance: f64,
    /// P is multiplied by exp(−k²·damping²); Mpc/h, at least 0.
    pub damping: f64,
    /// Lowest and highest wavenumber, h/Mpc, whose share of c² is wanted.
    pub reached: (f64, f64),
}

/// c(d,z)² = 2 ∫k²dk/2π² [(3/2) Ωm(a) H² T(k)/k²]² D(k)² P(k) exp(−k² damping²) [1 − j₀(kd)].
///
/// `distortion` is T(k), how much stronger the time distortion is than in general relativity; `growth` is D(k) =
/// D(k,a)/D_GR(1). With a table of the power the integral runs over the table's own range.
pub fn clock_contrast(
    background: &Background,
    power: &LinearPower,
    setting: &ClockSetting,
    distortion: &dyn Fn(f64) -> f64,
    growth: &dyn Fn(f64) -> f64,
) -> Result<ClockContrast, CosmologyError> {
    let ClockSetting { redshift, distance, damping, reached } = *setting;
    let fail = |name, value, rule, way_out| Err(CosmologyError::OutOfRange { name, value, rule, way_out });
    if !(redshift >= 0.0 && redshift.is_finite()) {
        return fail("redshift", redshift, "at least 0 and finite", "give the redshift of the bin");
    }
    if !(distance > 0.0 && distance.is_finite()) {
        return fail("clock_distance", distance, "above 0 and finite", "give it in Mpc/h, such as 50");
    }
    if !(damping >= 0.0 && damping.is_finite()) {
        return fail("damping", damping, "at least 0 and finite", "give it in Mpc/h, such as 0.5");
    }
    let a = 1.0 / (1.0 + redshift);
    let hubble_square = background.expansion_squared(a) * (a / HUBBLE_DISTANCE).powi(2);
    let potential = 1.5 * background.matter_fraction(a) * hubble_square;

    let (low, high) = power.range().unwrap_or((LOWEST, HIGHEST));
    let mut edges = vec![low];
    let mut edge = low;
    while edge < high {
        let widest: f64 = if edge < WIGGLES_UNTIL { 0.02 } else { 0.07 };
        edge = (edge * 1.8).min(edge + widest.min(PI / distance)).min(high);
        edges.push(edge);
    }
    edges.extend([reached.0, reached.1].into_iter().filter(|k| (low..high).contains(k)));
    edges.sort_by(f64::total_cmp);
    let rule = composite(&edges, POINTS);
    let (mut total, mut inside) = (0.0, 0.0);
    for (&k, &weight) in rule.nodes.iter().zip(&rule.weights) {
        let factor = potential * distortion(k) * growth(k) / k;
        let term = weight / (PI * PI)
            * factor
            * factor
            * power.power(k)
            * (-(k * damping).powi(2)).exp()
            * one_minus_sinc(k * distance);
        total += term;
        if (reached.0..=reached.1).contains(&k) {
            inside += term;
        }
    }
    Ok(ClockContrast { ratio: total.sqrt(), share: inside / total })
}

const WIGGLES_UNTIL: f64 = 0.4;
const LOWEST: f64 = 1e-7;
const HIGHEST: f64 = 20.0;
const POINTS: usize = 8;

/// 1 − sin x/x, by its series where the difference would cancel.
fn one_minus_sinc(x: f64) -> f64 {
    if x > 1.0 {
        return 1.0 - x.sin() / x;
    }
    let square = x * x;
    // Sum over m ≥ 1 of (−1)^(m+1) x^(2m)/(2m+1)!, as nested fractions.
    let mut sum = 1.0;
    for m in (2..=9).rev() {
        sum = 1.0 - square / ((2 * m) as f64 * (2 * m + 1) as f64) * sum;
    }
    square / 6.0 * sum
}
