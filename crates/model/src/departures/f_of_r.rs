//! f(R) gravity of Hu & Sawicki 2007 with n = 1.

use super::{Departure, DepartureParameter, FeltBy};
use oddwell_cosmology::{Background, HUBBLE_DISTANCE};

/// f(R) gravity of Hu & Sawicki 2007 with n = 1.
#[derive(Debug)]
pub(super) struct FOfR;

impl Departure for FOfR {
    fn name(&self) -> &'static str {
        "f-of-r"
    }

    fn formula(&self) -> &'static str {
        "τ = (1/3) k²/(k² + a²M²), M² = (Ωm a⁻³ + 4Ωde)³ / [2 |f_R0| (Ωm + 4Ωde)²] (H0/c)²"
    }

    fn manual(&self) -> &'static str {
        "Hu & Sawicki 2007 with n = 1; log10_f_r0 is log10 |f_R0|, and −∞ is general relativity. Felt by everything; needs w0 = −1, wa = 0, Ωk = 0. Ψ and the acceleration cancel, so odd multipoles see it only through growth, which depends on k. Source: Hu & Sawicki 2007, PRD 76, 064004."
    }

    fn parameters(&self) -> &'static [DepartureParameter] {
        &[DepartureParameter {
            name: "log10_f_r0",
            meaning: "log10 |f_R0|, dimensionless",
            general_relativity: None,
        }]
    }

    fn allowed(&self) -> &'static [FeltBy] {
        &[FeltBy::Everything]
    }

    fn scale_dependent(&self) -> bool {
        true
    }

    fn tau(&self, parameters: &[f64], background: &Background, a: f64, k: f64) -> f64 {
        let (omega_m, omega_de) = (background.omega_m, background.omega_de());
        let field = 10.0_f64.powf(parameters[0]);
        let now = omega_m + 4.0 * omega_de;
        let then = omega_m / (a * a * a) + 4.0 * omega_de;
        let mass_squared = then.powi(3) / (2.0 * field * now * now) / (HUBBLE_DISTANCE * HUBBLE_DISTANCE);
        k * k / (3.0 * (k * k + a * a * mass_squared))
    }
}
