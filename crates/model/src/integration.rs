//! The prediction with every coefficient inside its k integral, as a function of k.

use crate::error::ModelError;
use crate::kernels::add_scaled;
use crate::model::Model;
use crate::remapping::directions;
use crate::setup::Effects;
use crate::terms::Weights;
use crate::workspace::{Buffers, Workspace};

impl Model {
    /// The prediction of the given effects, growth and spectrum being up to date.
    pub(crate) fn integrate(
        &self,
        values: &[f64],
        workspace: &mut Workspace,
        effects: &Effects,
        out: &mut [f64],
    ) -> Result<(), ModelError> {
        self.check_departure(values)?;
        self.fill_integrands(values, workspace, effects);
        out.fill(0.0);
        let length = self.knots().reached();
        let plan = self.plan();
        let Buffers { vectors, integrands, chebyshev, stretched, directions: list, .. } =
            &mut workspace.buffers;
        vectors.clear();
        vectors.resize(plan.combinations.len() * length, 0.0);
        for (combination, vector) in plan.combinations.iter().zip(vectors.chunks_exact_mut(length)) {
            for part in combination.parts.iter().filter(|part| part.vector.stretched.is_none()) {
                let integrand = &integrands[part.coefficient * length..(part.coefficient + 1) * length];
                let factors = self.knots().power(part.vector.wavenumber);
                for ((total, value), factor) in vector.iter_mut().zip(integrand).zip(factors) {
                    *total += value * factor;
                }
            }
        }
        for (index, warp) in plan.warps.iter().enumerate() {
            let Some(stretch) = workspace.stretches[warp.node] else { continue };
            directions(warp.space, stretch, list);
            chebyshev.resize(length, 0.0);
            stretched.resize(length, 0.0);
            for &coefficient in &plan.coefficients_of_warp[index] {
                self.knots()
                    .coefficients(&integrands[coefficient * length..(coefficient + 1) * length], chebyshev);
                for direction in list.iter() {
                    self.knots().scaled(chebyshev, 1.0 / direction.stretch, stretched);
                    self.multiply_power(plan.wavenumbers[coefficient], stretched);
                    for &(combination, it) in &plan.uses[coefficient] {
                        let factor = direction.weights[it.to][it.from] * direction.stretch.powi(it.power);
                        let vector = &mut vectors[combination * length..(combination + 1) * length];
                        add_scaled(factor, stretched, vector);
                    }
                }
            }
        }
        for (combination, vector) in plan.combinations.iter().zip(vectors.chunks_exact(length)) {
            for &(row, functional) in &combination.rows {
                out[row] += self.functionals().apply(functional, vector);
            }
        }
        Ok(())
    }

    /// Coefficients × spectrum at the knots.
    fn fill_integrands(&self, values: &[f64], workspace: &mut Workspace, effects: &Effects) {
        let length = self.knots().reached();
        let plan = self.plan();
        let wavenumbers = &self.knots().wavenumbers().values()[..length];
        let mut integrands = std::mem::take(&mut workspace.buffers.integrands);
        let mut distortion = std::mem::take(&mut workspace.buffers.distortion);
        integrands.clear();
        integrands.resize(plan.coefficients * length, 0.0);
        distortion.resize(length, 1.0);
        for station in &plan.stations {
            self.time_distortions(values, workspace, station.node, wavenumbers, &mut distortion);
            for knot in 0..length {
                let growth = workspace.growth.at_knot(station.node, knot);
                let state = self.state(values, workspace, station.node, growth, distortion[knot]);
                let amplitude = self.amplitude(values, station.node, &state) * workspace.spectrum[knot];
                for (pair, groups) in &station.pairs {
                    let weights = Weights::new(&state.pair(*pair, effects), effects);
                    for &group in groups {
                        let group = &plan.groups[group];
                        let weights = weights.of(group.space, group.multipole);
                        for (offset, weight) in weights[..group.components.len()].iter().enumerate() {
                            integrands[(group.start + offset) * length + knot] += amplitude * weight;
                        }
                    }
                }
            }
        }
        workspace.buffers.integrands = integrands;
        workspace.buffers.distortion = distortion;
    }
}
