//! What a hypothesis means for clocks: the rms difference in rate between two places `clock_distance` apart.
//!
//! In every bin of the study, at its weighted mean redshift: c² = 2∫k²dk/2π² \[(3/2) Ωm(a) H² T/k²\]² P(k,z) \[1 − j₀(kd)\]
//! ([`oddwell_cosmology::clock_contrast`]). Where the integral is cut apart from what moves, a draw costs as little as the
//! state of a bin:
//!
//! * T and D the same at every k, the linear spectrum's shape held: c = |T| D σ8 Ωm(a) H² times one number.
//! * T or D depend on k, the shape held: c² = Σ weight · (T D)² over points in ln k, the weights made once ([`grid`]).
//! * The shape is inferred (Ωm, Ωb, h, n_s or the damping): the integral is made for every draw anew, once for all bins
//!   where T and D are the same at every k, else once a bin.
//!
//! So every draw gets its own value, however it is made; a test holds the three against each other. The spectrum is damped
//! as in the prediction; `smearing`, which only redistributes power among acoustic wiggles, is left out.

mod columns;
mod grid;

pub(crate) use columns::clock_columns;

use crate::assemble::{Measurements, Posterior};
use crate::run_error::RunError;
use grid::{Grid, KWeights, LOWEST};
use oddwell_cosmology::{
    Background, ClockContrast, ClockSetting, LinearPower, PowerShape, SECONDS_PER_YEAR, clock_contrast,
};
use oddwell_model::{BinSetup, Layout, Model, ModelError, ModelSetup, Row, Space, Workspace, departures};
use std::f64::consts::PI;

/// One bin of the study.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct ClockBin {
    pub(crate) survey: String,
    pub(crate) bin: String,
    redshift: f64,
    /// The wavenumbers that its measurements reach, h/Mpc.
    pub(crate) reached: (f64, f64),
}

impl ClockBin {
    /// The name of the derived quantity.
    pub(crate) fn name(&self) -> String {
        format!("derived.clock_contrast.{}.{}", self.survey, self.bin)
    }
}

/// The clock contrast of every bin, as a function of the model's quantities.
#[derive(Debug)]
pub(crate) struct ClockContrasts {
    pub(crate) bins: Vec<ClockBin>,
    pub(crate) distance: f64,
    /// Bins at one redshift each, without rows: gives T, D, Ωm(a) and H.
    model: Model,
    shape: PowerShape,
    grid: Grid,
    /// Where the integral is cut.
    pub(crate) method: Method,
}

/// How the integral over k is made; see the module.
#[derive(Clone, Debug)]
pub(crate) enum Method {
    /// ∫ for σ8 = T = D = (3/2) Ωm(a) H² = 1, made once.
    Scaled(f64),
    /// The same, as a sum over points in ln k.
    Weighted(KWeights),
    /// Made for every draw.
    Full,
}

/// Working memory of one thread.
#[derive(Debug, Default)]
pub(crate) struct ClockScratch {
    workspace: Workspace,
}

impl ClockContrasts {
    /// Of the hypothesis and the bins of a posterior; `values` are the model's quantities at some point.
    pub(crate) fn new(
        posterior: &Posterior,
        measurements: &Measurements,
        values: &[f64],
    ) -> Result<ClockContrasts, RunError> {
        let setup = posterior.model.setup();
        let hypothesis = &posterior.hypothesis;
        let distance = hypothesis.quantity("prediction.clock_distance");
        let bins = setup.bins.iter().enumerate().map(|(index, bin)| ClockBin {
            survey: bin.survey.clone(),
            bin: bin.name.clone(),
            redshift: bin.nodes.iter().map(|(redshift, weight)| redshift * weight).sum(),
            reached: reached(measurements.rows.iter().filter(|row| row.bin == index)),
        });
        let bins: Vec<ClockBin> = bins.collect();
        let mut contrasts = ClockContrasts {
            distance: distance.map_or(50.0, |distance| distance.form.constant),
            model: model_of(setup, &bins)?,
            shape: setup.power.clone(),
            grid: Grid::new(setup.smallest_damping),
            bins,
            method: Method::Full,
        };
        let layout = posterior.model.layout();
        let shape = [
            "background.omega_m",
            "background.omega_b",
            "background.h",
            "background.n_s",
            "prediction.damping",
        ];
        let held = |name: &&str| layout.index(name).is_none_or(|slot| posterior.map.is_held(slot));
        if shape.iter().all(held) {
            contrasts.method = if setup.departure.scale_dependent() {
                Method::Weighted(KWeights::new(&contrasts, values)?)
            } else {
                Method::Scaled(contrasts.integral(values)?)
            };
        }
        Ok(contrasts)
    }

    /// The contrast of every bin in seconds a year, at these quantities of the model.
    ///
    /// # Errors
    /// [`ModelError`] where the background, growth, spectrum or departure has no value.
    pub(crate) fn seconds_per_year(
        &self,
        values: &[f64],
        scratch: &mut ClockScratch,
        out: &mut [f64],
    ) -> Result<(), ModelError> {
        let sigma8 = self.value(values, "background.sigma8");
        let scale_dependent = self.model.setup().departure.scale_dependent();
        let shared = match &self.method {
            Method::Scaled(integral) => Some(*integral),
            Method::Full if !scale_dependent => Some(self.integral(values)?),
            _ => None,
        };
        let power = match &self.method {
            Method::Full if scale_dependent => Some(self.power(values, 1.0)?),
            _ => None,
        };
        for (bin, out) in out.iter_mut().enumerate() {
            let state = self.model.bin_state(values, &mut scratch.workspace, bin, 0, LOWEST)?;
            let potential = 1.5 * state.epoch.matter_fraction * state.epoch.conformal_hubble.powi(2);
            let ratio = match (&self.method, shared, &power) {
                (_, Some(integral), _) => {
                    potential * state.time_distortion.abs() * state.growth.growth * integral
                }
                (Method::Weighted(weights), ..) => {
                    let mut sum = 0.0;
                    for (k, weight) in weights.points() {
                        sum += weight * self.factor(values, scratch, bin, k)?.powi(2);
                    }
                    potential * sum.sqrt()
                }
                (_, _, Some(power)) => self.of_bin(values, scratch, bin, power)?.ratio,
                // A spectrum is made wherever nothing else serves.
                _ => f64::NAN,
            };
            *out = sigma8 * ratio * SECONDS_PER_YEAR;
        }
        Ok(())
    }

    /// The contrast of one bin by the full integral.
    ///
    /// # Errors
    /// As [`ClockContrasts::seconds_per_year`].
    pub(crate) fn full(
        &self,
        values: &[f64],
        scratch: &mut ClockScratch,
        bin: usize,
    ) -> Result<ClockContrast, ModelError> {
        let power = self.power(values, self.value(values, "background.sigma8"))?;
        self.of_bin(values, scratch, bin, &power)
    }

    fn of_bin(
        &self,
        values: &[f64],
        scratch: &mut ClockScratch,
        bin: usize,
        power: &LinearPower,
    ) -> Result<ClockContrast, ModelError> {
        let setting = ClockSetting { redshift: self.bins[bin].redshift, ..self.setting(values, bin) };
        let background = self.background(values)?;
        if !self.model.setup().departure.scale_dependent() {
            let factor = self.factor(values, scratch, bin, LOWEST)?;
            return Ok(clock_contrast(&background, power, &setting, &|_| factor, &|_| 1.0)?);
        }
        let squares = |k| Ok(self.factor(values, scratch, bin, k)?.powi(2));
        let squares: Vec<f64> = self.grid.wavenumbers().map(squares).collect::<Result<_, ModelError>>()?;
        // The polynomial may dip below 0 by its own error, where T D passes through 0.
        let factor = |k: f64| self.grid.interpolate(&squares, k).max(0.0).sqrt();
        Ok(clock_contrast(&background, power, &setting, &factor, &|_| 1.0)?)
    }

    fn factor(
        &self,
        values: &[f64],
        scratch: &mut ClockScratch,
        bin: usize,
        k: f64,
    ) -> Result<f64, ModelError> {
        let state = self.model.bin_state(values, &mut scratch.workspace, bin, 0, k)?;
        Ok(state.time_distortion * state.growth.growth)
    }

    /// The integral for σ8 = T = D = (3/2) Ωm(a) H² = 1, whatever the bin: made at redshift 0, where E = 1.
    fn integral(&self, values: &[f64]) -> Result<f64, ModelError> {
        self.integral_of(values, &self.power(values, 1.0)?, &|_| 1.0)
    }

    /// As [`ClockContrasts::integral`], with a factor that depends on k in place of T.
    fn integral_of(
        &self,
        values: &[f64],
        power: &LinearPower,
        factor: &dyn Fn(f64) -> f64,
    ) -> Result<f64, ModelError> {
        let background = self.background(values)?;
        let setting = ClockSetting { redshift: 0.0, ..self.setting(values, 0) };
        let contrast = clock_contrast(&background, power, &setting, factor, &|_| 1.0)?;
        let potential = 1.5 * background.matter_fraction(1.0) * background.conformal_hubble(1.0).powi(2);
        Ok(contrast.ratio / potential)
    }

    fn setting(&self, values: &[f64], bin: usize) -> ClockSetting {
        ClockSetting {
            redshift: self.bins[bin].redshift,
            distance: self.distance,
            damping: self.value(values, "prediction.damping"),
            reached: self.bins[bin].reached,
        }
    }

    fn power(&self, values: &[f64], sigma8: f64) -> Result<LinearPower, ModelError> {
        let [omega_m, omega_b, h, n_s] =
            ["omega_m", "omega_b", "h", "n_s"].map(|key| self.value(values, &format!("background.{key}")));
        Ok(LinearPower::new(&self.shape, omega_m, omega_b, h, n_s, sigma8)?)
    }

    fn background(&self, values: &[f64]) -> Result<Background, ModelError> {
        let [omega_m, omega_k, w0, wa] =
            ["omega_m", "omega_k", "w0", "wa"].map(|key| self.value(values, &format!("background.{key}")));
        Ok(Background::new(omega_m, omega_k, w0, wa)?)
    }

    /// A quantity of `[background]` or `[prediction]`, which every model has.
    fn value(&self, values: &[f64], name: &str) -> f64 {
        self.model.layout().index(name).map_or(f64::NAN, |slot| values[slot])
    }

    /// What general relativity gives in each bin: the same study without a departure, at these quantities.
    ///
    /// # Errors
    /// As [`ClockContrasts::seconds_per_year`].
    pub(crate) fn in_general_relativity(
        &self,
        setup: &ModelSetup,
        layout: &Layout,
        values: &[f64],
    ) -> Result<Vec<f64>, RunError> {
        let none = departures::find("none").unwrap_or(setup.departure);
        let plain = ModelSetup { departure: none, ..setup.clone() };
        let relativity = ClockContrasts {
            bins: self.bins.clone(),
            distance: self.distance,
            model: model_of(&plain, &self.bins)?,
            shape: self.shape.clone(),
            grid: self.grid.clone(),
            method: Method::Full,
        };
        let names = relativity.model.layout().names().iter();
        let carried: Vec<f64> =
            names.map(|name| layout.index(name).map_or(0.0, |slot| values[slot])).collect();
        let mut seconds = vec![0.0; self.bins.len()];
        relativity.seconds_per_year(&carried, &mut ClockScratch::default(), &mut seconds)?;
        Ok(seconds)
    }
}

/// The bins at their mean redshifts, without rows.
fn model_of(setup: &ModelSetup, bins: &[ClockBin]) -> Result<Model, ModelError> {
    let at = bins.iter().zip(&setup.bins);
    let bins = at
        .map(|(at, bin)| BinSetup { nodes: vec![(at.redshift, 1.0)], fiducial: None, ..bin.clone() })
        .collect();
    // Its spectrum is never asked for; a table would have to reach where it need not.
    let power = PowerShape::EisensteinHuSmooth;
    Model::new(ModelSetup { bins, rows: Vec::new(), power, ..setup.clone() })
}

/// The wavenumbers that measured rows reach: of separations from s₁ to s₂ (shells with their ends) those from π/s₂ to
/// π/s₁, half a wavelength being as long as the separation; of wavenumbers those themselves.
fn reached<'a>(rows: impl Iterator<Item = &'a Row>) -> (f64, f64) {
    let mut reach = (f64::INFINITY, 0.0_f64);
    for row in rows {
        let (low, high) = row.edges.unwrap_or((row.at, row.at));
        let (low, high) = match row.space {
            // A shell that begins at 0 reaches no farther than its place.
            Space::Separation => (PI / high, PI / if low > 0.0 { low } else { row.at }),
            Space::Fourier => (low, high),
        };
        reach = (reach.0.min(low), reach.1.max(high));
    }
    // A bin always has a row; an empty range reaches nothing.
    if reach.0 <= reach.1 { reach } else { (0.0, 0.0) }
}

#[cfg(test)]
mod tests;
