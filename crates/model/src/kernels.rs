//! Fixed kernels: what multiplies the coefficients of a model whose k-shapes are all held.

use crate::model::Model;
use crate::plan::Vector;
use crate::remapping::directions;
use crate::workspace::{Buffers, Workspace};
use nalgebra::DMatrix;

/// The prediction is `matrix × coefficients`.
#[derive(Clone, Debug)]
pub struct Kernels {
    /// Rows of the model × coefficients; Mpc/h and h/Mpc. A column is zero outside the rows of one multipole of one
    /// pair in one bin (where the bin is remapped: of all multipoles of one parity).
    pub matrix: DMatrix<f64>,
}

impl Model {
    /// All kernels for the workspace's spectrum and stretches.
    pub(crate) fn fill_kernels(&self, workspace: &mut Workspace) {
        let plan = self.plan();
        let length = self.knots().reached();
        let Workspace { buffers, spectrum, stretches, kernels, .. } = workspace;
        let spectrum = &spectrum[..length];
        let Buffers { vectors, chebyshev, stretched, directions: list, .. } = buffers;
        vectors.clear();
        vectors.resize(plan.vectors.len() * length, 0.0);
        let plain = plan.vectors.iter().zip(vectors.chunks_exact_mut(length.max(1)));
        for (vector, out) in plain.filter(|(vector, _)| vector.stretched.is_none()) {
            out.copy_from_slice(spectrum);
            self.multiply_power(vector.wavenumber, out);
        }
        if !plan.warps.is_empty() {
            chebyshev.resize(length, 0.0);
            stretched.resize(length, 0.0);
            self.knots().coefficients(spectrum, chebyshev);
        }
        for (index, warp) in plan.warps.iter().enumerate() {
            let Some(stretch) = stretches[warp.node] else { continue };
            directions(warp.space, stretch, list);
            let of_warp = |vector: &Vector| vector.stretched.filter(|it| it.warp == index);
            for direction in list.iter() {
                self.knots().scaled(chebyshev, 1.0 / direction.stretch, stretched);
                for (vector, out) in plan.vectors.iter().zip(vectors.chunks_exact_mut(length)) {
                    let Some(it) = of_warp(vector) else { continue };
                    add_scaled(
                        direction.weights[it.to][it.from] * direction.stretch.powi(it.power),
                        stretched,
                        out,
                    );
                }
            }
            for (vector, out) in plan.vectors.iter().zip(vectors.chunks_exact_mut(length)) {
                if of_warp(vector).is_some() {
                    self.multiply_power(vector.wavenumber, out);
                }
            }
        }
        kernels.clear();
        kernels.extend(plan.kernels.iter().map(|&(functional, vector)| {
            self.functionals().apply(functional, &vectors[vector * length..(vector + 1) * length])
        }));
    }

    /// Multiplies a function at the knots by a power of k.
    pub(crate) fn multiply_power(&self, power: i32, function: &mut [f64]) {
        if power != 0 {
            for (value, factor) in function.iter_mut().zip(self.knots().power(power)) {
                *value *= factor;
            }
        }
    }
}

/// out += factor × function.
pub(crate) fn add_scaled(factor: f64, function: &[f64], out: &mut [f64]) {
    for (total, value) in out.iter_mut().zip(function) {
        *total += factor * value;
    }
}
