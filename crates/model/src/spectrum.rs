//! The linear spectrum as the prediction sees it: damped, and its acoustic peak smeared.

use crate::error::ModelError;
use crate::layout::slot;
use oddwell_cosmology::{PowerShape, RawPower, Wavenumbers};

/// The spectrum's quantities, as a vector holds them.
#[derive(Clone, Copy, Debug)]
pub(crate) struct SpectrumValues {
    omega_m: f64,
    omega_b: f64,
    h: f64,
    n_s: f64,
    /// Mpc/h; enters squared.
    damping: f64,
    /// Σ, Mpc/h; enters squared.
    smearing: f64,
}

impl SpectrumValues {
    pub(crate) fn read(values: &[f64]) -> SpectrumValues {
        SpectrumValues {
            omega_m: values[slot::OMEGA_M],
            omega_b: values[slot::OMEGA_B],
            h: values[slot::H],
            n_s: values[slot::N_S],
            damping: values[slot::DAMPING],
            smearing: values[slot::SMEARING],
        }
    }

    fn raw(&self, shape: &PowerShape) -> Result<RawPower, ModelError> {
        Ok(RawPower::new(shape, self.omega_m, self.omega_b, self.h, self.n_s)?)
    }

    /// The undamped shape, of its own amplitude, at `wavenumbers`; then σ8² of it by `variance` (which gets the values);
    /// then, divided by that, the spectrum for σ8 = 1:
    ///
    /// ```text
    /// P = [P_smooth + (P_lin − P_smooth) e^(−k²Σ²)] e^(−k²·damping²)
    /// ```
    ///
    /// P_smooth has the primordial amplitude and index of P_lin and Eisenstein & Hu's transfer function without wiggles,
    /// so it tends to P_lin at small k. Elsewhere the two fits differ by −2 to +1.5 % once wiggles are averaged over (−2 % at
    /// k > 1 h/Mpc), which smearing brings along. σ8 is that of P_lin: smearing moves what is seen, not the amplitude that
    /// it is made from. Source of the form: Eisenstein, Seo & White 2007, ApJ 664, 660, with Σ²/2 there for Σ² here.
    ///
    /// # Errors
    /// Where the shape has no value; and for Σ ≠ 0 with a user's table, whose smooth part nobody knows.
    pub(crate) fn fill(
        &self,
        shape: &PowerShape,
        wavenumbers: &Wavenumbers,
        variance: impl FnOnce(&RawPower, &[f64]) -> f64,
        smooth: &mut Vec<f64>,
        out: &mut Vec<f64>,
    ) -> Result<(), ModelError> {
        out.resize(wavenumbers.len(), 0.0);
        let raw = self.raw(shape)?;
        raw.tabulate(wavenumbers, out)?;
        let amplitude = 1.0 / variance(&raw, out);
        if self.smearing != 0.0 {
            if matches!(shape, PowerShape::Table(_)) {
                return Err(ModelError::Setup {
                    what: "prediction.smearing".into(),
                    value: self.smearing.to_string(),
                    rule: "only the built-in spectra can be smeared: the smooth part of a power table is not known",
                    way_out: "remove it and give a table that is smeared already, or `power = \"eisenstein-hu\"`",
                });
            }
            smooth.resize(wavenumbers.len(), 0.0);
            self.raw(&PowerShape::EisensteinHuSmooth)?.tabulate(wavenumbers, smooth)?;
            for ((power, smooth), k) in out.iter_mut().zip(&*smooth).zip(wavenumbers.values()) {
                *power = smooth + (*power - smooth) * (-(k * self.smearing).powi(2)).exp();
            }
        }
        let square = self.damping * self.damping;
        for (power, k) in out.iter_mut().zip(wavenumbers.values()) {
            *power *= amplitude * (-k * k * square).exp();
        }
        Ok(())
    }
}
