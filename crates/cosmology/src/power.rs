//! The linear power spectrum of matter at z = 0, normalised to σ8.

use std::f64::consts::PI;
use std::sync::{Arc, LazyLock};

use crate::bessel::spherical_bessel;
use crate::errors::CosmologyError;
use crate::quadrature::{GaussLegendre, composite};
use crate::transfer::{EisensteinHu, EisensteinHuSmooth, PowerShape, PowerTable};

/// Radius of the top-hat sphere of σ8, Mpc/h.
pub const SIGMA8_RADIUS: f64 = 8.0;

/// P_lin(k), today's in general relativity.
#[derive(Clone, Debug)]
pub struct LinearPower {
    shape: Shape,
    spectral_index: f64,
    amplitude: f64,
    sigma8: f64,
}

#[derive(Clone, Debug)]
enum Shape {
    EisensteinHu(EisensteinHu),
    EisensteinHuSmooth(EisensteinHuSmooth),
    Table(Arc<PowerTable>),
}

impl Shape {
    /// Power of arbitrary amplitude.
    fn power(&self, k: f64, spectral_index: f64) -> f64 {
        let transfer = match self {
            Shape::EisensteinHu(fit) => fit.transfer(k),
            Shape::EisensteinHuSmooth(fit) => fit.transfer(k),
            Shape::Table(table) => return table.power(k),
        };
        k.powf(spectral_index) * transfer * transfer
    }
}

/// The weight of P in σ² = ∫k²dk/2π² P W², at fixed wavenumbers, for the shapes that have no range of their own.
static VARIANCE_RULE: LazyLock<GaussLegendre> = LazyLock::new(|| {
    let mut edges: Vec<f64> = (0..=26)
        .map(|i| 1e-6 * (0.02f64 / 1e-6).powf(i as f64 / 26.0))
        .collect();
    let width = PI / SIGMA8_RADIUS;
    edges.extend((1..=8).map(|i| 0.02 + (width - 0.02) * i as f64 / 8.0));
    edges.extend((2..=400).map(|i| i as f64 * width));
    let mut rule = composite(&edges, 8);
    for (k, weight) in rule.nodes.iter().zip(&mut rule.weights) {
        *weight *= variance_kernel(*k);
    }
    rule
});

/// k²/2π² W(kR)², with W(x) = 3 j₁(x)/x.
fn variance_kernel(k: f64) -> f64 {
    let x = k * SIGMA8_RADIUS;
    let window = 3.0 * spherical_bessel(1, x) / x;
    k * k / (2.0 * PI * PI) * window * window
}

impl LinearPower {
    /// Normalises the shape so that a top-hat sphere of 8 Mpc/h has the rms `sigma8`.
    pub fn new(
        shape: &PowerShape,
        omega_m: f64,
        omega_b: f64,
        h: f64,
        n_s: f64,
        sigma8: f64,
    ) -> Result<Self, CosmologyError> {
        if !n_s.is_finite() {
            return Err(CosmologyError::OutOfRange {
                name: "n_s",
                value: n_s,
                rule: "finite",
                way_out: "give the slope of the primordial power, such as 0.965",
            });
        }
        check_sigma8(sigma8)?;
        let shape = match shape {
            PowerShape::EisensteinHu => Shape::EisensteinHu(EisensteinHu::new(omega_m, omega_b, h)?),
            PowerShape::EisensteinHuSmooth => {
                Shape::EisensteinHuSmooth(EisensteinHuSmooth::new(omega_m, omega_b, h)?)
            }
            PowerShape::Table(table) => Shape::Table(Arc::clone(table)),
        };
        let variance = match &shape {
            Shape::Table(table) => table_variance(table),
            _ => VARIANCE_RULE.integrate(|k| shape.power(k, n_s)),
        };
        Ok(Self {
            shape,
            spectral_index: n_s,
            amplitude: sigma8 * sigma8 / variance,
            sigma8,
        })
    }

    /// P(k) in (Mpc/h)³ for k > 0 in h/Mpc; NaN outside a table ([`LinearPower::tabulate`] says so instead).
    pub fn power(&self, k: f64) -> f64 {
        self.amplitude * self.shape.power(k, self.spectral_index)
    }

    /// P at each of `k`, into `out`.
    ///
    /// # Errors
    /// `out` of another length; a wavenumber that is not above 0 or lies outside a table (the error names the range needed).
    pub fn tabulate(&self, k: &[f64], out: &mut [f64]) -> Result<(), CosmologyError> {
        if k.len() != out.len() {
            return Err(CosmologyError::Length {
                what: "powers",
                given: out.len(),
                wanted: k.len(),
            });
        }
        if let Some(&bad) = k.iter().find(|&&k| !(k > 0.0 && k.is_finite())) {
            return Err(CosmologyError::OutOfRange {
                name: "wavenumber",
                value: bad,
                rule: "above 0 and finite",
                way_out: "give it in h/Mpc",
            });
        }
        if let Some((low, high)) = self.range() {
            if let Some(&outside) = k.iter().find(|&k| !(low..=high).contains(k)) {
                return Err(CosmologyError::OutsideTable {
                    wavenumber: outside,
                    low,
                    high,
                    needed_low: k.iter().copied().fold(f64::INFINITY, f64::min),
                    needed_high: k.iter().copied().fold(0.0, f64::max),
                });
            }
        }
        for (out, &k) in out.iter_mut().zip(k) {
            *out = self.power(k);
        }
        Ok(())
    }

    /// The wavenumbers that a table covers, h/Mpc; `None` where the shape is defined for all.
    pub fn range(&self) -> Option<(f64, f64)> {
        match &self.shape {
            Shape::Table(table) => Some(table.range()),
            _ => None,
        }
    }

    /// The same shape with another σ8 (above 0), without integrating again.
    pub fn rescaled(&self, sigma8: f64) -> Self {
        let ratio = sigma8 / self.sigma8;
        Self {
            amplitude: self.amplitude * ratio * ratio,
            sigma8,
            ..self.clone()
        }
    }

    /// The rms of a top-hat sphere of 8 Mpc/h.
    pub fn sigma8(&self) -> f64 {
        self.sigma8
    }
}

fn check_sigma8(sigma8: f64) -> Result<(), CosmologyError> {
    if sigma8 > 0.0 && sigma8.is_finite() {
        return Ok(());
    }
    Err(CosmologyError::OutOfRange {
        name: "sigma8",
        value: sigma8,
        rule: "above 0 and finite",
        way_out: "give the rms of matter in spheres of 8 Mpc/h, such as 0.81",
    })
}

/// σ² of a table over its own range: between two entries ln P is a cubic, so panels end at the entries, and are cut further
/// where W² oscillates within one.
fn table_variance(table: &PowerTable) -> f64 {
    let mut edges = vec![table.range().0];
    for pair in table.log_wavenumbers().windows(2) {
        let (low, high) = (pair[0].exp(), pair[1].exp());
        let pieces = ((high - low) * SIGMA8_RADIUS / PI)
            .ceil()
            .max(((pair[1] - pair[0]) / 0.4).ceil());
        let pieces = pieces.max(1.0) as usize;
        edges.extend((1..=pieces).map(|i| (pair[0] + (pair[1] - pair[0]) * i as f64 / pieces as f64).exp()));
    }
    composite(&edges, 8).integrate(|k| table.log_power(k.ln()).exp() * variance_kernel(k))
}
