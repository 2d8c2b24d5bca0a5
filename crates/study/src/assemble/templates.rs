//! Templates: shapes of the measurements with amplitudes of their own.

use super::measurements::{Measurements, NoiseGroup};
use crate::resolve::{Hypothesis, State};
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{AmplitudePrior, Template};

/// The part of a prediction that templates make: Σ amplitude · shape. Amplitudes stand behind the model's quantities.
#[derive(Clone, Debug)]
pub(super) struct Templates {
    first_slot: usize,
    shapes: Vec<Placed>,
}

#[derive(Clone, Debug)]
struct Placed {
    name: String,
    /// The position of the survey's first row among all measured rows.
    first_row: usize,
    shape: DVector<f64>,
}

impl Templates {
    /// All templates of the study; the first amplitude is quantity `first_slot`.
    pub(super) fn new(measurements: &Measurements, first_slot: usize) -> Templates {
        let placed = measurements.with_offsets().flat_map(|(first_row, survey)| {
            survey.templates.iter().map(move |template| Placed {
                name: template.name.clone(),
                first_row,
                shape: template.shape.clone(),
            })
        });
        Templates { first_slot, shapes: placed.collect() }
    }

    /// The dotted names of the amplitudes, in the order of their slots.
    pub(super) fn names(&self) -> impl Iterator<Item = &str> {
        self.shapes.iter().map(|placed| placed.name.as_str())
    }

    pub(super) fn len(&self) -> usize {
        self.shapes.len()
    }

    /// The amplitudes among all quantities.
    pub(super) fn amplitudes<'a>(&self, values: &'a [f64]) -> &'a [f64] {
        &values[self.first_slot..self.first_slot + self.len()]
    }

    /// Adds them to a prediction of the measured rows.
    pub(super) fn add(&self, amplitudes: &[f64], measured: &mut [f64]) {
        for (placed, amplitude) in self.shapes.iter().zip(amplitudes) {
            for (row, entry) in measured[placed.first_row..].iter_mut().zip(placed.shape.iter()) {
                *row += amplitude * entry;
            }
        }
    }

    /// Kernels of the measured rows with a column more for each of them.
    pub(super) fn beside(&self, kernels: DMatrix<f64>) -> DMatrix<f64> {
        let first = kernels.ncols();
        let mut all = kernels.insert_columns(first, self.len(), 0.0);
        for (index, placed) in self.shapes.iter().enumerate() {
            let mut column = all.column_mut(first + index);
            column.rows_mut(placed.first_row, placed.shape.len()).copy_from(&placed.shape);
        }
        all
    }
}

/// The templates of a group of surveys whose amplitudes a hypothesis integrates out, over the rows of the group. The
/// prediction is made for an amplitude at its prior mean, so what is integrated over is the rest.
pub(super) fn integrated_out(
    hypothesis: &Hypothesis,
    measurements: &Measurements,
    group: &NoiseGroup,
) -> Vec<Template> {
    let mut templates = Vec::new();
    let mut first = 0;
    for survey in &measurements.surveys[group.surveys.clone()] {
        for template in &survey.templates {
            let state = hypothesis.quantity(&template.name).map(|quantity| &quantity.state);
            if let Some(State::IntegratedOut { standard_deviation, .. }) = state {
                let mut shape = DVector::zeros(group.likelihood.rows());
                shape.rows_mut(first, template.shape.len()).copy_from(&template.shape);
                let prior = AmplitudePrior::Normal { mean: 0.0, standard_deviation: *standard_deviation };
                templates.push(Template { name: template.name.clone(), shape, prior });
            }
        }
        first += survey.table.len();
    }
    templates
}
