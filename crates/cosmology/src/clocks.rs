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
    /// Share of c² that comes from the wavenumbers that were reached, 0 to 1 (0 where c is 0).
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

/// Below this wavenumber panels resolve acoustic wiggles at full height, as in the integral of σ8.
const WIGGLES_UNTIL: f64 = 0.4;

/// Where the integral starts, h/Mpc: there the integrand goes like k², and 10⁻¹⁵ of c² lies below.
const LOWEST: f64 = 1e-7;

/// Where it ends, h/Mpc: e^(−k²·damping²) is below 10⁻³⁵ there for a damping of 0.45 Mpc/h or more.
const HIGHEST: f64 = 20.0;

/// Points of each panel.
const POINTS: usize = 8;

/// How different the rates of two clocks are: the rms of Ψ between two places,
///
/// c(d,z)² = 2 ∫k²dk/2π² [(3/2) Ωm(a) H² T(k)/k²]² D(k)² P(k) exp(−k² damping²) [1 − j₀(kd)].
///
/// `distortion` is T(k) at the setting's redshift: how many times stronger the time distortion is than in general
/// relativity; `growth` is D(k,a)/D_GR(1). Both may jump only at the ends of the `reached` range. With a table of the
/// power the integral runs over the table's own range, and what lies outside is missing from c.
///
/// Gauss-Legendre of 8 points on panels as narrow as half a period of j₀(kd), as the acoustic wiggles ask for, and as
/// a factor of 1.8 in k. Against a rule thirty times as fine it is good to 10⁻⁹ for smooth T and D, d from 0.1 to
/// 2000 Mpc/h and a damping of at least 0.45 Mpc/h; without damping what lies above 20 h/Mpc is missing, 10⁻⁹ of c
/// for 50 Mpc/h and 10⁻⁶ for 1 Mpc/h. 1 − j₀ comes from its series where it would cancel. The rms of Ψ alone would
/// diverge at low k; of the difference it doesn't, since 1 − j₀ falls like k².
///
/// # Errors
/// A redshift below 0, a distance not above 0, a damping below 0, a range that is upside down; E² ≤ 0 at the
/// redshift; T or D that is not finite.
pub fn clock_contrast(
    background: &Background,
    power: &LinearPower,
    setting: &ClockSetting,
    distortion: &dyn Fn(f64) -> f64,
    growth: &dyn Fn(f64) -> f64,
) -> Result<ClockContrast, CosmologyError> {
    let ClockSetting { redshift, distance, damping, reached } = *setting;
    check(setting)?;
    let a = 1.0 / (1.0 + redshift);
    let square = background.expansion_squared(a);
    if square <= 0.0 || square.is_nan() {
        return Err(CosmologyError::NoExpansion { redshift, value: square, asked: redshift });
    }
    let potential = 1.5 * background.matter_fraction(a) * square * (a / HUBBLE_DISTANCE).powi(2);

    let (low, high) = power.range().unwrap_or((LOWEST, HIGHEST));
    let rule = composite(&edges(low, high, distance, reached), POINTS);
    let mut spectrum = vec![0.0; rule.len()];
    power.tabulate(&rule.nodes, &mut spectrum)?;
    let (mut total, mut inside) = (0.0, 0.0);
    for ((&k, &weight), &spectrum) in rule.nodes.iter().zip(&rule.weights).zip(&spectrum) {
        let factor = potential * distortion(k) * growth(k) / k;
        let damped = spectrum * (-(k * damping).powi(2)).exp();
        let term = weight / (PI * PI) * factor * factor * damped * one_minus_sinc(k * distance);
        if !term.is_finite() {
            return Err(CosmologyError::OutOfRange {
                name: "clock contrast's integrand",
                value: term,
                rule: "finite at every wavenumber",
                way_out: "give a departure that stays finite",
            });
        }
        total += term;
        if (reached.0..=reached.1).contains(&k) {
            inside += term;
        }
    }
    let share = if total > 0.0 { inside / total } else { 0.0 };
    Ok(ClockContrast { ratio: total.sqrt(), share })
}

fn check(setting: &ClockSetting) -> Result<(), CosmologyError> {
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
    if reached.0.is_nan() || reached.1.is_nan() || reached.0 > reached.1 {
        let way_out = "give the lowest wavenumber that was reached first";
        return fail("wavenumber", reached.0, "at most the highest that was reached", way_out);
    }
    Ok(())
}

/// Where panels end. Ends of the reached range are edges too, so that each panel counts as a whole.
fn edges(low: f64, high: f64, distance: f64, reached: (f64, f64)) -> Vec<f64> {
    let mut edges = vec![low];
    let mut edge = low;
    while edge < high {
        let widest: f64 = if edge < WIGGLES_UNTIL { 0.02 } else { 0.07 };
        edge = (edge * 1.8).min(edge + widest.min(PI / distance)).min(high);
        edges.push(edge);
    }
    edges.extend([reached.0, reached.1].into_iter().filter(|&k| k > low && k < high));
    edges.sort_by(f64::total_cmp);
    edges
}

/// 1 − sin x/x, by its series where the difference would cancel.
fn one_minus_sinc(x: f64) -> f64 {
    if x > 1.0 {
        return 1.0 - x.sin() / x;
    }
    // Sum over m ≥ 1 of (−1)^(m+1) x^(2m)/(2m+1)!, as nested factors.
    let square = x * x;
    let nested = (2..=9).rev().fold(1.0, |sum, m| 1.0 - square / ((2 * m * (2 * m + 1)) as f64) * sum);
    square / 6.0 * nested
}
