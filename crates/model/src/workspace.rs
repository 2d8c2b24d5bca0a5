//! What one thread keeps between predictions, and recomputes only as far as the changed quantities require.

use crate::error::ModelError;
use crate::layout::slot;
use crate::model::Model;
use oddwell_cosmology::{Background, Epoch, GrowthState, LinearPower, growth_from_index, growth_states};

/// Points of the growth table in ln k, where growth depends on scale: their spacing and the range in k, h/Mpc. Functions
/// of k change over one e-fold; with six-point interpolation, halving this spacing moves no multipole of f(R) gravity by
/// more than 3e-8 of its largest value (at twice the spacing it is 2e-6).
const SPACING: f64 = 0.1;
const TABLE_START: f64 = 5e-5;
const TABLE_POINTS: usize = 144;
const STENCIL: usize = 6;

/// Reusable storage of one thread: backgrounds, growth, spectra and kernels of the last prediction, with the quantities
/// they were made from. Stage after stage is recomputed only if a quantity it depends on has changed.
#[derive(Clone, Debug, Default)]
pub struct Workspace {
    background_key: Vec<f64>,
    pub(crate) background: Option<Background>,
    pub(crate) epochs: Vec<Epoch>,
    growth_key: Vec<f64>,
    pub(crate) growth: Growth,
    power_key: Vec<f64>,
    pub(crate) spectra: Spectra,
    pub(crate) kernels: Vec<f64>,
    kernels_valid: bool,
}

/// D, f and f′ at each redshift node.
#[derive(Clone, Debug, Default)]
pub(crate) struct Growth {
    nodes: usize,
    /// By wavenumber of the table (one only where growth does not depend on scale), then by node.
    table: Vec<GrowthState>,
}

impl Growth {
    /// The growth at a node and a wavenumber (h/Mpc).
    pub(crate) fn at(&self, node: usize, k: f64) -> GrowthState {
        if self.table.len() == self.nodes {
            return self.table[node];
        }
        let position = (k / TABLE_START).ln() / SPACING;
        let first = (position.floor() as isize - 2).clamp(0, (TABLE_POINTS - STENCIL) as isize) as usize;
        let x = position - first as f64;
        let mut state = GrowthState { growth: 0.0, rate: 0.0, rate_slope: 0.0 };
        for i in 0..STENCIL {
            let mut weight = 1.0;
            for j in (0..STENCIL).filter(|&j| j != i) {
                weight *= (x - j as f64) / (i as f64 - j as f64);
            }
            let point = &self.table[(first + i) * self.nodes + node];
            state.growth += weight * point.growth;
            state.rate += weight * point.rate;
            state.rate_slope += weight * point.rate_slope;
        }
        state
    }
}

/// The damped linear spectrum for σ8 = 1 where the model needs it.
#[derive(Clone, Debug, Default)]
pub(crate) struct Spectra {
    /// On the grid of the transforms.
    pub(crate) grid: Vec<f64>,
    /// On the wavenumbers of Fourier rows and the points beside them (see `Model::fourier_wavenumbers`).
    pub(crate) fourier: Vec<f64>,
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

/// The linear spectrum of the quantities, normalised to `sigma8`.
pub(crate) fn linear_power(model: &Model, values: &[f64], sigma8: f64) -> Result<LinearPower, ModelError> {
    let [omega_m, omega_b, h, n_s] =
        [slot::OMEGA_M, slot::OMEGA_B, slot::H, slot::N_S].map(|index| values[index]);
    Ok(LinearPower::new(&model.setup().power, omega_m, omega_b, h, n_s, sigma8)?)
}

/// P(k) exp(−k²·damping²).
pub(crate) fn damped_spectrum(
    power: &LinearPower,
    damping: f64,
    wavenumbers: &[f64],
) -> Result<Vec<f64>, ModelError> {
    let mut spectrum = vec![0.0; wavenumbers.len()];
    power.tabulate(wavenumbers, &mut spectrum)?;
    for (value, k) in spectrum.iter_mut().zip(wavenumbers) {
        *value *= (-(k * damping).powi(2)).exp();
    }
    Ok(spectrum)
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
        for node in model.nodes() {
            self.epochs.push(background.epoch(node.redshift)?);
        }
        Ok(())
    }

    fn fill_growth(&mut self, model: &Model, values: &[f64]) -> Result<(), ModelError> {
        let setup = model.setup();
        let Some(background) = self.background else {
            return Ok(());
        };
        let scale_factors: Vec<f64> = self.epochs.iter().map(|epoch| epoch.scale_factor).collect();
        self.growth = Growth { nodes: scale_factors.len(), table: Vec::new() };
        if setup.growth_index {
            self.growth.table = growth_from_index(&background, values[slot::GROWTH_INDEX], &scale_factors)?;
        } else if setup.felt_by.reaches_matter() {
            // Shapes felt by matter share one set of parameters between all bins.
            let parameters = &values[model.layout().departure_slots()];
            setup.departure.check(parameters)?;
            let points = if setup.departure.scale_dependent() { TABLE_POINTS } else { 1 };
            for point in 0..points {
                let k = TABLE_START * (SPACING * point as f64).exp();
                let gravity = |a: f64| 1.0 + setup.departure.tau(parameters, &background, a, k);
                self.growth.table.extend(growth_states(&background, &gravity, &scale_factors)?);
            }
        } else {
            self.growth.table = growth_states(&background, &|_| 1.0, &scale_factors)?;
        }
        Ok(())
    }

    /// Brings the spectra up to date.
    pub(crate) fn prepare_spectra(&mut self, model: &Model, values: &[f64]) -> Result<(), ModelError> {
        let slots = [slot::OMEGA_M, slot::OMEGA_B, slot::H, slot::N_S, slot::DAMPING];
        if renew(&mut self.power_key, slots.iter().map(|&index| values[index])) {
            self.kernels_valid = false;
            let result = self.fill_spectra(model, values);
            if result.is_err() {
                self.power_key.clear();
            }
            result?;
        }
        Ok(())
    }

    fn fill_spectra(&mut self, model: &Model, values: &[f64]) -> Result<(), ModelError> {
        let power = linear_power(model, values, 1.0)?;
        let damping = values[slot::DAMPING];
        self.spectra.grid = damped_spectrum(&power, damping, model.grid_wavenumbers())?;
        self.spectra.fourier = damped_spectrum(&power, damping, model.fourier_wavenumbers())?;
        Ok(())
    }

    /// Brings the kernels up to date.
    pub(crate) fn prepare_kernels(&mut self, model: &Model, values: &[f64]) -> Result<(), ModelError> {
        self.prepare_spectra(model, values)?;
        if !self.kernels_valid {
            model.fill_kernels(&self.spectra, &mut self.kernels);
            self.kernels_valid = true;
        }
        Ok(())
    }
}
