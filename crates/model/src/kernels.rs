//! Fixed kernels: what multiplies the coefficients of a model whose k-shapes are all held.

use crate::abscissa::ShellTable;
use crate::model::Model;
use crate::terms::Component;
use crate::workspace::Spectra;
use nalgebra::DMatrix;

/// The prediction is `matrix × coefficients`.
#[derive(Clone, Debug)]
pub struct Kernels {
    /// Rows of the model × coefficients; Mpc/h and h/Mpc. A column is zero outside the rows of one multipole of one
    /// pair in one bin.
    pub matrix: DMatrix<f64>,
}

/// Points beside each Fourier wavenumber for dP/dk: k(1 ± h) and k(1 ± 2h), relative step h. The five-point rule errs by
/// h⁴/30 of the fifth derivative: 1e-9 of dP/dk for an acoustic feature at 0.3 h/Mpc.
pub(crate) const STEP: f64 = 1e-3;
pub(crate) const STENCIL: [f64; 5] = [0.0, -2.0, -1.0, 1.0, 2.0];

/// dg/dk from values of g at `k (1 + STEP × STENCIL)`.
pub(crate) fn slope(values: &[f64], k: f64) -> f64 {
    (values[1] - 8.0 * values[2] + 8.0 * values[3] - values[4]) / (12.0 * STEP * k)
}

/// A spectrum's integrals at one abscissa: Σ weight × power of k × P × Bessel table, or the average over a Fourier bin.
pub(crate) struct Integrals<'a> {
    pub(crate) table: Option<&'a ShellTable>,
    /// Fourier rows: wavenumber, weight, and the start of its stencil in the Fourier spectrum.
    pub(crate) points: &'a [(f64, f64, usize)],
}

impl Integrals<'_> {
    /// The component's integral over `spectrum`, already multiplied by the component's power of k where it is a
    /// transform; `fourier` is P on the Fourier wavenumbers and their stencils.
    pub(crate) fn of(&self, component: Component, weighted: &[f64], fourier: &[f64]) -> f64 {
        match (component, self.table) {
            (Component::Transform { separation, order, .. }, Some(table)) => {
                dot(weighted, table.get(separation, order))
            }
            (Component::Power { wavenumber }, _) => self
                .points
                .iter()
                .map(|&(k, weight, start)| weight * k.powi(wavenumber) * fourier[start])
                .sum(),
            (Component::Slope, _) => self
                .points
                .iter()
                .map(|&(k, weight, start)| weight * slope(&fourier[start..start + STENCIL.len()], k))
                .sum(),
            // `Model::new` makes a table for every separation.
            (Component::Transform { .. }, None) => f64::NAN,
        }
    }
}

/// Σ xᵢ yᵢ in four running sums, so that the processor can overlap them.
pub(crate) fn dot(x: &[f64], y: &[f64]) -> f64 {
    let mut sums = [0.0; 4];
    let (x_chunks, y_chunks) = (x.chunks_exact(4), y.chunks_exact(4));
    let rest: f64 = x_chunks.remainder().iter().zip(y_chunks.remainder()).map(|(a, b)| a * b).sum();
    for (a, b) in x_chunks.zip(y_chunks) {
        for lane in 0..4 {
            sums[lane] += a[lane] * b[lane];
        }
    }
    sums.iter().sum::<f64>() + rest
}

impl Model {
    /// All (abscissa, component) integrals for a spectrum.
    pub(crate) fn fill_kernels(&self, spectra: &Spectra, kernels: &mut Vec<f64>) {
        let weighted = self.weighted_by_powers(&spectra.grid);
        kernels.clear();
        kernels.extend(self.kernel_kinds().iter().map(|&(abscissa, component)| {
            let row = match component {
                Component::Transform { wavenumber, .. } => &weighted[(wavenumber + 2) as usize],
                _ => &weighted[2],
            };
            self.integrals(abscissa).of(component, row, &spectra.fourier)
        }));
    }

    /// k⁻²P, k⁻¹P, P and kP on the grid.
    fn weighted_by_powers(&self, spectrum: &[f64]) -> [Vec<f64>; 4] {
        std::array::from_fn(|power| {
            let wavenumbers = self.grid_wavenumbers().iter().zip(spectrum);
            wavenumbers.map(|(k, value)| k.powi(power as i32 - 2) * value).collect()
        })
    }
}
