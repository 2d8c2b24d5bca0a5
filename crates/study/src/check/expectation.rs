//! What a study expects of its measurements before a fit.

use crate::assemble::{Measurements, Posterior, PosteriorScratch, predict_elsewhere};
use crate::resolve::{Hypothesis, Study};
use crate::run_error::RunError;
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::LikelihoodError;
use oddwell_likelihood::verdicts::{Comparison, Expectation, VerdictError};
use oddwell_model::{FeltBy, Model, ModelSetup, Row, Workspace, departures};
use oddwell_sampler::Target;

/// The prediction in general relativity at the centre of the priors, and its derivatives.
pub(super) struct Expected {
    pub(super) posterior: Posterior,
    /// The model's quantities there.
    pub(super) values: Vec<f64>,
    /// The prediction there, with derivatives and prior covariance of the free parameters.
    pub(super) expectation: Expectation,
    /// Measurements against that, with the departure held at general relativity.
    pub(super) comparison: Comparison,
    /// The same with the departure as uncertain as its prior: for faults that a departure must not be taken for.
    pub(super) open: Comparison,
    /// The change of the prediction for a constant departure of 1 felt by light: what gravitational redshift adds.
    pub(super) redshift: DVector<f64>,
    /// The departure's parameters.
    pub(super) watched: Vec<usize>,
}

pub(super) fn in_all(error: VerdictError) -> RunError {
    match error {
        VerdictError::Likelihood(source) => RunError::Likelihood { survey: "all".into(), source },
        other => RunError::Verdict { reason: other.to_string() },
    }
}

pub(super) fn in_survey(survey: &str, source: LikelihoodError) -> RunError {
    RunError::Likelihood { survey: survey.to_owned(), source }
}

impl Expected {
    pub(super) fn new(
        study: &Study,
        hypothesis: &Hypothesis,
        measurements: &Measurements,
    ) -> Result<Expected, RunError> {
        let posterior = Posterior::new(study, hypothesis, measurements)?;
        let mut scratch = posterior.scratch();
        let watched = hypothesis.watched();
        let mut centre = hypothesis.start();
        for &parameter in &watched {
            let key = posterior.map.names()[parameter].split('.').nth(1).unwrap_or_default().to_owned();
            let shape = hypothesis.shape.0.parameters().iter();
            let known = shape.filter(|known| known.name == key && key == "tau");
            if let Some(value) = known.filter_map(|known| known.general_relativity).next() {
                centre[parameter] = value;
            }
        }
        let prediction = posterior.predict(&centre, &mut scratch)?;
        let expectation = Expectation {
            jacobian: jacobian(&posterior, &centre, &prediction, &mut scratch)?,
            prediction: DVector::from_vec(prediction),
            prior_covariance: prior_covariance(&posterior),
        };
        let open = Comparison::new(&posterior.data, &expectation).map_err(in_all)?;
        let comparison = open.clone().holding(&watched);
        let values = posterior.values(&centre);
        let redshift = DVector::from_vec(redshift_change(&posterior, &values)?);
        Ok(Expected { posterior, values, expectation, comparison, open, redshift, watched })
    }
}

fn jacobian(
    posterior: &Posterior,
    centre: &[f64],
    plain: &[f64],
    scratch: &mut PosteriorScratch,
) -> Result<DMatrix<f64>, RunError> {
    let mut jacobian = DMatrix::zeros(plain.len(), centre.len());
    for parameter in 0..centre.len() {
        // A thousandth of the prior's width: the prediction is a polynomial of low order in the parameters.
        let (low, high) = posterior.priors.support(parameter);
        let step = 1e-3 * posterior.priors.spread(parameter);
        let mut moved = centre.to_vec();
        moved[parameter] =
            if centre[parameter] + step < high { centre[parameter] + step } else { centre[parameter] - step };
        let step = moved[parameter].max(low) - centre[parameter];
        for (row, value) in posterior.predict(&moved, scratch)?.iter().enumerate() {
            jacobian[(row, parameter)] = (value - plain[row]) / step;
        }
    }
    Ok(jacobian)
}

/// Covariance of the priors; a family without variance enters with the spread of its central 68 %.
pub(crate) fn prior_covariance(posterior: &Posterior) -> DMatrix<f64> {
    let size = posterior.dimension();
    let mut covariance = DMatrix::zeros(size, size);
    for &parameter in posterior.priors.independent() {
        let sd = posterior.priors.standard_deviation(parameter);
        let sd = if sd.is_finite() { sd } else { posterior.priors.spread(parameter) };
        covariance[(parameter, parameter)] = sd * sd;
    }
    for block in posterior.priors.joint() {
        for (row, &i) in block.of().iter().enumerate() {
            for (column, &j) in block.of().iter().enumerate() {
                covariance[(i, j)] = block.covariance()[(row, column)];
            }
        }
    }
    covariance
}

/// The prediction of quantities carried over by name into another model, with some of them changed.
pub(crate) fn predict_with(
    posterior: &Posterior,
    setup: ModelSetup,
    value: &dyn Fn(&str, f64) -> f64,
    values: &[f64],
) -> Result<Vec<f64>, RunError> {
    predict_elsewhere(posterior, setup, &|name| {
        value(name, posterior.slot(name).map_or(0.0, |slot| values[slot]))
    })
}

/// The prediction of other rows by the same model, windows aside.
pub(super) fn predict_rows(
    posterior: &Posterior,
    rows: Vec<Row>,
    values: &[f64],
) -> Result<Vec<f64>, RunError> {
    let mut predicted = vec![0.0; rows.len()];
    let model = Model::new(ModelSetup { rows, ..posterior.model.setup().clone() })?;
    model.predict(values, &mut Workspace::new(), &mut predicted)?;
    Ok(predicted)
}

/// The change for a constant departure of 1 felt by light.
fn redshift_change(posterior: &Posterior, values: &[f64]) -> Result<Vec<f64>, RunError> {
    let Some(constant) = departures::find("constant") else { return Ok(Vec::new()) };
    let setup =
        || ModelSetup { departure: constant, felt_by: FeltBy::Light, ..posterior.model.setup().clone() };
    let of = |tau: f64| {
        predict_with(
            posterior,
            setup(),
            &|name, value| if name == "departure.tau" { tau } else { value },
            values,
        )
    };
    let (with, without) = (of(1.0)?, of(0.0)?);
    Ok(with.iter().zip(&without).map(|(with, without)| with - without).collect())
}
