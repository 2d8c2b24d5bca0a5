//! What one thread keeps between predictions, and recomputes only as far as the changed quantities require.

use crate::error::ModelError;
use crate::growth::{Growth, Law};
use crate::layout::slot;
use crate::model::Model;
use crate::remapping::{Direction, Stretch};
use oddwell_cosmology::{Background, Epoch};

/// Reusable storage of one thread: backgrounds, growth, spectra and kernels of the last prediction, with the quantities
/// they were made from. Stage after stage is recomputed only if a quantity it depends on has changed, and once the first
/// prediction has been made nothing is allocated (but by a growth index, a closed universe's check of its past, and growth
/// that needs the adaptive solver). A workspace serves one model.
#[derive(Clone, Debug, Default)]
pub struct Workspace {
    background_key: Vec<f64>,
    pub(crate) background: Option<Background>,
    pub(crate) epochs: Vec<Epoch>,
    /// α∥ and α⊥ at each node that is remapped.
    pub(crate) stretches: Vec<Option<Stretch>>,
    growth_key: Vec<f64>,
    pub(crate) growth: Growth,
    power_key: Vec<f64>,
    /// The damped spectrum for σ8 = 1 at the knots.
    pub(crate) spectrum: Vec<f64>,
    kernels_valid: bool,
    pub(crate) kernels: Vec<f64>,
    pub(crate) buffers: Buffers,
}

/// Storage that holds nothing from one prediction to the next.
#[derive(Clone, Debug, Default)]
pub(crate) struct Buffers {
    pub(crate) coefficients: Vec<f64>,
    /// Functions of k at the knots, one after the other.
    pub(crate) vectors: Vec<f64>,
    /// Coefficients as functions of k, times the spectrum: by coefficient, then by knot.
    pub(crate) integrands: Vec<f64>,
    pub(crate) chebyshev: Vec<f64>,
    pub(crate) stretched: Vec<f64>,
    pub(crate) distortion: Vec<f64>,
    pub(crate) directions: Vec<Direction>,
    smooth: Vec<f64>,
}

/// Replaces `key` and tells whether it differed.
fn renew(key: &mut Vec<f64>, now: impl Iterator<Item = f64> + Clone) -> bool {
    if key.iter().copied().eq(now.clone()) {
        return false;
    }
    key.clear();
    key.extend(now);
    true
}

impl Workspace {
    /// An empty workspace: the first prediction fills it.
    #[must_use]
    pub fn new() -> Workspace {
        Workspace::default()
    }

    /// Brings background and growth up to date.
    pub(crate) fn prepare_growth(&mut self, model: &Model, values: &[f64]) -> Result<(), ModelError> {
        let slots = [slot::OMEGA_M, slot::OMEGA_K, slot::W0, slot::WA];
        if renew(&mut self.background_key, slots.iter().map(|&index| values[index])) {
            self.growth_key.clear();
            if !model.plan().warps.is_empty() {
                self.kernels_valid = false;
            }
            let result = self.fill_epochs(model, values);
            if result.is_err() {
                self.background_key.clear();
            }
            result?;
        }
        let setup = model.setup();
        let departure = if setup.felt_by.reaches_matter() { model.layout().departure_slots() } else { 0..0 };
        let index = setup.growth_index.then_some(values[slot::GROWTH_INDEX]);
        // The leading one makes an empty key differ from a key of nothing.
        let key = std::iter::once(1.0).chain(values[departure].iter().copied()).chain(index);
        if renew(&mut self.growth_key, key) {
            let result = self.fill_growth(model, values);
            if result.is_err() {
                self.growth_key.clear();
            }
            result?;
        }
        Ok(())
    }

    fn fill_epochs(&mut self, model: &Model, values: &[f64]) -> Result<(), ModelError> {
        let background = Background::new(
            values[slot::OMEGA_M],
            values[slot::OMEGA_K],
            values[slot::W0],
            values[slot::WA],
        )?;
        self.background = Some(background);
        self.epochs.clear();
        for node in &model.plan().nodes {
            self.epochs.push(background.epoch(node.redshift)?);
        }
        self.stretches.clear();
        let pairs = model.fiducial().iter().zip(&self.epochs);
        self.stretches.extend(pairs.map(|(fiducial, truth)| fiducial.map(|it| Stretch::new(&it, truth))));
        model.check_stretches(&self.stretches)
    }

    fn fill_growth(&mut self, model: &Model, values: &[f64]) -> Result<(), ModelError> {
        let setup = model.setup();
        let Some(background) = self.background else {
            return Ok(());
        };
        // Shapes felt by matter share one set of parameters between all bins.
        let parameters = &values[model.layout().departure_slots()];
        let gravity = |a: f64| 1.0 + setup.departure.tau(parameters, &background, a, 0.0);
        let scale_dependent = |a: f64, wavenumbers: &[f64], out: &mut [f64]| {
            setup.departure.taus(parameters, &background, a, wavenumbers, out);
            out.iter_mut().for_each(|value| *value += 1.0);
        };
        let law = if setup.growth_index {
            Law::Index(values[slot::GROWTH_INDEX])
        } else if !setup.felt_by.reaches_matter() {
            Law::Einstein
        } else {
            setup.departure.check(parameters)?;
            if setup.departure.scale_dependent() {
                Law::ScaleDependent(&scale_dependent)
            } else {
                Law::Gravity(&gravity)
            }
        };
        self.growth.fill(law, &background, model.growth_solver(), model.growth_table())
    }

    /// Brings the spectrum up to date.
    pub(crate) fn prepare_spectrum(&mut self, model: &Model, values: &[f64]) -> Result<(), ModelError> {
        let slots = [slot::OMEGA_M, slot::OMEGA_B, slot::H, slot::N_S, slot::DAMPING, slot::SMEARING];
        if renew(&mut self.power_key, slots.iter().map(|&index| values[index])) {
            self.kernels_valid = false;
            let result = model.fill_spectrum(values, &mut self.buffers.smooth, &mut self.spectrum);
            if result.is_err() {
                self.power_key.clear();
            }
            result?;
        }
        Ok(())
    }

    /// Brings the kernels up to date; the background must be.
    pub(crate) fn prepare_kernels(&mut self, model: &Model, values: &[f64]) -> Result<(), ModelError> {
        self.prepare_spectrum(model, values)?;
        if !self.kernels_valid {
            model.fill_kernels(self);
            self.kernels_valid = true;
        }
        Ok(())
    }
}
