//! Geometric remapping: multipoles measured with distances of a fiducial background.
//!
//! A pair at fiducial separation (s, ν) is truly s∥ = α∥ sν along the line of sight and s⊥ = α⊥ s√(1−ν²) across, so at
//! distance qs in direction ν̃ = α∥ν/q with q² = α∥²ν² + α⊥²(1−ν²). Its multipoles are
//!
//! ```text
//! ξₗ(s) = (2l+1)/2 ∫dν Lₗ(ν) Σₘ Lₘ(ν̃) ξₘ(qs)
//! ```
//!
//! with the true ξₘ; shells are fiducial, so the average over s comes last. Every ξₘ is a sum of integrals
//! s^p ∫k²dk/2π² k^n W(k)P(k) jₗ(ks), and with κ = qk
//!
//! ```text
//! (qs)^p ∫k²dk/2π² k^n WP(k) jₗ(kqs) = q^(p−3) s^p ∫κ²dκ/2π² (κ/q)^n WP(κ/q) jₗ(κs):
//! ```
//!
//! the direction only stretches the spectrum. So the integral over ν is done on the spectrum at the knots, and what turns
//! that into numbers, shell averages included, stays as it is without remapping.
//!
//! In Fourier space k̃∥ = k∥/α∥, k̃⊥ = k⊥/α⊥ is the wavenumber k/q in direction ν̃ = νq/α∥, 1/q² = ν²/α∥² + (1−ν²)/α⊥², and
//! Pₗ(k) = (2l+1)/(2α∥α⊥²) ∫dν Lₗ(ν) Σₘ Lₘ(ν̃) Pₘ(k/q): the same thing with powers of q of its own (dP/dk̃ = q dP/dk).
//!
//! Source: Alcock & Paczynski 1979, Nature 281, 358; in multipoles Xu et al. 2013, MNRAS 431, 2834.

use crate::rows::Space;
use crate::terms::{Component, Readout};
use oddwell_cosmology::{Epoch, GaussLegendre, gauss_legendre, legendre};
use std::sync::LazyLock;

/// Largest stretch, either way, for which spectra of Fourier rows are tabulated.
pub(crate) const LARGEST_STRETCH: f64 = 1.6;

/// α∥ = H_fid/H and α⊥ = r/r_fid: true over fiducial separation along and across the line of sight.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Stretch {
    pub(crate) along: f64,
    pub(crate) across: f64,
}

impl Stretch {
    pub(crate) fn new(fiducial: &Epoch, truth: &Epoch) -> Stretch {
        Stretch {
            along: fiducial.conformal_hubble / truth.conformal_hubble,
            across: truth.transverse_distance / fiducial.transverse_distance,
        }
    }

    /// Whether neither stretch is beyond [`LARGEST_STRETCH`].
    pub(crate) fn is_tabulated(&self) -> bool {
        [self.along, self.across].iter().all(|alpha| alpha.ln().abs() <= LARGEST_STRETCH.ln())
    }
}

/// One direction ν of the integral (both signs of ν together).
#[derive(Clone, Copy, Debug)]
pub(crate) struct Direction {
    /// q: true over fiducial distance.
    pub(crate) stretch: f64,
    /// Weight of Lₗ(ν) Lₘ(ν̃), by l, then m; all factors in front included. Only l + m even.
    pub(crate) weights: [[f64; 5]; 5],
}

/// Rules of an even number of points, of which the positive half is used: with n of these, polynomials in ν of degree
/// 4n − 1. Products of Legendre functions have degree 8; the rest resolves how fast the spectrum changes with q: an
/// acoustic feature at k = 0.3 h/Mpc and 100 Mpc/h turns by 30 ln(α∥/α⊥) radians between ν = 0 and 1. In
/// Fourier space, where nothing else is that small, four points err by 4e-10 and the others by less than 1e-8.
static RULES: LazyLock<Vec<(f64, GaussLegendre)>> = LazyLock::new(|| {
    let sizes = [(0.02, 4), (0.08, 6), (0.2, 9), (f64::INFINITY, 24)];
    sizes.map(|(anisotropy, half)| (anisotropy, gauss_legendre(2 * half))).into()
});

/// The directions of the integral over ν.
pub(crate) fn directions(space: Space, stretch: Stretch, out: &mut Vec<Direction>) {
    let Stretch { along, across } = stretch;
    let anisotropy = (along / across).ln().abs();
    let rule = RULES.iter().find(|(limit, _)| anisotropy <= *limit).map(|(_, rule)| rule);
    out.clear();
    let points = rule.into_iter().flat_map(|rule| rule.nodes.iter().zip(&rule.weights));
    out.extend(points.filter(|(nu, _)| **nu > 0.0).map(|(&nu, &weight)| {
        let (cosine, sine) = (nu * nu, 1.0 - nu * nu);
        let (stretch, true_nu, front) = match space {
            Space::Separation => {
                let stretch = (along * along * cosine + across * across * sine).sqrt();
                (stretch, along * nu / stretch, 1.0)
            }
            Space::Fourier => {
                let stretch = 1.0 / (cosine / (along * along) + sine / (across * across)).sqrt();
                (stretch, nu * stretch / along, 1.0 / (along * across * across))
            }
        };
        let fiducial: [f64; 5] = std::array::from_fn(|l| legendre(l, nu) * (2 * l + 1) as f64);
        let truth: [f64; 5] = std::array::from_fn(|m| legendre(m, true_nu));
        let weights = fiducial.map(|left| truth.map(|right| front * weight * left * right));
        Direction { stretch, weights }
    }));
}

/// The power of q that goes with a component: (qs)^p of the separation, d³k, and (κ/q)^n; in Fourier space (k/q)^n, and
/// q for a derivative in the stretched wavenumber.
pub(crate) fn stretch_power(component: Component) -> i32 {
    match component.readout() {
        Readout::Transform { separation, .. } => separation as i32 - 3 - component.wavenumber(),
        Readout::Value => -component.wavenumber(),
        Readout::Slope => 1,
    }
}
