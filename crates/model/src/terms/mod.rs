//! The terms of a multipole, one effect a file, and how they become coefficients of kernels.
//!
//! Every odd multipole, in either space, is a sum of five integrands whose weights are [`Amplitudes`]: powers of k times
//! P, and three functions that carry a factor s (or a derivative in k). The weights multiply P(k) at the bin's redshift;
//! where growth depends on scale they are functions of k, and nothing else changes.

mod kaiser;
mod lensing;
mod light_cone;
mod offset;
mod relativistic;
mod wide_angle;

use crate::rows::Space;
use crate::setup::Effects;
use crate::state::PairState;
use kaiser::even;

/// Most integrands that one multipole has.
pub(crate) const MOST: usize = 5;

/// The weights of P in the spectra of one pair.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Amplitudes {
    /// Im P₁ and Im P₃: weight of P/k.
    pub(crate) inverse: [f64; 2],
    /// Im P₁ and Im P₃: weight of k P.
    pub(crate) linear: [f64; 2],
    /// Im P₁ and Im P₃: weight of P/k².
    pub(crate) inverse_square: [f64; 2],
    /// Wide angle: C₂ and C₄ (g = C₂ P, h = C₄ P), h/Mpc.
    pub(crate) wide: [f64; 2],
    /// Light cone: weights of A, B and N, h/Mpc.
    pub(crate) cone: [f64; 3],
}

impl Amplitudes {
    fn new(pair: &PairState, even: &[f64; 3], effects: &Effects) -> Amplitudes {
        let mut amplitudes = Amplitudes::default();
        relativistic::add(pair, &mut amplitudes);
        offset::add(pair, even, &mut amplitudes);
        if effects.wide_angle {
            wide_angle::add(pair, &mut amplitudes);
        }
        if effects.light_cone {
            light_cone::add(pair, &mut amplitudes);
        }
        if effects.lensing {
            lensing::add(pair, &mut amplitudes);
        }
        amplitudes
    }
}

/// One integrand of a multipole.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(crate) enum Component {
    /// `s^separation ∫k²dk/2π² k^wavenumber P(k) j_order(ks)`, with its shell average.
    Transform { wavenumber: i32, separation: usize, order: usize },
    /// `k^wavenumber P(k)`, with its shell average.
    Power { wavenumber: i32 },
    /// `dP/dk`, with its shell average.
    Slope,
}

/// What a component takes from its power of k times P.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(crate) enum Readout {
    /// `s^separation ∫k²dk/2π² g(k) j_order(ks)`, averaged over a shell.
    Transform { separation: usize, order: usize },
    /// g(k), averaged over a Fourier bin.
    Value,
    /// dg/dk, averaged over a Fourier bin.
    Slope,
}

impl Component {
    /// The power of k that multiplies P, −2 to 1.
    pub(crate) fn wavenumber(self) -> i32 {
        match self {
            Component::Transform { wavenumber, .. } | Component::Power { wavenumber } => wavenumber,
            Component::Slope => 0,
        }
    }

    pub(crate) fn readout(self) -> Readout {
        match self {
            Component::Transform { separation, order, .. } => Readout::Transform { separation, order },
            Component::Power { .. } => Readout::Value,
            Component::Slope => Readout::Slope,
        }
    }
}

/// The integrands of a multipole, in the order of [`Weights::of`].
pub(crate) fn components(space: Space, multipole: u8) -> &'static [Component] {
    use Component::{Power, Slope, Transform};
    const fn transform(wavenumber: i32, separation: usize, order: usize) -> Component {
        Transform { wavenumber, separation, order }
    }
    const ODD: [Component; 4] =
        [Power { wavenumber: -1 }, Power { wavenumber: 1 }, Power { wavenumber: -2 }, Slope];
    match (space, multipole) {
        (Space::Separation, 0) => const { &[transform(0, 0, 0)] },
        (Space::Separation, 2) => const { &[transform(0, 0, 2)] },
        (Space::Separation, 4) => const { &[transform(0, 0, 4)] },
        (Space::Separation, 1) => {
            const {
                &[
                    transform(-1, 0, 1),
                    transform(1, 0, 1),
                    transform(-2, 0, 1),
                    transform(0, 1, 0),
                    transform(0, 1, 2),
                ]
            }
        }
        (Space::Separation, _) => {
            const {
                &[
                    transform(-1, 0, 3),
                    transform(1, 0, 3),
                    transform(-2, 0, 3),
                    transform(0, 1, 2),
                    transform(0, 1, 4),
                ]
            }
        }
        (Space::Fourier, 0 | 2 | 4) => const { &[Power { wavenumber: 0 }] },
        (Space::Fourier, _) => &ODD,
    }
}

/// The weights of all multipoles of one pair.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Weights {
    even: [f64; 3],
    amplitudes: Amplitudes,
}

impl Weights {
    pub(crate) fn new(pair: &PairState, effects: &Effects) -> Weights {
        let even = even(pair);
        Weights { even, amplitudes: Amplitudes::new(pair, &even, effects) }
    }

    /// The weights of [`components`]: the multipole is Σ weight × component.
    ///
    /// ξ₁ = ⟦Im P₁⟧₁, ξ₃ = −⟦Im P₃⟧₃, ξ₀ = ⟦P₀⟧₀, ξ₂ = −⟦P₂⟧₂, ξ₄ = ⟦P₄⟧₄ with ⟦g⟧ₗ(s) = ∫k²dk/2π² g(k) jₗ(ks); the
    /// terms with a factor s (or a derivative of P) follow the formulas quoted in `wide_angle` and `light_cone`.
    pub(crate) fn of(&self, space: Space, multipole: u8) -> [f64; MOST] {
        if multipole.is_multiple_of(2) {
            let value = self.even[usize::from(multipole) / 2];
            let sign = if space == Space::Separation && multipole == 2 { -1.0 } else { 1.0 };
            return [sign * value, 0.0, 0.0, 0.0, 0.0];
        }
        let Amplitudes { inverse, linear, inverse_square, wide, cone } = self.amplitudes;
        let [quadrupole, hexadecapole] = wide;
        let [a, b, n] = cone;
        match (space, multipole) {
            (Space::Separation, 1) => [inverse[0], linear[0], inverse_square[0], a, quadrupole - 0.4 * b],
            (Space::Separation, _) => [
                -inverse[1],
                -linear[1],
                -inverse_square[1],
                -quadrupole - 0.6 * b,
                hexadecapole + 32.0 / 315.0 * n,
            ],
            (Space::Fourier, 1) => [
                inverse[0] + 3.0 * quadrupole - 1.2 * b,
                linear[0],
                inverse_square[0],
                quadrupole - a - 0.4 * b,
                0.0,
            ],
            (Space::Fourier, _) => [
                inverse[1] + 2.0 * quadrupole - 5.0 * hexadecapole + 1.2 * b - 32.0 / 63.0 * n,
                linear[1],
                inverse_square[1],
                -quadrupole - hexadecapole - 0.6 * b - 32.0 / 315.0 * n,
                0.0,
            ],
        }
    }
}

#[cfg(test)]
mod tests;
