//! The transfer function of cold dark matter and baryons, with acoustic wiggles.

use std::array::from_fn;
use std::f64::consts::E;

use super::{CMB_TEMPERATURE, check_densities};
use crate::elementary::{exp, ln, sin};
use crate::errors::CosmologyError;

/// Eisenstein & Hu 1998 (Astrophys. J. 496, 605), equations 2 to 24, constants worked out once.
///
/// A fit to Boltzmann codes of their day, good to a few per cent; T → 1 as k → 0. Wavenumbers go in as h/Mpc.
#[derive(Clone, Copy, Debug)]
pub struct EisensteinHu {
    baryon_share: f64,
    dark_share: f64,
    /// q/k, with k in h/Mpc.
    scaled: f64,
    /// (q/k)^1.08.
    scaled_power: f64,
    /// Mpc.
    sound_horizon: f64,
    /// Mpc/h.
    sound_horizon_scaled: f64,
    /// The Silk wavenumber in h/Mpc to the power −1.4.
    silk_power: f64,
    /// 14.2/alpha_c.
    dark_coefficient: f64,
    /// 1.8 beta_c.
    beta_dark: f64,
    alpha_baryon: f64,
    /// beta_b³.
    beta_baryon_cube: f64,
    /// beta_node³.
    node_cube: f64,
}

impl EisensteinHu {
    /// The power of q in equation 20, and that of k/k_silk in equation 21.
    pub(crate) const QUOTIENT_POWER: f64 = 1.08;
    pub(crate) const SILK_POWER: f64 = 1.4;

    /// Works out the scales from the densities and h (Hubble rate over 100 km/s/Mpc).
    ///
    /// # Errors
    /// `omega_m` ≤ 0, `omega_b` ≤ 0 or ≥ `omega_m`, `h` ≤ 0, or any not finite.
    pub fn new(omega_m: f64, omega_b: f64, h: f64) -> Result<Self, CosmologyError> {
        check_densities(omega_m, omega_b, h)?;
        let matter = omega_m * h * h;
        let baryons = omega_b * h * h;
        let baryon_share = omega_b / omega_m;
        let dark_share = 1.0 - baryon_share;
        let theta = CMB_TEMPERATURE / 2.7;

        // Equality (2, 3), drag epoch (4), baryon to photon momentum (5), sound horizon (6), Silk damping (7).
        let equality = 2.50e4 * matter * theta.powi(-4);
        let equality_wavenumber = 7.46e-2 * matter * theta.powi(-2);
        let b1 = 0.313 * matter.powf(-0.419) * (1.0 + 0.607 * matter.powf(0.674));
        let b2 = 0.238 * matter.powf(0.223);
        let drag =
            1291.0 * matter.powf(0.251) / (1.0 + 0.659 * matter.powf(0.828)) * (1.0 + b1 * baryons.powf(b2));
        let momentum = |z: f64| 31.5 * baryons * theta.powi(-4) * 1e3 / z;
        let (at_drag, at_equality) = (momentum(drag), momentum(equality));
        let sound_horizon = 2.0 / (3.0 * equality_wavenumber)
            * (6.0 / at_equality).sqrt()
            * (((1.0 + at_drag).sqrt() + (at_drag + at_equality).sqrt()) / (1.0 + at_equality.sqrt())).ln();
        let silk = 1.6 * baryons.powf(0.52) * matter.powf(0.73) * (1.0 + (10.4 * matter).powf(-0.95));

        // Cold dark matter (11, 12).
        let a1 = (46.9 * matter).powf(0.670) * (1.0 + (32.1 * matter).powf(-0.532));
        let a2 = (12.0 * matter).powf(0.424) * (1.0 + (45.0 * matter).powf(-0.582));
        let alpha_dark = a1.powf(-baryon_share) * a2.powf(-baryon_share.powi(3));
        let b1 = 0.944 / (1.0 + (458.0 * matter).powf(-0.708));
        let b2 = (0.395 * matter).powf(-0.0266);
        let beta_dark = 1.0 / (1.0 + b1 * (dark_share.powf(b2) - 1.0));

        // Baryons (14, 15, 23, 24).
        let y = (1.0 + equality) / (1.0 + drag);
        let root = (1.0 + y).sqrt();
        let suppression = y * (-6.0 * root + (2.0 + 3.0 * y) * ((root + 1.0) / (root - 1.0)).ln());
        let alpha_baryon =
            2.07 * equality_wavenumber * sound_horizon * (1.0 + at_drag).powf(-0.75) * suppression;
        let beta_node = 8.41 * matter.powf(0.435);
        let beta_baryon =
            0.5 + baryon_share + (3.0 - 2.0 * baryon_share) * ((17.2 * matter).powi(2) + 1.0).sqrt();

        let scaled = h / (13.41 * equality_wavenumber);
        Ok(Self {
            baryon_share,
            dark_share,
            scaled,
            scaled_power: scaled.powf(Self::QUOTIENT_POWER),
            sound_horizon,
            sound_horizon_scaled: sound_horizon * h,
            silk_power: (silk / h).powf(-Self::SILK_POWER),
            dark_coefficient: 14.2 / alpha_dark,
            beta_dark: 1.8 * beta_dark,
            alpha_baryon,
            beta_baryon_cube: beta_baryon.powi(3),
            node_cube: beta_node.powi(3),
        })
    }

    /// Sound horizon at the drag epoch (6), in Mpc (not Mpc/h).
    pub fn sound_horizon(&self) -> f64 {
        self.sound_horizon
    }

    /// T(k) for k > 0 in h/Mpc (equations 10, 16 to 22).
    pub fn transfer(&self, wavenumber: f64) -> f64 {
        let power = |exponent: f64| [wavenumber.powf(exponent)];
        self.transfers([wavenumber], power(Self::QUOTIENT_POWER), power(Self::SILK_POWER))[0]
    }

    /// The same for N wavenumbers whose powers k^1.08 and k^1.4 are known.
    ///
    /// This runs for every wavenumber at every evaluation in which the background moves. So powers of k alone come from
    /// outside (a grid keeps them), fractions are brought to common denominators, and the steps go one at a time through
    /// N values, without a call, so that the processor takes several at once.
    pub(crate) fn transfers<const N: usize>(
        &self,
        wavenumber: [f64; N],
        quotient_power: [f64; N],
        silk_power: [f64; N],
    ) -> [f64; N] {
        let q = wavenumber.map(|k| k * self.scaled);
        let ks = wavenumber.map(|k| k * self.sound_horizon_scaled);
        let q_power = quotient_power.map(|power| power * self.scaled_power);
        let log_dark = q.map(|q| ln(E + self.beta_dark * q));
        let log_plain = q.map(|q| ln(E + 1.8 * q));
        // (k/k_silk)^1.4; beyond 80, e^(-damping) is lost in the rounding of what stands beside it.
        let damping = silk_power.map(|power| (power * self.silk_power).min(80.0));
        let damped = damping.map(|damping| exp(-damping));
        // 1 + (beta_node/ks)³ to the power -1/3, by logarithm: half the price of a cube root.
        let node = ks.map(|ks| 1.0 + self.node_cube / (ks * ks * ks)).map(|node| ln(node) * (-1.0 / 3.0));
        let root = node.map(exp);
        let shifted: [f64; N] = from_fn(|i| ks[i] * root[i]);
        let sine = shifted.map(sin);
        from_fn(|i| {
            let q_square = q[i] * q[i];
            let ks_square = ks[i] * ks[i];
            let cube = ks[i] * ks_square;

            // T0~ = L/(L + C q²) (19, 20), with (alpha, beta) = (1, beta_c), (alpha_c, beta_c) and (1, 1).
            let falling = 386.0 / (1.0 + 69.9 * q_power[i]);
            let plain = (14.2 + falling) * q_square;
            let suppressed = (self.dark_coefficient + falling) * q_square;

            // T_c (17, 18) = f L/(L + plain) + (1 - f) L/(L + suppressed) with f = 1/(1 + rise).
            let rise = ks_square * ks_square * (1.0 / (5.4 * 5.4 * 5.4 * 5.4));
            let (near, far) = (log_dark[i] + plain, log_dark[i] + suppressed);
            let dark = log_dark[i] * (far + rise * near) / ((1.0 + rise) * near * far);

            // T_b (21, 22).
            let infall = log_plain[i] / ((log_plain[i] + plain) * (1.0 + ks_square * (1.0 / (5.2 * 5.2))));
            let acoustic = self.alpha_baryon * cube / (cube + self.beta_baryon_cube) * damped[i];
            let baryon = (infall + acoustic) * sine[i] / shifted[i];
            self.baryon_share * baryon + self.dark_share * dark
        })
    }
}
