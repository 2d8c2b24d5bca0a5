//! One survey's table: rows, units, and which of them are kept.

use crate::checksum::{InputHashes, file_sha256};
use crate::file::{KeepSection, Origin, SurveySection};
use crate::resolve::Study;
use crate::run_error::RunError;
use crate::warnings::Warning;
use oddwell_likelihood::{
    CovarianceRows, Keep, LengthUnit, MultipoleTable, keep_rows, read_covariance_rows, read_multipoles,
};
use std::collections::BTreeMap;

/// A survey's table, before its covariance is known.
#[derive(Clone, Debug)]
pub(super) struct SurveyRows {
    /// `[survey.columns]`.
    pub(super) columns: BTreeMap<String, String>,
    /// All rows, in the file's unit.
    pub(super) as_written: MultipoleTable,
    /// All rows, in Mpc/h.
    pub(super) table: MultipoleTable,
    /// Positions of the rows that are kept.
    pub(super) kept: Vec<usize>,
    /// The h that converted lengths given in Mpc; none where they were given in Mpc/h.
    pub(super) h: Option<f64>,
    /// What names the rows of the survey's arrays, where they are not the table's.
    named: Option<CovarianceRows>,
}

impl SurveyRows {
    /// # Errors
    /// [`RunError::Data`] for a table that can't be read, or of which `keep` leaves nothing.
    pub(super) fn read(
        study: &Study,
        section: &SurveySection,
        inputs: &mut InputHashes,
        warnings: &mut Vec<Warning>,
    ) -> Result<SurveyRows, RunError> {
        if section.multipoles.origin == Origin::Default {
            let (survey, study) = (section.name.value.clone(), study.file.source.name().to_owned());
            return Err(RunError::NotMeasured { survey, study });
        }
        let path = study.file.path_of(&section.multipoles.value);
        let columns: BTreeMap<String, String> =
            section.columns.iter().map(|(ours, theirs)| (ours.clone(), theirs.value.clone())).collect();
        let as_written = read_multipoles(&path, &columns)?;
        inputs.add(&path, file_sha256(&path));
        for ignored in &as_written.ignored_columns {
            warnings.push(Warning::IgnoredColumn {
                file: as_written.file.clone(),
                column: ignored.name.clone(),
                nearest: ignored.resembles.clone(),
            });
        }
        let h = (section.unit.value == LengthUnit::Megaparsec).then(|| conversion_h(study, section));
        let table = match h {
            Some(h) => as_written.clone().from_megaparsec(h)?,
            None => as_written.clone(),
        };
        let keep: Vec<Keep> = section.keep.iter().map(criteria).collect();
        let kept = keep_rows(&table, &keep)?.rows;
        let named = match &section.covariance_rows {
            None => None,
            Some(names) => {
                let path = study.file.path_of(&names.value);
                let named = read_covariance_rows(&path, &columns)?;
                inputs.add(&path, file_sha256(&path));
                Some(named)
            }
        };
        Ok(SurveyRows { columns, as_written, table, kept, h, named })
    }

    /// Rows of the survey's arrays: those that `covariance_rows` names, else the table's.
    pub(super) fn array_rows(&self) -> usize {
        self.named.as_ref().map_or(self.table.len(), CovarianceRows::len)
    }

    /// The position of each kept row in the survey's arrays.
    ///
    /// # Errors
    /// A row of the table that `covariance_rows` does not name.
    pub(super) fn kept_in_array(&self) -> Result<Vec<usize>, RunError> {
        let Some(named) = &self.named else { return Ok(self.kept.clone()) };
        let positions = named.positions(&self.as_written)?;
        Ok(self.kept.iter().map(|&row| positions[row]).collect())
    }

    /// What turns each kept value from the file's unit into ours.
    pub(super) fn factors(&self) -> Vec<f64> {
        match self.h {
            Some(h) => {
                let factors = self.as_written.value_factors(h);
                self.kept.iter().map(|&row| factors[row]).collect()
            }
            None => vec![1.0; self.kept.len()],
        }
    }

    /// The kept rows.
    pub(super) fn kept_table(&self) -> MultipoleTable {
        self.table.select(&self.kept)
    }
}

/// The h of lengths in Mpc: of the background that made them, else the one that is held (checked when the study was
/// resolved).
fn conversion_h(study: &Study, section: &SurveySection) -> f64 {
    if let Some(h) = section.fiducial.as_ref().and_then(|fiducial| fiducial.h.as_ref()) {
        return h.value;
    }
    study.default_hypothesis().quantity("background.h").map_or(f64::NAN, |h| h.form.constant)
}

fn criteria(keep: &KeepSection) -> Keep {
    let KeepSection { separation, wavenumber, multipoles, bins, pairs } = keep;
    Keep {
        separation: separation.as_ref().map(|range| range.value),
        wavenumber: wavenumber.as_ref().map(|range| range.value),
        multipoles: multipoles.as_ref().map(|list| list.value.clone()),
        bins: bins.as_ref().map(|list| list.value.clone()),
        pairs: pairs.as_ref().map(|list| list.value.iter().map(ToString::to_string).collect()),
    }
}
