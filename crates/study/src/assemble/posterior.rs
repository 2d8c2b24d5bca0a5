//! One hypothesis of a study, ready to be evaluated.

use super::determined::count_determined;
use super::domain::Domain;
use super::measurements::Measurements;
use super::power_table::read_power_table;
use super::projection::Projection;
use super::templates::{Templates, integrated_out};
use crate::file::{FiducialSection, PowerChoice};
use crate::parameter_map::ParameterMap;
use crate::resolve::{Hypothesis, Study};
use crate::run_error::RunError;
use oddwell_cosmology::{CosmologyError, PowerShape};
use oddwell_likelihood::{CompressedSet, NoiseChoice, NoiseError, SurveySet};
use oddwell_model::{BinSetup, Effects, Model, ModelError, ModelSetup, Row, Workspace};
use oddwell_sampler::{EvaluationFailure, PriorSet, Target};
use std::sync::Arc;

/// A posterior: measurements, model, and the map from free parameters to the model's quantities.
///
/// Where no quantity that changes a k-shape is inferred, the data are compressed exactly and an evaluation costs the
/// same for any number of measured rows.
#[derive(Debug)]
pub struct Posterior {
    /// The hypothesis, resolved.
    pub hypothesis: Hypothesis,
    /// The model of all kept rows, or of the window's rows where a survey has one.
    pub model: Model,
    /// From free parameters to the model's quantities.
    pub map: ParameterMap,
    /// The prior of the free parameters.
    pub priors: PriorSet,
    /// The kept measurements: a likelihood for each group of surveys with one noise, templates integrated out where the
    /// hypothesis says so.
    pub data: SurveySet,
    projection: Projection,
    templates: Templates,
    domain: Domain,
    compressed: Option<CompressedSet>,
    determined: Vec<Option<usize>>,
}

/// Working memory of one thread.
#[derive(Debug)]
pub struct PosteriorScratch {
    values: Vec<f64>,
    coefficients: Vec<f64>,
    predicted: Vec<f64>,
    measured: Vec<f64>,
    workspace: Workspace,
    residuals: Vec<f64>,
}

/// The model of `rows` under a hypothesis.
pub(crate) fn model_setup(
    study: &Study,
    hypothesis: &Hypothesis,
    rows: Vec<Row>,
) -> Result<ModelSetup, RunError> {
    let file = &study.file;
    let mut bins = Vec::new();
    for survey in &file.surveys {
        let fiducial = survey.fiducial.as_ref().map(FiducialSection::background).transpose()?;
        bins.extend(survey.bins.iter().map(|bin| BinSetup {
            survey: survey.name.value.clone(),
            name: bin.name.value.clone(),
            nodes: bin.weighted_nodes(),
            sight_line: survey.sight_line.value,
            growth_given: bin.growth_rate.is_some(),
            observed_slopes: [&bin.first, &bin.second].map(|tracer| tracer.observed_density_slope.is_some()),
            fiducial,
        }));
    }
    let power = match &file.background.power.value {
        PowerChoice::EisensteinHu => PowerShape::EisensteinHu,
        PowerChoice::EisensteinHuSmooth => PowerShape::EisensteinHuSmooth,
        PowerChoice::Table(path) => PowerShape::Table(Arc::new(read_power_table(&file.path_of(path))?)),
    };
    let effects = Effects {
        wide_angle: file.prediction.wide_angle.value,
        light_cone: file.prediction.light_cone.value,
        lensing: file.prediction.lensing.value,
        ..Effects::default()
    };
    Ok(ModelSetup {
        bins,
        rows,
        power,
        effects,
        growth_index: file.prediction.growth_index.is_some(),
        smallest_damping: smallest_damping(hypothesis)?,
        departure: hypothesis.shape.0,
        felt_by: hypothesis.felt_by,
    })
}

/// The smallest damping that the hypothesis can ask for: it sets the range of the k integrals.
fn smallest_damping(hypothesis: &Hypothesis) -> Result<f64, RunError> {
    let Some(damping) = hypothesis.quantity("prediction.damping") else { return Ok(0.5) };
    let priors = hypothesis.priors()?;
    let lowest = |(parameter, coefficient): &(usize, f64)| {
        let (low, high) = priors.support(*parameter);
        (coefficient * low).min(coefficient * high)
    };
    let smallest = damping.form.constant + damping.form.terms.iter().map(lowest).sum::<f64>();
    Ok(smallest.max(0.0))
}

/// Says which table does not reach far enough.
fn name_the_table(study: &Study, error: ModelError) -> RunError {
    match (error, &study.file.background.power.value) {
        (
            ModelError::Cosmology(CosmologyError::OutsideTable {
                low, high, needed_low, needed_high, ..
            }),
            PowerChoice::Table(path),
        ) => RunError::PowerRange {
            file: study.file.path_of(path).display().to_string(),
            given: (low, high),
            needed: (two_digits(needed_low, f64::floor), two_digits(needed_high, f64::ceil)),
        },
        (error, _) => error.into(),
    }
}

/// A number above 0, rounded to two significant digits.
fn two_digits(value: f64, round: fn(f64) -> f64) -> f64 {
    let place = 10f64.powi(value.log10().floor() as i32 - 1);
    // Read back from its digits, so that it prints as they do.
    let digits = round(value / place);
    format!("{digits}e{}", place.log10().round()).parse().unwrap_or(value)
}

impl Posterior {
    /// Builds the model, checks that it can be evaluated at the prior's centre, and compresses the data where that is
    /// exact.
    ///
    /// # Errors
    /// [`RunError`] where the model has no prediction at the prior's centre, or the priors can't be built.
    pub fn new(
        study: &Study,
        hypothesis: &Hypothesis,
        measurements: &Measurements,
    ) -> Result<Posterior, RunError> {
        let setup = model_setup(study, hypothesis, measurements.model_rows())?;
        let model = Model::new(setup).map_err(|error| name_the_table(study, error))?;
        let templates = Templates::new(measurements, model.layout().len());
        let slots: Vec<&str> =
            model.layout().names().iter().map(String::as_str).chain(templates.names()).collect();
        let map = ParameterMap::new(hypothesis, &slots)?;
        let domain = Domain::new(&map, model.layout());
        let priors = hypothesis.priors()?;
        let mut groups = Vec::new();
        for group in &measurements.groups {
            let integrated = integrated_out(hypothesis, measurements, group);
            let likelihood = group.likelihood.clone().with_templates(&integrated).map_err(|source| {
                let survey = measurements.surveys[group.surveys.start].name.clone();
                RunError::Likelihood { survey, source }
            })?;
            groups.push(likelihood);
        }
        let mut posterior = Posterior {
            hypothesis: hypothesis.clone(),
            model,
            map,
            priors,
            data: SurveySet::new(groups),
            projection: Projection::new(&measurements.surveys),
            templates,
            domain,
            compressed: None,
            determined: vec![None; measurements.groups.len()],
        };
        let start = hypothesis.start();
        let mut scratch = posterior.scratch();
        posterior.predict(&start, &mut scratch).map_err(|error| name_the_table(study, error))?;
        posterior.compress()?;
        count_determined(&mut posterior, measurements)?;
        Ok(posterior)
    }

    /// Compresses the data, where that is exact.
    pub(super) fn compress(&mut self) -> Result<(), RunError> {
        if !self.has_fixed_kernels() {
            return Ok(());
        }
        let values = self.values(&self.hypothesis.start());
        let kernels = self.model.kernels(&values, &mut Workspace::new())?;
        let kernels = self.templates.beside(self.projection.of_kernels(&kernels.matrix));
        let compressed = self.data.compress(&kernels);
        self.compressed =
            Some(compressed.map_err(|source| RunError::Likelihood { survey: "all".into(), source })?);
        Ok(())
    }

    /// n_θ of each group of surveys whose noise asked for it to be counted.
    #[must_use]
    pub fn determined(&self) -> &[Option<usize>] {
        &self.determined
    }

    pub(super) fn set_determined(&mut self, group: usize, determined: usize) {
        self.determined[group] = Some(determined);
    }

    /// Changes the noise of a group of surveys; [`Posterior::compress`] must follow.
    pub(super) fn set_noise(&mut self, group: usize, noise: &NoiseChoice) -> Result<(), NoiseError> {
        let mut groups = self.data.surveys().to_vec();
        groups[group] = groups[group].clone().with_noise(noise)?;
        self.data = SurveySet::new(groups);
        Ok(())
    }

    /// Whether the kernels stay as they are while the parameters move.
    #[must_use]
    pub fn has_fixed_kernels(&self) -> bool {
        let layout = self.model.layout();
        self.model.has_kernels() && self.map.terms().iter().all(|term| !layout.changes_kernels(term.slot))
    }

    /// The model's quantities at a point, and behind them the amplitudes of templates.
    #[must_use]
    pub fn values(&self, point: &[f64]) -> Vec<f64> {
        let mut values = vec![0.0; self.map.slots()];
        self.map.fill(point, &mut values);
        values
    }

    /// The prediction of all kept rows.
    ///
    /// # Errors
    /// [`ModelError`] where there is none.
    pub fn predict(&self, point: &[f64], scratch: &mut PosteriorScratch) -> Result<Vec<f64>, ModelError> {
        self.map.fill(point, &mut scratch.values);
        self.predict_values(&scratch.values.clone(), scratch)
    }

    /// The prediction for quantities given outright.
    ///
    /// # Errors
    /// [`ModelError`] where there is none.
    pub fn predict_values(
        &self,
        values: &[f64],
        scratch: &mut PosteriorScratch,
    ) -> Result<Vec<f64>, ModelError> {
        let mut measured = vec![0.0; self.data.rows()];
        self.fill_prediction(values, &mut scratch.workspace, &mut scratch.predicted, &mut measured)?;
        Ok(measured)
    }

    /// One number a measured row, from a prediction of the model's rows: the same but where a survey has a window.
    #[must_use]
    pub fn projected(&self, predicted: &[f64]) -> Vec<f64> {
        if self.projection.is_identity() {
            return predicted.to_vec();
        }
        let mut measured = vec![0.0; self.data.rows()];
        self.projection.apply(predicted, &mut measured);
        measured
    }

    /// As [`Posterior::projected`], with templates of these amplitudes added: what another model than this one's says of
    /// the measured rows.
    #[must_use]
    pub fn measured(&self, predicted: &[f64], amplitudes: &[f64]) -> Vec<f64> {
        let mut measured = self.projected(predicted);
        self.templates.add(amplitudes, &mut measured);
        measured
    }

    /// The dotted names of the amplitudes of templates, which stand behind the model's quantities in
    /// [`Posterior::values`].
    pub fn template_names(&self) -> impl Iterator<Item = &str> {
        self.templates.names()
    }

    /// Where [`Posterior::values`] has the quantity of this dotted name, a template's amplitude included.
    #[must_use]
    pub fn slot(&self, name: &str) -> Option<usize> {
        let of_template = || self.templates.names().position(|known| known == name);
        let layout = self.model.layout();
        layout.index(name).or_else(|| Some(layout.len() + of_template()?))
    }

    /// What templates add to the prediction of the measured rows; none where the study has no template.
    #[must_use]
    pub fn of_templates(&self, values: &[f64]) -> Option<Vec<f64>> {
        let mut added = vec![0.0; self.data.rows()];
        self.templates.add(self.templates.amplitudes(values), &mut added);
        (self.templates.len() > 0).then_some(added)
    }

    /// Predicts the model's rows, and from them one number a measured row.
    fn fill_prediction(
        &self,
        values: &[f64],
        workspace: &mut Workspace,
        predicted: &mut [f64],
        measured: &mut [f64],
    ) -> Result<(), ModelError> {
        if self.projection.is_identity() {
            self.model.predict(values, workspace, measured)?;
        } else {
            self.model.predict(values, workspace, predicted)?;
            self.projection.apply(predicted, measured);
        }
        self.templates.add(self.templates.amplitudes(values), measured);
        Ok(())
    }

    /// The log-likelihood by the plain prediction, whether or not the data are compressed.
    ///
    /// # Errors
    /// [`ModelError`] where the model has no prediction.
    pub fn plain_log_likelihood(
        &self,
        point: &[f64],
        scratch: &mut PosteriorScratch,
    ) -> Result<f64, ModelError> {
        let PosteriorScratch { values, predicted, measured, workspace, residuals, .. } = scratch;
        self.map.fill(point, values);
        self.domain.check(values)?;
        self.fill_prediction(values, workspace, predicted, measured)?;
        Ok(self.data.log_likelihood(measured, residuals))
    }

    fn any_log_likelihood(&self, point: &[f64], scratch: &mut PosteriorScratch) -> Result<f64, ModelError> {
        let Some(compressed) = &self.compressed else { return self.plain_log_likelihood(point, scratch) };
        Ok(compressed.log_likelihood(self.fill_coefficients(point, scratch)?.coefficients))
    }

    /// The compressed data, where the kernels are fixed.
    pub(super) fn compressed(&self) -> Option<&CompressedSet> {
        self.compressed.as_ref()
    }

    /// The coefficients of the kernels at a point.
    pub(super) fn fill_coefficients<'s>(
        &self,
        point: &[f64],
        scratch: &'s mut PosteriorScratch,
    ) -> Result<Coefficients<'s>, ModelError> {
        let PosteriorScratch { values, coefficients, workspace, .. } = scratch;
        self.map.fill(point, values);
        self.domain.check(values)?;
        let (of_model, of_templates) = coefficients.split_at_mut(self.model.coefficient_count());
        self.model.coefficients(values, workspace, of_model)?;
        of_templates.copy_from_slice(self.templates.amplitudes(values));
        Ok(Coefficients { coefficients, inputs: (values, workspace) })
    }
}

/// Coefficients of the kernels, and the quantities and working memory that they were made with.
pub(super) struct Coefficients<'s> {
    pub(super) coefficients: &'s [f64],
    pub(super) inputs: (&'s mut [f64], &'s Workspace),
}

/// What a sampler makes of a model that has no prediction.
pub(super) fn failure(error: ModelError) -> EvaluationFailure {
    let reason = error.to_string();
    if error.is_recoverable() {
        EvaluationFailure::Rejected { reason }
    } else {
        EvaluationFailure::Fatal { reason }
    }
}

impl Target for Posterior {
    type Scratch = PosteriorScratch;

    fn dimension(&self) -> usize {
        self.map.dimension()
    }

    fn scratch(&self) -> PosteriorScratch {
        PosteriorScratch {
            values: vec![0.0; self.map.slots()],
            coefficients: vec![0.0; self.model.coefficient_count() + self.templates.len()],
            predicted: vec![0.0; self.projection.predicted()],
            measured: vec![0.0; self.data.rows()],
            workspace: Workspace::new(),
            residuals: Vec::new(),
        }
    }

    fn log_prior(&self, point: &[f64]) -> f64 {
        self.priors.log_density(point)
    }

    fn log_likelihood(
        &self,
        point: &[f64],
        scratch: &mut PosteriorScratch,
    ) -> Result<f64, EvaluationFailure> {
        self.any_log_likelihood(point, scratch).map_err(failure)
    }
}
