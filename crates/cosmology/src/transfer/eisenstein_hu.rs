//! The transfer function of cold dark matter and baryons, with acoustic wiggles.

use std::f64::consts::E;

use super::{CMB_TEMPERATURE, check_densities};
use crate::errors::CosmologyError;

/// Eisenstein & Hu 1998 (Astrophys. J. 496, 605), equations 2 to 24, constants worked out once.
///
/// A fit to Boltzmann codes of their day, good to a few per cent; T → 1 as k → 0. Wavenumbers go in as h/Mpc.
#[derive(Clone, Copy, Debug)]
pub struct EisensteinHu {
    h: f64,
    baryon_share: f64,
    dark_share: f64,
    /// q/k, with k in 1/Mpc.
    scaled: f64,
    sound_horizon: f64,
    silk: f64,
    alpha_dark: f64,
    beta_dark: f64,
    alpha_baryon: f64,
    beta_baryon: f64,
    beta_node: f64,
}

impl EisensteinHu {
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

        Ok(Self {
            h,
            baryon_share,
            dark_share,
            scaled: 1.0 / (13.41 * equality_wavenumber),
            sound_horizon,
            silk,
            alpha_dark,
            beta_dark,
            alpha_baryon,
            beta_baryon,
            beta_node,
        })
    }

    /// Sound horizon at the drag epoch (6), in Mpc (not Mpc/h).
    pub fn sound_horizon(&self) -> f64 {
        self.sound_horizon
    }

    /// T(k) for k > 0 in h/Mpc (equations 10, 16 to 22).
    pub fn transfer(&self, wavenumber: f64) -> f64 {
        let k = wavenumber * self.h;
        let q = k * self.scaled;
        let log_q = q.ln();
        let q_power = (1.08 * log_q).exp();
        let q_square = q * q;
        let ks = k * self.sound_horizon;

        // T0~ = L/(L + C q²) (19, 20) with (alpha, beta) = (1, beta_c), (alpha_c, beta_c), (1, 1).
        let falling = 386.0 / (1.0 + 69.9 * q_power);
        let plain = (14.2 + falling) * q_square;
        let suppressed = (14.2 / self.alpha_dark + falling) * q_square;
        let log_dark = (E + 1.8 * self.beta_dark * q).ln();
        let log_plain = (E + 1.8 * q).ln();

        let ratio = ks / 5.4;
        let weight = 1.0 / (1.0 + ratio * ratio * ratio * ratio);
        let dark = log_dark * (weight / (log_dark + plain) + (1.0 - weight) / (log_dark + suppressed));

        // exp(-(k/k_silk)^1.4) below e^-50 adds nothing to the last digit of what stands beside it.
        let damping = (1.4 * (k / self.silk).ln()).exp();
        let node = self.beta_node / ks;
        let shifted = ks / (1.0 + node * node * node).cbrt();
        let acoustic = if shifted > 0.0 {
            shifted.sin() / shifted
        } else {
            1.0
        };
        let drop = self.beta_baryon / ks;
        let ratio = ks / 5.2;
        let baryon = (log_plain / (log_plain + plain) / (1.0 + ratio * ratio)
            + self.alpha_baryon / (1.0 + drop * drop * drop) * (-damping).exp())
            * acoustic;

        self.baryon_share * baryon + self.dark_share * dark
    }
}
