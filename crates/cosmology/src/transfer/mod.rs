//! Shapes of the linear power spectrum: one file each.

pub mod eisenstein_hu;
pub mod eisenstein_hu_smooth;
pub mod table;

use std::sync::Arc;

pub use eisenstein_hu::EisensteinHu;
pub use eisenstein_hu_smooth::EisensteinHuSmooth;
pub use table::PowerTable;

use crate::errors::CosmologyError;

/// Temperature of the microwave background today, in K (Fixsen 2009, Astrophys. J. 707, 916).
pub const CMB_TEMPERATURE: f64 = 2.7255;

/// Where the shape of the linear power spectrum comes from. Its amplitude is always σ8's.
#[derive(Clone, Debug)]
pub enum PowerShape {
    /// kⁿ T², with the transfer function of Eisenstein & Hu 1998, acoustic wiggles included.
    EisensteinHu,
    /// kⁿ T², with the transfer function of Eisenstein & Hu 1998 without wiggles.
    EisensteinHuSmooth,
    /// The user's own.
    Table(Arc<PowerTable>),
}

/// Checks what both transfer functions need: matter above 0, baryons above 0 and less than matter, h above 0.
pub(crate) fn check_densities(omega_m: f64, omega_b: f64, h: f64) -> Result<(), CosmologyError> {
    let fail = |name, value, rule, way_out| Err(CosmologyError::OutOfRange { name, value, rule, way_out });
    if !(omega_m > 0.0 && omega_m.is_finite()) {
        return fail(
            "omega_m",
            omega_m,
            "above 0 and finite",
            "give the share of matter today, such as 0.31",
        );
    }
    if !(omega_b > 0.0 && omega_b < omega_m) {
        return fail(
            "omega_b",
            omega_b,
            "above 0 and below omega_m",
            "give the share of baryons today, such as 0.049",
        );
    }
    if !(h > 0.0 && h.is_finite()) {
        return fail("h", h, "above 0 and finite", "give the Hubble rate over 100 km/s/Mpc, such as 0.68");
    }
    Ok(())
}
