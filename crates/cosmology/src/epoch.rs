//! One redshift of a background.

use std::f64::consts::PI;

use crate::background::{Background, HUBBLE_DISTANCE};
use crate::errors::CosmologyError;

/// The background at one redshift. Distances in Mpc/h, the conformal Hubble rate in h/Mpc.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Epoch {
    /// z, above 0.
    pub redshift: f64,
    /// a = 1/(1+z).
    pub scale_factor: f64,
    /// Conformal Hubble rate H = a E/2997.92458, h/Mpc.
    pub conformal_hubble: f64,
    /// H′/H = 1 + d ln E/d ln a.
    pub conformal_hubble_slope: f64,
    /// E = proper Hubble rate over today's.
    pub expansion: f64,
    /// d ln E/d ln a.
    pub expansion_slope: f64,
    /// χ, Mpc/h.
    pub comoving_distance: f64,
    /// r, Mpc/h.
    pub transverse_distance: f64,
    /// C = dr/dχ = √(1 + Ωk (r/2997.92458)²); at and beyond the equator of a closed universe 0 and negative.
    pub distance_slope: f64,
    /// r̃ = r/C, Mpc/h: 1/r̃ = d ln r/dχ.
    pub reduced_distance: f64,
    /// Ωm(a).
    pub matter_fraction: f64,
    /// d ln Ωm(a)/d ln a.
    pub matter_fraction_slope: f64,
    /// Ωde(a).
    pub dark_energy_fraction: f64,
}

impl Epoch {
    /// See [`Background::epoch`].
    pub fn new(background: &Background, redshift: f64) -> Result<Self, CosmologyError> {
        if !(redshift > 0.0 && redshift.is_finite()) {
            return Err(CosmologyError::OutOfRange {
                name: "redshift",
                value: redshift,
                rule: "above 0 and finite",
                way_out: "give the pair-weighted mean redshift of the bin",
            });
        }
        let a = 1.0 / (1.0 + redshift);
        if let Some((at, value)) = background.missing_past(a) {
            return Err(CosmologyError::NoExpansion { redshift: 1.0 / at - 1.0, value, asked: redshift });
        }
        let comoving_distance = background.comoving_distance(redshift);
        if background.omega_k < 0.0 {
            let antipode = PI * HUBBLE_DISTANCE / (-background.omega_k).sqrt();
            if comoving_distance >= antipode {
                return Err(CosmologyError::BeyondAntipode {
                    redshift,
                    distance: comoving_distance,
                    antipode,
                    omega_k: background.omega_k,
                });
            }
        }
        let (transverse_distance, distance_slope) = background.curve(comoving_distance);
        let expansion = background.expansion(a);
        let expansion_slope = background.expansion_slope(a);
        Ok(Self {
            redshift,
            scale_factor: a,
            conformal_hubble: a * expansion / HUBBLE_DISTANCE,
            conformal_hubble_slope: 1.0 + expansion_slope,
            expansion,
            expansion_slope,
            comoving_distance,
            transverse_distance,
            distance_slope,
            reduced_distance: transverse_distance / distance_slope,
            matter_fraction: background.matter_fraction(a),
            matter_fraction_slope: background.matter_fraction_slope(a),
            dark_energy_fraction: background.dark_energy_fraction(a),
        })
    }
}
