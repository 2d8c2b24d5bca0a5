//! How far rows that are predicted at a point can be off the shell averages that they were measured as.

use crate::assemble::{Measurements, Posterior, PosteriorScratch};
use crate::run_error::RunError;
use crate::warnings::Warning;
use oddwell_model::{Model, ModelSetup, Row, Workspace};

/// A warning for each survey with rows without edges: the largest change, relative to the multipole's largest value, that
/// averaging over shells as wide as the rows' spacing would make. `values` are the model's quantities.
///
/// # Errors
/// [`RunError::Model`] where there is no prediction.
pub(crate) fn unaveraged_shells(
    posterior: &Posterior,
    measurements: &Measurements,
    values: &[f64],
    scratch: &mut PosteriorScratch,
) -> Result<Vec<Warning>, RunError> {
    let rows = &measurements.rows;
    // Of a survey with a window, the window knows what a measured row averages.
    let windows = measurements.surveys.iter();
    let of_window: Vec<bool> =
        windows.flat_map(|survey| std::iter::repeat_n(survey.window.is_some(), survey.table.len())).collect();
    if rows.iter().zip(&of_window).all(|(row, of_window)| *of_window || row.edges.is_some()) {
        return Ok(Vec::new());
    }
    let averaged: Vec<Row> = rows
        .iter()
        .map(|row| Row { edges: row.edges.or_else(|| guessed_edges(row, rows)), ..*row })
        .collect();
    let model = Model::new(ModelSetup { rows: averaged, ..posterior.model.setup().clone() })?;
    let mut of_shells = vec![0.0; rows.len()];
    model.predict(values, &mut Workspace::new(), &mut of_shells)?;
    let at_points = posterior.predict_values(values, scratch)?;
    let mut warnings = Vec::new();
    let mut first = 0;
    for survey in &measurements.surveys {
        let range = first..first + survey.table.len();
        first = range.end;
        if survey.window.is_some() || survey.table.rows.iter().all(|row| row.edges.is_some()) {
            continue;
        }
        let difference = range
            .clone()
            .map(|index| {
                let alike = range.clone().filter(|&other| same_multipole(&rows[index], &rows[other]));
                let largest = alike.map(|other| at_points[other].abs()).fold(f64::MIN_POSITIVE, f64::max);
                (of_shells[index] - at_points[index]).abs() / largest
            })
            .fold(0.0, f64::max);
        warnings.push(Warning::UnaveragedShell { survey: survey.name.clone(), difference });
    }
    Ok(warnings)
}

fn same_multipole(one: &Row, other: &Row) -> bool {
    (one.bin, one.pair, one.multipole, one.space) == (other.bin, other.pair, other.multipole, other.space)
}

/// Half the distance to the nearest row of the same multipole, to both sides; none for a row that stands alone.
fn guessed_edges(row: &Row, rows: &[Row]) -> Option<(f64, f64)> {
    let distances =
        rows.iter().filter(|other| same_multipole(row, other)).map(|other| (other.at - row.at).abs());
    let nearest = distances.filter(|&distance| distance > 0.0).fold(f64::INFINITY, f64::min);
    let half = 0.5 * nearest;
    nearest.is_finite().then_some(((row.at - half).max(0.0), row.at + half))
}
