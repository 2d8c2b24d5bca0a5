//! What another model says of the rows of a posterior.

use super::posterior::Posterior;
use crate::run_error::RunError;
use oddwell_model::{Model, ModelSetup, Workspace};

/// The prediction of the posterior's measured rows by another model of the same rows, whose quantities `value` gives by name,
/// amplitudes of templates too.
///
/// # Errors
/// [`RunError::Model`] where there is no such model, or it has no prediction.
pub(crate) fn predict_elsewhere(
    posterior: &Posterior,
    setup: ModelSetup,
    value: &dyn Fn(&str) -> f64,
) -> Result<Vec<f64>, RunError> {
    let model = Model::new(setup)?;
    let values: Vec<f64> = model.layout().names().iter().map(|name| value(name)).collect();
    let mut rows = vec![0.0; model.setup().rows.len()];
    model.predict(&values, &mut Workspace::new(), &mut rows)?;
    let amplitudes: Vec<f64> = posterior.template_names().map(value).collect();
    Ok(posterior.measured(&rows, &amplitudes))
}
