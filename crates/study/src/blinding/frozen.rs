//! What a shift was computed from, frozen beside the blinded study.

use crate::assemble::Measurements;
use crate::run_error::RunError;
use indexmap::IndexMap;
use oddwell_likelihood::Axis;
use serde::{Deserialize, Serialize};
use std::path::Path;

/// Name of the file in the blinded study's folder.
pub(super) const FROZEN_FILE: &str = "blinding.json";

/// The configuration at which the predicted difference was computed. It holds no secret: anybody can compute it.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub(super) struct Frozen {
    /// The program and its version.
    pub(super) version: String,
    /// SHA-256 of the study file that was blinded.
    pub(super) study_sha256: String,
    /// Every quantity of the model at the centre of its prior, by name.
    pub(super) quantities: IndexMap<String, f64>,
    /// The predicted change of each measured row for a constant departure τ = 1 felt by light.
    pub(super) change_per_tau: Vec<FrozenRow>,
}

/// One row's change.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub(super) struct FrozenRow {
    survey: String,
    bin: String,
    pair: String,
    multipole: u8,
    axis: String,
    at: f64,
    change: f64,
}

fn axis(axis: Axis) -> &'static str {
    match axis {
        Axis::Separation => "separation",
        Axis::Wavenumber => "wavenumber",
    }
}

impl FrozenRow {
    /// Rows of all surveys with their changes.
    pub(super) fn of(measurements: &Measurements, changes: &[f64]) -> Vec<FrozenRow> {
        let surveys = measurements.surveys.iter();
        let rows = surveys.flat_map(|survey| survey.table.rows.iter().map(|row| (survey.name.clone(), row)));
        rows.zip(changes)
            .map(|((survey, row), &change)| FrozenRow {
                survey,
                bin: row.bin.clone(),
                pair: row.pair.clone(),
                multipole: row.multipole,
                axis: axis(row.axis).to_owned(),
                at: row.at,
                change,
            })
            .collect()
    }
}

impl Frozen {
    /// Reads the file that the blinded study names.
    ///
    /// # Errors
    /// [`RunError::UnreadableRun`].
    pub(super) fn read(path: &Path) -> Result<Frozen, RunError> {
        let fail = |reason: String| RunError::UnreadableRun { path: path.to_owned(), reason };
        let text = std::fs::read_to_string(path).map_err(|error| fail(error.to_string()))?;
        serde_json::from_str(&text).map_err(|error| fail(error.to_string()))
    }

    /// The change of each row of `measurements`, in their order; the name of the first row that was not frozen.
    pub(super) fn changes(&self, measurements: &Measurements) -> Result<Vec<f64>, String> {
        let wanted = FrozenRow::of(measurements, &vec![0.0; measurements.len()]);
        wanted
            .into_iter()
            .map(|row| {
                let same = |known: &&FrozenRow| FrozenRow { change: 0.0, ..(*known).clone() } == row;
                let known = self.change_per_tau.iter().find(same);
                known.map(|known| known.change).ok_or_else(|| {
                    format!("{} {} multipole {} at {}", row.survey, row.bin, row.multipole, row.at)
                })
            })
            .collect()
    }
}
