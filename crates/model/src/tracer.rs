//! One galaxy population and its first-order response to velocity and gravity.

use crate::layout::slot;
use crate::setup::Effects;
use oddwell_cosmology::{Epoch, GrowthState};

/// One of the two populations, at one redshift.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tracer {
    /// b, linear bias.
    pub bias: f64,
    /// s_X = ∂log₁₀ N(<mag)/∂mag at the flux limit.
    pub magnification_bias: f64,
    /// e_X = ∂ln n/∂ln a of the comoving density, at fixed luminosity threshold.
    pub evolution_bias: f64,
    /// dln b/dln a.
    pub bias_slope: f64,
}

/// e_X = slope − 5 s_X (1 + 1/(r̃ H)): the evolution bias at fixed luminosity threshold, from the slope ∂ln n/∂ln a of the
/// comoving density that a flux-limited catalogue shows. Dimensionless.
///
/// Along a flux limit the threshold in absolute magnitude moves by (5/ln 10)(1 + 1/(r̃ H)) d ln a, and with it ln n by
/// 5 s_X (1 + 1/(r̃ H)) d ln a. K-corrections, which move the threshold as well, are left out.
///
/// Source: Challinor & Lewis 2011, PRD 84, 043516; Jeong, Schmidt & Hirata 2012, PRD 85, 023504.
#[must_use]
pub fn evolution_bias_of_slope(slope: f64, magnification_bias: f64, epoch: &Epoch) -> f64 {
    slope - 5.0 * magnification_bias * (1.0 + 1.0 / (epoch.reduced_distance * epoch.conformal_hubble))
}

impl Tracer {
    /// With what was given as the slope of the catalogue turned into the evolution bias.
    pub(crate) fn with_slope(self, is_slope: bool, epoch: &Epoch) -> Tracer {
        let Tracer { evolution_bias, magnification_bias, .. } = self;
        match is_slope {
            true => Tracer {
                evolution_bias: evolution_bias_of_slope(evolution_bias, magnification_bias, epoch),
                ..self
            },
            false => self,
        }
    }

    pub(crate) fn read(values: &[f64], start: usize) -> Tracer {
        Tracer {
            bias: values[start],
            magnification_bias: values[start + 1],
            evolution_bias: values[start + 2],
            bias_slope: values[start + 3],
        }
    }

    pub(crate) fn pair(values: &[f64], bin_start: usize) -> (Tracer, Tracer) {
        (Tracer::read(values, bin_start + slot::FIRST), Tracer::read(values, bin_start + slot::SECOND))
    }

    /// R_X of Δ_X = [b_X + f μ² + i μ (H/k) R_X] δ:
    ///
    /// ```text
    /// R_X = f [1 − H′/H − (2 − 5 s_X)/(r̃ H) − 5 s_X + e_X]     Doppler
    ///     + f′ + f H′/H + f²                                    acceleration
    ///     − (3/2) Ωm(a) T                                       gravitational redshift
    /// ```
    ///
    /// `time_distortion` is T, one in general relativity. Dimensionless.
    ///
    /// Source: Yoo 2010, PRD 82, 083508; Challinor & Lewis 2011, PRD 84, 043516; Jeong, Schmidt & Hirata 2012,
    /// PRD 85, 023504; T as in the conventions of this crate.
    #[must_use]
    pub fn response(
        &self,
        epoch: &Epoch,
        growth: &GrowthState,
        time_distortion: f64,
        effects: &Effects,
    ) -> f64 {
        let GrowthState { rate: f, rate_slope, .. } = *growth;
        let hubble_slope = epoch.conformal_hubble_slope;
        let five_s = 5.0 * self.magnification_bias;
        let mut response = 0.0;
        if effects.doppler {
            let geometry = (2.0 - five_s) / (epoch.reduced_distance * epoch.conformal_hubble);
            response += f * (1.0 - hubble_slope - geometry - five_s + self.evolution_bias);
        }
        if effects.acceleration {
            response += rate_slope + f * hubble_slope + f * f;
        }
        if effects.gravitational_redshift {
            response -= 1.5 * epoch.matter_fraction * time_distortion;
        }
        response
    }
}
