//! Wavenumbers at which a k integral is sampled directly: that of a covariance, whose integrand is no polynomial between
//! the knots of a prediction.

use crate::model::{SMALLEST, end_of_integrals};
use oddwell_cosmology::gauss_legendre;
use std::f64::consts::PI;

/// Gauss–Legendre nodes a panel. With 16 nodes an oscillation through 16 radians is integrated to 1e-10.
const NODES: usize = 16;
const RADIANS: f64 = 16.0;
/// The acoustic feature oscillates in k with this length, Mpc/h, until Silk damping ends it.
const ACOUSTIC: f64 = 150.0;
const ACOUSTIC_END: f64 = 0.6;
/// No panel is wider than this in ln k.
const WIDEST: f64 = 0.35;

/// Wavenumbers (h/Mpc, increasing) and weights such that Σ weight·g(k) = ∫k²dk/2π² g(k).
#[derive(Clone, Debug)]
pub(crate) struct WavenumberGrid {
    pub(crate) wavenumbers: Vec<f64>,
    pub(crate) weights: Vec<f64>,
}

impl WavenumberGrid {
    /// A grid that resolves jₗ(ks) up to s = `largest_separation` and the acoustic feature. Panels are logarithmic
    /// where the spectrum is what varies, and linear (a fixed number of radians) where the Bessel function is.
    pub(crate) fn new(largest_separation: f64, damping: f64) -> WavenumberGrid {
        let rule = gauss_legendre(NODES);
        let end = end_of_integrals(damping);
        let (mut wavenumbers, mut weights) = (Vec::new(), Vec::new());
        let mut low = SMALLEST;
        while low < end {
            let acoustic = if low < ACOUSTIC_END { ACOUSTIC } else { 0.0 };
            let width = (RADIANS / (largest_separation + acoustic)).min(low * WIDEST.exp_m1());
            let high = if low + 1.05 * width < end { low + width } else { end };
            let (centre, half) = (0.5 * (low + high), 0.5 * (high - low));
            for (node, weight) in rule.nodes.iter().zip(&rule.weights) {
                let k = centre + half * node;
                wavenumbers.push(k);
                weights.push(half * weight * k * k / (2.0 * PI * PI));
            }
            low = high;
        }
        WavenumberGrid { wavenumbers, weights }
    }
}
