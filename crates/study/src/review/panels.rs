//! Every multipole of every bin: measured, predicted, with the posterior's band.

use super::{Context, Placed, ReviewError};
use crate::assemble::Posterior;
use crate::check::predict_with;
use crate::run_error::RunError;
use oddwell_likelihood::{Axis, share_of_effective_parameters};
use oddwell_model::{FeltBy, ModelSetup, Workspace, departures};
use oddwell_sampler::Target;
use oddwell_sampler::diagnostics::quantile;

/// One multipole of one pair in one bin.
#[derive(Clone, Debug, PartialEq)]
pub struct Panel {
    /// The survey.
    pub survey: String,
    /// The bin.
    pub bin: String,
    /// The pair.
    pub pair: String,
    /// ℓ.
    pub multipole: u8,
    /// Whether `at` is a wavenumber, h/Mpc; else it is a separation, Mpc/h.
    pub fourier: bool,
    /// What is there, in rising order of `at`.
    pub rows: Vec<PanelRow>,
    /// χ² of these rows about the best prediction, by their own block of the covariance.
    pub chi_squared: f64,
    /// Their share of the effective parameters.
    pub effective_parameters: Option<f64>,
    /// The probability of a χ² at least this large.
    pub p_value: Option<f64>,
}

/// One measured number.
#[derive(Clone, Debug, PartialEq)]
pub struct PanelRow {
    /// Separation (Mpc/h) or wavenumber (h/Mpc).
    pub at: f64,
    /// The measured value; withheld while the measurements are blinded.
    pub measured: Option<f64>,
    /// Its standard deviation.
    pub error: f64,
    /// The prediction at the best point.
    pub best: f64,
    /// The same without the departure: everything else as at the best point.
    pub general_relativity: f64,
    /// 16 % and 84 % quantiles of the prediction over the posterior.
    pub band68: [f64; 2],
    /// 2.5 % and 97.5 % quantiles.
    pub band95: [f64; 2],
    /// Measured less best, over the standard deviation.
    pub residual: f64,
    /// What each physical effect contributes at the best point; they add up to `best`.
    pub effects: Vec<(String, f64)>,
}

pub(super) fn panels(context: &Context<'_>) -> Result<Vec<Panel>, ReviewError> {
    let posterior = context.posterior;
    let mut scratch = posterior.scratch();
    let mut draws = Vec::with_capacity(context.draws.len());
    for draw in context.draws {
        let mut prediction = posterior.predict(draw, &mut scratch).map_err(RunError::from)?;
        add_expected_templates(posterior, &mut prediction);
        draws.push(prediction);
    }
    let mut at_best = context.analysis.prediction.clone();
    add_expected_templates(posterior, &mut at_best);
    let values = posterior.values(&context.analysis.best);
    let setup = ModelSetup {
        departure: departures::find("none").unwrap_or(posterior.model.setup().departure),
        felt_by: FeltBy::Light,
        ..posterior.model.setup().clone()
    };
    let relativity = predict_with(posterior, setup, &|_, value| value, &values)?;
    let effects = posterior.model.by_effect(&values, &mut Workspace::new()).map_err(RunError::from)?;
    let of_templates = posterior.of_templates(&values).map(|mut added| {
        // What was integrated out comes on top.
        for (row, added) in added.iter_mut().enumerate() {
            *added += at_best[row] - context.analysis.prediction[row];
        }
        ("templates".to_owned(), added)
    });
    let effects: Vec<(String, Vec<f64>)> = effects
        .into_iter()
        .map(|(effect, predicted)| (effect.name().to_owned(), posterior.projected(&predicted)))
        .chain(of_templates)
        .filter(|(_, predicted)| predicted.iter().any(|value| *value != 0.0))
        .collect();
    let blinded = context.study.file.blinding.is_some();
    let mut panels = Vec::new();
    for Placed { survey, likelihood, first, within } in context.placed() {
        let errors = survey.likelihood.covariance().standard_deviations();
        let own = &context.analysis.prediction[first..first + likelihood.rows()];
        // Positions within the survey, in the order of its table.
        let mut groups: Vec<(Panel, Vec<usize>)> = Vec::new();
        for (position, row) in survey.table.rows.iter().enumerate() {
            let index = first + within + position;
            let column: Vec<f64> = draws.iter().map(|draw| draw[index]).collect();
            let band = |tail: f64| [quantile(&column, tail), quantile(&column, 1.0 - tail)];
            let best = at_best[index];
            let entry = PanelRow {
                at: row.at,
                measured: (!blinded).then_some(row.value),
                error: errors[position],
                best,
                general_relativity: relativity[index],
                band68: band(0.16),
                band95: band(0.025),
                residual: (row.value - best) / errors[position],
                effects: effects.iter().map(|(name, column)| (name.clone(), column[index])).collect(),
            };
            let fourier = row.axis == Axis::Wavenumber;
            let same = |panel: &Panel| {
                (&panel.bin, &panel.pair, panel.multipole, panel.fourier)
                    == (&row.bin, &row.pair, row.multipole, fourier)
            };
            match groups.iter_mut().find(|(panel, _)| same(panel)) {
                Some((panel, positions)) => {
                    panel.rows.push(entry);
                    positions.push(position);
                }
                None => {
                    let panel = Panel {
                        survey: survey.name.clone(),
                        bin: row.bin.clone(),
                        pair: row.pair.clone(),
                        multipole: row.multipole,
                        fourier,
                        rows: vec![entry],
                        chi_squared: f64::NAN,
                        effective_parameters: None,
                        p_value: None,
                    };
                    groups.push((panel, vec![position]));
                }
            }
        }
        for (mut panel, positions) in groups {
            let positions: Vec<usize> = positions.into_iter().map(|position| within + position).collect();
            panel.chi_squared = likelihood
                .subset_chi_squared(own, &positions)
                .map_err(|source| RunError::Likelihood { survey: survey.name.clone(), source })?;
            let information = context.analysis.part(likelihood, first, &positions);
            let effective = share_of_effective_parameters(&information, &context.analysis.covariance);
            panel.effective_parameters = Some(effective).filter(|effective| effective.is_finite());
            let freedom = positions.len() as f64 - panel.effective_parameters.unwrap_or(0.0);
            panel.p_value = likelihood.p_value(panel.chi_squared, freedom);
            panel.rows.sort_by(|one, other| one.at.total_cmp(&other.at));
            panels.push(panel);
        }
    }
    Ok(panels)
}

/// Adds templates whose amplitudes were integrated out, at the amplitudes expected for this prediction.
fn add_expected_templates(posterior: &Posterior, prediction: &mut [f64]) {
    for (first, survey) in posterior.data.with_offsets() {
        let rows = first..first + survey.rows();
        let found = survey.amplitudes(&prediction[rows.clone()]);
        for (template, amplitude) in survey.templates().iter().zip(found.mean.iter()) {
            for (row, shape) in prediction[rows.clone()].iter_mut().zip(template.shape.iter()) {
                *row += amplitude * shape;
            }
        }
    }
}
