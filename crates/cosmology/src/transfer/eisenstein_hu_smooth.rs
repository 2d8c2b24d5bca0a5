//! The transfer function of cold dark matter and baryons, without acoustic wiggles.

use std::f64::consts::E;

use super::{CMB_TEMPERATURE, check_densities};
use crate::errors::CosmologyError;

/// Eisenstein & Hu 1998 (Astrophys. J. 496, 605), equations 26 and 28 to 31: baryons suppress power below the sound
/// horizon, but do not oscillate. Wavenumbers go in as h/Mpc.
#[derive(Clone, Copy, Debug)]
pub struct EisensteinHuSmooth {
    h: f64,
    sound_horizon: f64,
    theta_square: f64,
    shape: f64,
    alpha: f64,
}

impl EisensteinHuSmooth {
    /// Works out the scales from the densities and h (Hubble rate over 100 km/s/Mpc).
    ///
    /// # Errors
    /// `omega_m` ≤ 0, `omega_b` ≤ 0 or ≥ `omega_m`, `h` ≤ 0, or any not finite.
    pub fn new(omega_m: f64, omega_b: f64, h: f64) -> Result<Self, CosmologyError> {
        check_densities(omega_m, omega_b, h)?;
        let matter = omega_m * h * h;
        let baryons = omega_b * h * h;
        let share = omega_b / omega_m;
        let theta = CMB_TEMPERATURE / 2.7;
        Ok(Self {
            h,
            sound_horizon: 44.5 * (9.83 / matter).ln() / (1.0 + 10.0 * baryons.powf(0.75)).sqrt(),
            theta_square: theta * theta,
            shape: omega_m * h,
            alpha: 1.0 - 0.328 * (431.0 * matter).ln() * share + 0.38 * (22.3 * matter).ln() * share * share,
        })
    }

    /// The approximate sound horizon (26), in Mpc (not Mpc/h).
    pub fn sound_horizon(&self) -> f64 {
        self.sound_horizon
    }

    /// T(k) for k > 0 in h/Mpc.
    pub fn transfer(&self, wavenumber: f64) -> f64 {
        let ratio = 0.43 * wavenumber * self.h * self.sound_horizon;
        let shape =
            self.shape * (self.alpha + (1.0 - self.alpha) / (1.0 + (ratio * ratio) * (ratio * ratio)));
        let q = wavenumber * self.theta_square / shape;
        let log = (2.0 * E + 1.8 * q).ln();
        let curve = 14.2 + 731.0 / (1.0 + 62.5 * q);
        log / (log + curve * q * q)
    }
}
