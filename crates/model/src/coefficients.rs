//! The coefficients of the kernels: what of a prediction does not depend on k.

use crate::error::ModelError;
use crate::layout::slot;
use crate::model::Model;
use crate::setup::Effects;
use crate::state::BinState;
use crate::terms::Weights;
use crate::tracer::Tracer;
use crate::workspace::Workspace;
use oddwell_cosmology::GrowthState;

impl Model {
    /// The coefficients of the given effects, growth being up to date. Nothing is allocated, and a node's state is worked
    /// out once for all pairs and multipoles: this is what most fits spend their time in.
    pub(crate) fn fill_coefficients(
        &self,
        values: &[f64],
        workspace: &Workspace,
        effects: &Effects,
        out: &mut [f64],
    ) -> Result<(), ModelError> {
        self.check_departure(values)?;
        out.fill(0.0);
        let plan = self.plan();
        for station in &plan.stations {
            let node = station.node;
            let distortion = self.time_distortion(values, workspace, node, 0.0);
            let state = self.state(values, workspace, node, workspace.growth.at_node(node), distortion);
            let amplitude = self.amplitude(values, node, &state);
            for (pair, groups) in &station.pairs {
                let weights = Weights::new(&state.pair(*pair, effects), effects);
                for &group in groups {
                    let group = &plan.groups[group];
                    let weights = weights.of(group.space, group.multipole);
                    let part = &mut out[group.start..group.start + group.components.len()];
                    for (total, weight) in part.iter_mut().zip(weights) {
                        *total += amplitude * weight;
                    }
                }
            }
        }
        // One pass over all is cheaper than a look at each: a sum is finite if all are (or, once in a blue moon, not).
        if !out.iter().sum::<f64>().is_finite() {
            for group in &plan.groups {
                let part = &out[group.start..group.start + group.components.len()];
                if let Some(&value) = part.iter().find(|value| !value.is_finite()) {
                    return Err(self.not_finite("coefficient", group.bin, value));
                }
            }
        }
        Ok(())
    }

    /// What multiplies weights and spectrum at a node: its share of the bin, and (D σ8)².
    pub(crate) fn amplitude(&self, values: &[f64], node: usize, state: &BinState) -> f64 {
        let field = state.growth.growth * values[slot::SIGMA8];
        self.plan().nodes[node].weight * field * field
    }

    /// The state of a node with the growth of general relativity, of the departure, or as given.
    pub(crate) fn state(
        &self,
        values: &[f64],
        workspace: &Workspace,
        node: usize,
        growth: GrowthState,
        time_distortion: f64,
    ) -> BinState {
        let bin = self.plan().nodes[node].bin;
        let definition = &self.setup().bins[bin];
        let start = self.layout().bin(bin);
        let growth = if definition.growth_given {
            GrowthState {
                rate: values[start + slot::GROWTH_RATE],
                rate_slope: values[start + slot::GROWTH_SLOPE],
                ..growth
            }
        } else {
            growth
        };
        let (first, second) = Tracer::pair(values, start);
        let epoch = workspace.epochs[node];
        let [first_slope, second_slope] = definition.observed_slopes;
        BinState {
            epoch,
            growth,
            time_distortion,
            first: first.with_slope(first_slope, &epoch),
            second: second.with_slope(second_slope, &epoch),
            offset: values[start + slot::OFFSET],
            sight_line: definition.sight_line,
        }
    }

    /// The departure's values for a bin.
    fn departure_values<'a>(&self, values: &'a [f64], bin: usize) -> &'a [f64] {
        let first = self.layout().departure(bin);
        &values[first..first + self.setup().departure.parameters().len()]
    }

    /// T at a node and wavenumber.
    pub(crate) fn time_distortion(&self, values: &[f64], workspace: &Workspace, node: usize, k: f64) -> f64 {
        match workspace.background {
            Some(background) if self.setup().felt_by.reaches_light() => {
                let parameters = self.departure_values(values, self.plan().nodes[node].bin);
                let a = workspace.epochs[node].scale_factor;
                1.0 + self.setup().departure.tau(parameters, &background, a, k)
            }
            _ => 1.0,
        }
    }

    /// T at a node and many wavenumbers.
    pub(crate) fn time_distortions(
        &self,
        values: &[f64],
        workspace: &Workspace,
        node: usize,
        wavenumbers: &[f64],
        out: &mut [f64],
    ) {
        match workspace.background {
            Some(background) if self.setup().felt_by.reaches_light() => {
                let parameters = self.departure_values(values, self.plan().nodes[node].bin);
                let a = workspace.epochs[node].scale_factor;
                self.setup().departure.taus(parameters, &background, a, wavenumbers, out);
                out.iter_mut().for_each(|value| *value += 1.0);
            }
            _ => out.fill(1.0),
        }
    }

    /// Checks the departure's values in every bin.
    pub(crate) fn check_departure(&self, values: &[f64]) -> Result<(), ModelError> {
        (0..self.setup().bins.len())
            .try_for_each(|bin| self.setup().departure.check(self.departure_values(values, bin)))
    }
}
