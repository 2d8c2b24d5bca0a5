//! Quantities that enter the coefficients linearly, and what a unit of each adds: for analyses that integrate over them in
//! closed form.

use crate::departures::{FeltBy, TAU};
use crate::error::ModelError;
use crate::layout::slot;
use crate::model::Model;
use crate::terms::Weights;
use crate::workspace::Workspace;
use std::collections::HashMap;

/// Components of an odd multipole, by their place, that a quantity of a bin reaches: the response R stands in the first,
/// the redshift offset in the second, lensing in the third, the light cone in the first (Fourier space), fourth and fifth.
const OF_RESPONSE: &[usize] = &[0];
const OF_OFFSET: &[usize] = &[1];
const OF_MAGNIFICATION: &[usize] = &[0, 2];
const OF_LIGHT_CONE: &[usize] = &[0, 3, 4];

/// Slots that enter linearly, and the coefficients that each moves. Made by [`Model::linear_slots`].
#[derive(Clone, Debug)]
pub struct LinearSlots {
    pattern: Vec<Vec<usize>>,
    starts: Vec<usize>,
    jobs: Vec<Job>,
}

/// One slot at one station (a node and what is predicted there).
#[derive(Clone, Debug)]
struct Job {
    station: usize,
    slot: usize,
    /// The pair's place in the station, and the entries that the pair contributes to.
    entries: Vec<(usize, Vec<Entry>)>,
}

/// A component of a group, and where its slope goes.
#[derive(Clone, Debug)]
struct Entry {
    group: usize,
    component: usize,
    to: usize,
}

impl LinearSlots {
    /// For each slot asked for, the coefficients that it moves, rising.
    #[must_use]
    pub fn pattern(&self) -> &[Vec<usize>] {
        &self.pattern
    }

    /// How many slopes [`Model::coefficient_slopes`] writes: those of the first slot's coefficients, then of the second's …
    #[must_use]
    pub fn len(&self) -> usize {
        self.pattern.iter().map(Vec::len).sum()
    }

    /// Whether no coefficient moves.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Where the slopes of a slot begin.
    #[must_use]
    pub fn start(&self, at: usize) -> usize {
        self.starts[at]
    }
}

impl Model {
    /// Whether every coefficient is an affine function of this quantity, and of all others for which this holds together,
    /// whatever the rest are: redshift offset, magnification bias, evolution bias, bias slope, a given growth slope, and the
    /// amplitude τ0 of a departure that light alone feels. No product of two of them occurs in a prediction. (With the
    /// growth given, its slope is one more; bias and growth rate enter squared.)
    #[must_use]
    pub fn enters_linearly(&self, index: usize) -> bool {
        self.has_kernels() && self.reach(index).is_some()
    }

    /// The components that a linear quantity reaches; `None` for any other.
    fn reach(&self, index: usize) -> Option<&'static [usize]> {
        let departure = self.layout().departure_slots();
        if departure.contains(&index) {
            let parameters = self.setup().departure.parameters();
            let parameter = (index - departure.start) % parameters.len();
            let linear = self.setup().felt_by == FeltBy::Light && parameters[parameter] == TAU;
            return linear.then_some(OF_RESPONSE);
        }
        let within = index.checked_sub(slot::COMMON.len())?;
        let (bin, within) = (within / slot::BIN.len(), within % slot::BIN.len());
        match within {
            slot::OFFSET => Some(OF_OFFSET),
            slot::GROWTH_SLOPE if self.setup().bins[bin].growth_given => Some(OF_LIGHT_CONE),
            _ => match slot::BIN[within].rsplit('.').next() {
                Some("magnification") => Some(OF_MAGNIFICATION),
                Some("evolution") => Some(OF_RESPONSE),
                Some("bias_slope") => Some(OF_LIGHT_CONE),
                _ => None,
            },
        }
    }

    /// Whether a quantity is one of this bin's, or of the departure as the bin has it.
    fn belongs_to(&self, index: usize, bin: usize) -> bool {
        let own = self.layout().bin(bin);
        let departure = self.layout().departure(bin);
        let parameters = self.setup().departure.parameters().len();
        (own..own + slot::BIN.len()).contains(&index) || (departure..departure + parameters).contains(&index)
    }

    /// Prepares slopes for these slots, each of which [`Model::enters_linearly`].
    ///
    /// # Errors
    /// [`ModelError::NotLinear`] for the first that does not.
    pub fn linear_slots(&self, slots: &[usize]) -> Result<LinearSlots, ModelError> {
        let plan = self.plan();
        let mut pattern: Vec<Vec<usize>> = Vec::with_capacity(slots.len());
        for &index in slots {
            let reach = self.reach(index).filter(|_| self.has_kernels());
            let reach =
                reach.ok_or_else(|| ModelError::NotLinear { name: self.layout().names()[index].clone() })?;
            let groups = plan
                .groups
                .iter()
                .filter(|group| group.multipole % 2 == 1 && self.belongs_to(index, group.bin));
            let mut moved: Vec<usize> = groups
                .flat_map(|group| {
                    let within = reach.iter().filter(|component| **component < group.components.len());
                    within.map(|component| group.start + component)
                })
                .collect();
            moved.sort_unstable();
            pattern.push(moved);
        }
        let starts: Vec<usize> = pattern
            .iter()
            .scan(0, |next, moved| {
                let start = *next;
                *next += moved.len();
                Some(start)
            })
            .collect();
        let mut jobs = Vec::new();
        for (at, &index) in slots.iter().enumerate() {
            let place: HashMap<usize, usize> =
                pattern[at].iter().enumerate().map(|(within, of)| (*of, starts[at] + within)).collect();
            let place = &place;
            for (station, here) in plan.stations.iter().enumerate() {
                let entries = here.pairs.iter().enumerate().map(|(pair, (_, groups))| {
                    let entries = groups.iter().flat_map(|&group| {
                        let start = plan.groups[group].start;
                        let count = plan.groups[group].components.len();
                        let to = move |component: usize| Some((component, *place.get(&(start + component))?));
                        (0..count).filter_map(to).map(move |(component, to)| Entry { group, component, to })
                    });
                    (pair, entries.collect::<Vec<_>>())
                });
                let entries: Vec<_> = entries.filter(|(_, entries)| !entries.is_empty()).collect();
                let here = self.belongs_to(index, plan.nodes[here.node].bin);
                if here && !entries.is_empty() {
                    jobs.push(Job { station, slot: index, entries });
                }
            }
        }
        // Station by station, so that the unperturbed weights are worked out once for all slots.
        jobs.sort_by_key(|job| job.station);
        Ok(LinearSlots { pattern, starts, jobs })
    }

    /// ∂coefficient/∂slot of every prepared slot and every coefficient that it moves: exact to rounding, as differences of an
    /// affine function over one unit. [`Model::coefficients`] has been called for the same `values` and `workspace`, in
    /// which nothing is allocated; `values` come back as they were.
    ///
    /// Accuracy: 2⁻⁵² of the larger of the coefficient and its slope.
    pub fn coefficient_slopes(
        &self,
        values: &mut [f64],
        workspace: &Workspace,
        slots: &LinearSlots,
        out: &mut [f64],
    ) {
        out.fill(0.0);
        let plan = self.plan();
        let effects = &self.setup().effects;
        for jobs in slots.jobs.chunk_by(|one, other| one.station == other.station) {
            let station = &plan.stations[jobs[0].station];
            let node = station.node;
            let growth = workspace.growth.at_node(node);
            let distortion = self.time_distortion(values, workspace, node, 0.0);
            let state = self.state(values, workspace, node, growth, distortion);
            let amplitude = self.amplitude(values, node, &state);
            // Three pairs at most: first-second, first-first, second-second.
            let mut before: [Option<Weights>; 3] = [None; 3];
            for job in jobs {
                let departs = self.layout().departure_slots().contains(&job.slot);
                let kept = values[job.slot];
                values[job.slot] = kept + 1.0;
                let distortion =
                    if departs { self.time_distortion(values, workspace, node, 0.0) } else { distortion };
                let moved = self.state(values, workspace, node, growth, distortion);
                values[job.slot] = kept;
                for (pair, entries) in &job.entries {
                    let of = station.pairs[*pair].0;
                    let before =
                        before[*pair].get_or_insert_with(|| Weights::new(&state.pair(of, effects), effects));
                    let after = Weights::new(&moved.pair(of, effects), effects);
                    let mut group = usize::MAX;
                    let (mut old, mut new) = ([0.0; crate::terms::MOST], [0.0; crate::terms::MOST]);
                    for entry in entries {
                        if entry.group != group {
                            group = entry.group;
                            let group = &plan.groups[group];
                            old = before.of(group.space, group.multipole);
                            new = after.of(group.space, group.multipole);
                        }
                        out[entry.to] += amplitude * (new[entry.component] - old[entry.component]);
                    }
                }
            }
        }
    }
}
