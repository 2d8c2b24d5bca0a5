//! The expansion of a homogeneous universe of matter, curvature and dark energy with w(a) = w0 + wa (1 − a).

use std::sync::LazyLock;

use crate::epoch::Epoch;
use crate::errors::CosmologyError;
use crate::quadrature::{GaussLegendre, gauss_legendre};

/// c/(100 km/s/Mpc), in Mpc/h.
pub const HUBBLE_DISTANCE: f64 = 2997.92458;

/// c in km/s.
pub const SPEED_OF_LIGHT: f64 = 299_792.458;

/// Points of the distance integral, see [`Background::comoving_distance`].
const DISTANCE_POINTS: usize = 64;

/// Points of the volume integral, see [`Background::comoving_volume`].
const VOLUME_POINTS: usize = 16;

static DISTANCE_RULE: LazyLock<GaussLegendre> = LazyLock::new(|| gauss_legendre(DISTANCE_POINTS));

/// Densities today and the equation of state of dark energy.
///
/// E² = Ωm a⁻³ + Ωk a⁻² + Ωde a^(−3(1+w0+wa)) exp(−3 wa (1−a)), with Ωde = 1 − Ωm − Ωk (Hogg 1999, astro-ph/9905116,
/// with the dark energy of Chevallier & Polarski 2001, Int. J. Mod. Phys. D 10, 213, and Linder 2003, Phys. Rev.
/// Lett. 90, 091301). Radiation is neglected: 2·10⁻⁴ of a distance at z = 2.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Background {
    /// Ωm: matter today over the critical density, above 0.
    pub omega_m: f64,
    /// Ωk: curvature today; positive is open, negative closed.
    pub omega_k: f64,
    /// w of dark energy today.
    pub w0: f64,
    /// −dw/da.
    pub wa: f64,
}

impl Background {
    /// Checks the four numbers: all finite, `omega_m` above 0. Whether the universe has the past that a redshift
    /// asks for is checked by [`Background::epoch`].
    pub fn new(omega_m: f64, omega_k: f64, w0: f64, wa: f64) -> Result<Self, CosmologyError> {
        // `!(x > 0)` is true of NaN too.
        if !(omega_m > 0.0 && omega_m.is_finite()) {
            return Err(CosmologyError::OutOfRange {
                name: "omega_m",
                value: omega_m,
                rule: "above 0 and finite",
                way_out: "give the share of matter in the critical density today, such as 0.31",
            });
        }
        for (name, value, way_out) in [
            ("omega_k", omega_k, "give 0 for a flat universe"),
            ("w0", w0, "give -1 for a cosmological constant"),
            ("wa", wa, "give 0 for a constant equation of state"),
        ] {
            if !value.is_finite() {
                return Err(CosmologyError::OutOfRange { name, value, rule: "finite", way_out });
            }
        }
        Ok(Self { omega_m, omega_k, w0, wa })
    }

    /// Ωde = 1 − Ωm − Ωk.
    pub fn omega_de(&self) -> f64 {
        1.0 - self.omega_m - self.omega_k
    }

    /// Density of dark energy at `a` over today's: a^(−3(1+w0+wa)) exp(−3 wa (1−a)).
    pub fn dark_energy_density(&self, a: f64) -> f64 {
        self.dark_energy_density_at(a, || a.ln())
    }

    /// The same where ln a is known, or not needed.
    fn dark_energy_density_at(&self, a: f64, log_a: impl Fn() -> f64) -> f64 {
        if self.w0 == -1.0 && self.wa == 0.0 {
            return 1.0;
        }
        (-3.0 * ((1.0 + self.w0 + self.wa) * log_a() + self.wa * (1.0 - a))).exp()
    }

    /// The three terms of E²: matter, curvature, dark energy.
    fn terms(&self, a: f64, log_a: impl Fn() -> f64) -> [f64; 3] {
        let inverse = 1.0 / a;
        let square = inverse * inverse;
        [
            self.omega_m * inverse * square,
            self.omega_k * square,
            self.omega_de() * self.dark_energy_density_at(a, log_a),
        ]
    }

    /// d ln E/d ln a from the terms of E².
    fn slope(&self, a: f64, [matter, curvature, dark_energy]: [f64; 3]) -> f64 {
        let state = self.w0 + self.wa * (1.0 - a);
        -0.5 * (3.0 * matter + 2.0 * curvature + 3.0 * (1.0 + state) * dark_energy)
            / (matter + curvature + dark_energy)
    }

    /// E² = (H/H0)², which can be negative where there is no such universe.
    pub fn expansion_squared(&self, a: f64) -> f64 {
        self.terms(a, || a.ln()).iter().sum()
    }

    /// E = H/H0 with the proper Hubble rate H, at a > 0; NaN where E² < 0.
    pub fn expansion(&self, a: f64) -> f64 {
        self.expansion_squared(a).sqrt()
    }

    /// d ln E/d ln a = −[3Ωm a⁻³ + 2Ωk a⁻² + 3(1+w(a)) Ωde X(a)]/(2E²), X the density of dark energy over today's.
    pub fn expansion_slope(&self, a: f64) -> f64 {
        self.slope(a, self.terms(a, || a.ln()))
    }

    /// (a, d ln E/d ln a, Ωm(a)) at ln a: what the growth equation asks for at every step, for the price of two
    /// exponentials.
    pub(crate) fn growth_terms(&self, log_a: f64) -> (f64, f64, f64) {
        let a = log_a.exp();
        let terms = self.terms(a, || log_a);
        (a, self.slope(a, terms), terms[0] / terms.iter().sum::<f64>())
    }

    /// (d ln E/d ln a, d² ln E/d(ln a)², Ωm(a)) where both a and ln a are known. With N = 3m + 2c + 3(1+w)d for the terms
    /// m, c, d of E², the slope is −N/2E², and since N is also −dE²/d ln a its own is −N′/2E² − 2 slope².
    pub(crate) fn normal_form(&self, a: f64, log_a: f64) -> (f64, f64, f64) {
        let [matter, curvature, dark_energy] = self.terms(a, || log_a);
        let inverse = 1.0 / (matter + curvature + dark_energy);
        let stiffness = 3.0 * (1.0 + self.w0 + self.wa * (1.0 - a));
        let fall = 3.0 * matter + 2.0 * curvature + stiffness * dark_energy;
        // w′ = −wa a.
        let fall_slope =
            -9.0 * matter - 4.0 * curvature - (stiffness * stiffness + 3.0 * self.wa * a) * dark_energy;
        let slope = -0.5 * fall * inverse;
        (slope, -0.5 * fall_slope * inverse - 2.0 * slope * slope, matter * inverse)
    }

    /// Ωm(a): matter over the critical density at `a`.
    pub fn matter_fraction(&self, a: f64) -> f64 {
        self.omega_m / (a * a * a * self.expansion_squared(a))
    }

    /// d ln Ωm(a)/d ln a = −3 − 2 d ln E/d ln a.
    pub fn matter_fraction_slope(&self, a: f64) -> f64 {
        -3.0 - 2.0 * self.expansion_slope(a)
    }

    /// Ωde(a): dark energy over the critical density at `a`.
    pub fn dark_energy_fraction(&self, a: f64) -> f64 {
        self.omega_de() * self.dark_energy_density(a) / self.expansion_squared(a)
    }

    /// Conformal Hubble rate a E/2997.92458, in h/Mpc.
    pub fn conformal_hubble(&self, a: f64) -> f64 {
        a * self.expansion(a) / HUBBLE_DISTANCE
    }

    /// Comoving distance χ = 2997.92458 ∫₀ᶻ dz/E, in Mpc/h; z > −1 (negative for −1 < z < 0), NaN where E² < 0.
    ///
    /// Gauss-Legendre with 64 points in u = ln(1+z), where the integrand is e^u/E. In u the zeros of E² (in the
    /// complex plane) lie π/3 off the real axis whatever the densities of matter and a cosmological constant, so the
    /// integrand is analytic in a strip of that half-width: the rule's error is then ρ^(−128) with ρ ≥ 2.2 for z ≤ 10
    /// (and 1.5 for z ≤ 1100), and what remains is rounding, a few 1e-16. It stays below 1e-12 for z ≤ 10 as long as
    /// curvature and w0-wa keep the zeros of E² at least 0.24 from the real axis. A universe that almost bounced loses
    /// digits: where curvature brought E² to 10 % of matter's term alone, 5e-13; to 1 %, 4e-5.
    pub fn comoving_distance(&self, z: f64) -> f64 {
        let half = 0.5 * z.ln_1p();
        let sum: f64 = (DISTANCE_RULE.nodes.iter().zip(&DISTANCE_RULE.weights))
            .map(|(node, weight)| {
                let log_a = -half * (1.0 + node);
                let a = log_a.exp();
                weight / (a * self.terms(a, || log_a).iter().sum::<f64>().sqrt())
            })
            .sum();
        HUBBLE_DISTANCE * half * sum
    }

    /// Transverse comoving distance r, in Mpc/h: χ, or sinh or sin of it in an open or closed universe.
    pub fn transverse_distance(&self, z: f64) -> f64 {
        self.curve(self.comoving_distance(z)).0
    }

    /// Comoving volume between redshifts `low` and `high` per steradian, ∫ r² dχ (Hogg 1999, eq. 28), in (Mpc/h)³;
    /// −1 < low, negative for high < low, NaN where E² < 0.
    ///
    /// Gauss-Legendre with 16 points in χ, exact to rounding in a flat universe and where the volume spans less than a
    /// radius of curvature.
    pub fn comoving_volume(&self, low: f64, high: f64) -> f64 {
        let rule =
            gauss_legendre(VOLUME_POINTS).on(self.comoving_distance(low), self.comoving_distance(high));
        rule.integrate(|distance| self.curve(distance).0.powi(2))
    }

    /// (r, C = dr/dχ) at a comoving distance χ. C = √(1 + Ωk (r/2997.92458)²) up to the equator of a closed universe,
    /// negative beyond.
    pub(crate) fn curve(&self, distance: f64) -> (f64, f64) {
        let root = self.omega_k.abs().sqrt();
        let angle = root * distance / HUBBLE_DISTANCE;
        if self.omega_k > 0.0 {
            (HUBBLE_DISTANCE * angle.sinh() / root, angle.cosh())
        } else if self.omega_k < 0.0 {
            (HUBBLE_DISTANCE * angle.sin() / root, angle.cos())
        } else {
            (distance, 1.0)
        }
    }

    /// Everything of the background at redshift `z`, after checking that the universe has such a past.
    ///
    /// # Errors
    /// `z` ≤ 0 or not finite; E² ≤ 0 anywhere between z and today (`omega_m` 0.05, `omega_k` −1 bounced at z = 2.5);
    /// z beyond the antipode of a closed universe.
    pub fn epoch(&self, z: f64) -> Result<Epoch, CosmologyError> {
        Epoch::new(self, z)
    }

    /// Says no where E² ≤ 0 between scale factor `a` and today.
    pub(crate) fn check_past(&self, a: f64) -> Result<(), CosmologyError> {
        match self.missing_past(a) {
            None => Ok(()),
            Some((at, value)) => {
                Err(CosmologyError::NoExpansion { redshift: 1.0 / at - 1.0, value, asked: 1.0 / a - 1.0 })
            }
        }
    }

    /// Where E² ≤ 0 first (as (a, E²)), between scale factor `a` and today, if it is anywhere.
    ///
    /// With no negative term there is nowhere. Else E² a³ is looked at on a grid in ln a, and where an inner grid
    /// point is lower than its neighbours the minimum between them is found by golden section, so that a dip between
    /// two grid points does not go unseen.
    pub(crate) fn missing_past(&self, a: f64) -> Option<(f64, f64)> {
        if self.omega_k >= 0.0 && self.omega_de() >= 0.0 {
            return None;
        }
        const STEPS: usize = 64;
        const GOLDEN: f64 = 0.618_033_988_749_894_9;
        let start = a.ln();
        let at = |x: f64| {
            let a = x.exp();
            self.expansion_squared(a) * a * a * a
        };
        let place = |index: usize| start * (1.0 - index as f64 / STEPS as f64);
        let values: Vec<f64> = (0..=STEPS).map(|index| at(place(index))).collect();
        // The test is written so that NaN fails it.
        let found = |x: f64, value: f64| {
            if value > 0.0 { None } else { Some((x.exp(), self.expansion_squared(x.exp()))) }
        };
        for index in (0..=STEPS).rev() {
            if let Some(found) = found(place(index), values[index]) {
                return Some(found);
            }
            if index > 0 && index < STEPS && values[index] < values[index - 1].min(values[index + 1]) {
                let (mut low, mut high) = (place(index - 1), place(index + 1));
                for _ in 0..60 {
                    let (inner_low, inner_high) = (high - GOLDEN * (high - low), low + GOLDEN * (high - low));
                    if at(inner_low) < at(inner_high) { high = inner_high } else { low = inner_low }
                }
                let middle = 0.5 * (low + high);
                if let Some(found) = found(middle, at(middle)) {
                    return Some(found);
                }
            }
        }
        None
    }
}
