//! Reads what a study measured.

use super::window::{SurveyWindow, read_window};
use crate::checksum::{InputHashes, file_sha256};
use crate::file::{BinSection, KeepSection, Origin, SurveySection};
use crate::nearest::Nearest;
use crate::record::InputFile;
use crate::resolve::Study;
use crate::run_error::RunError;
use crate::warnings::Warning;
use oddwell_likelihood::{
    Axis, Covariance, CovarianceRows, Keep, LengthUnit, MultipoleTable, NoiseChoice, SurveyLikelihood,
    keep_rows, read_covariance as read_covariance_file, read_covariance_rows, read_multipoles,
};
use oddwell_model::{Pair, Row, Space};
use std::collections::BTreeMap;

/// One survey's kept rows and their likelihood.
#[derive(Clone, Debug)]
pub struct SurveyMeasurements {
    /// The survey's name.
    pub name: String,
    /// The rows that `keep` leaves, in the file's order, in Mpc/h.
    pub table: MultipoleTable,
    /// Rows that `keep` cut.
    pub cut: usize,
    /// Data, covariance and noise model of the kept rows.
    pub likelihood: SurveyLikelihood,
    /// Each kept row's index among the study's bins.
    pub bins: Vec<usize>,
    /// The h that converted lengths given in Mpc; none where they were given in Mpc/h.
    pub h: Option<f64>,
    /// What turns predictions into the kept rows, where the survey has a window.
    pub window: Option<SurveyWindow>,
}

impl SurveyMeasurements {
    /// Positions of the rows of one bin (index among the study's bins).
    #[must_use]
    pub fn rows_of(&self, bin: usize) -> Vec<usize> {
        (0..self.bins.len()).filter(|&row| self.bins[row] == bin).collect()
    }
}

/// Everything a study measured.
#[derive(Clone, Debug)]
pub struct Measurements {
    /// By survey, in the study's order.
    pub surveys: Vec<SurveyMeasurements>,
    /// All kept rows, survey after survey: what each measured number is.
    pub rows: Vec<Row>,
    /// Checksums of the files read, the study file first.
    pub inputs: Vec<InputFile>,
    /// What is suspicious.
    pub warnings: Vec<Warning>,
}

impl Measurements {
    /// The rows that a model has to predict: those measured, and in their place those of the window for a survey that
    /// has one.
    #[must_use]
    pub fn model_rows(&self) -> Vec<Row> {
        let mut rows = Vec::new();
        let mut first = 0;
        for survey in &self.surveys {
            let own = &self.rows[first..first + survey.table.len()];
            first += own.len();
            rows.extend(survey.window.as_ref().map_or(own, |window| &window.rows[..]));
        }
        rows
    }

    /// How many numbers are kept.
    #[must_use]
    pub fn len(&self) -> usize {
        self.rows.len()
    }

    /// Whether nothing is kept (never: that is an error).
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.rows.is_empty()
    }
}

/// Reads the tables and covariances of all surveys, cuts by `keep`, converts units, and factors the covariances.
///
/// # Errors
/// [`RunError`] for a file that can't be read or breaks a rule, for rows without a bin and bins without a row, and where
/// the covariance does not go with the rows.
pub fn read_measurements(study: &Study) -> Result<Measurements, RunError> {
    let mut inputs = InputHashes::new(study);
    let mut warnings = Vec::new();
    let (mut surveys, mut rows) = (Vec::new(), Vec::new());
    let mut first_bin = 0;
    for section in &study.file.surveys {
        let survey = read_survey(study, section, first_bin, &mut inputs, &mut warnings)?;
        for (row, &bin) in survey.table.rows.iter().zip(&survey.bins) {
            // The table's reader has checked the pair.
            let pair = Pair::parse(&row.pair).unwrap_or(Pair::FirstSecond);
            let space = match row.axis {
                Axis::Separation => Space::Separation,
                Axis::Wavenumber => Space::Fourier,
            };
            rows.push(Row { bin, pair, multipole: row.multipole, space, at: row.at, edges: row.edges });
        }
        first_bin += section.bins.len();
        surveys.push(survey);
    }
    Ok(Measurements { surveys, rows, inputs: inputs.finish(), warnings })
}

fn read_survey(
    study: &Study,
    section: &SurveySection,
    first_bin: usize,
    inputs: &mut InputHashes,
    warnings: &mut Vec<Warning>,
) -> Result<SurveyMeasurements, RunError> {
    let name = section.name.value.clone();
    if section.multipoles.origin == Origin::Default {
        return Err(RunError::NotMeasured { survey: name, study: study.file.source.name().to_owned() });
    }
    let path = study.file.path_of(&section.multipoles.value);
    let columns: BTreeMap<String, String> =
        section.columns.iter().map(|(ours, theirs)| (ours.clone(), theirs.value.clone())).collect();
    let mut table = read_multipoles(&path, &columns)?;
    inputs.add(&path, file_sha256(&path));
    for ignored in &table.ignored_columns {
        warnings.push(Warning::IgnoredColumn {
            file: table.file.clone(),
            column: ignored.name.clone(),
            nearest: ignored.resembles.clone(),
        });
    }
    let h = (section.unit.value == LengthUnit::Megaparsec).then(|| conversion_h(study, section));
    let mut factors = None;
    if let Some(h) = h {
        factors = Some(table.value_factors(h));
        table = table.from_megaparsec(h)?;
    }
    let keep: Vec<Keep> = section.keep.iter().map(criteria).collect();
    let kept = keep_rows(&table, &keep)?;
    let whole = read_covariance(study, section, &table, &columns, inputs)?;
    let whole = match factors {
        Some(factors) if section.covariance.is_some() => whole.scaled(&factors),
        _ => whole,
    };
    let covariance = whole.with_labels(table.row_labels()).select(&kept.rows);
    let rows = (&table, &kept.rows[..]);
    let window = read_window(study, section, rows, first_bin, h, &columns, inputs)?;
    let cut = kept.cut.len();
    let all_bins: Vec<String> = table.bins().iter().map(ToString::to_string).collect();
    let table = table.select(&kept.rows);
    let bins = bins_of_rows(section, &table, first_bin)?;
    check_every_bin_has_rows(study, section, &table, &all_bins)?;
    let mock_count = section.mock_count.as_ref().map(|count| count.value as usize);
    let noise = NoiseChoice::new(section.noise.value, mock_count)
        .map_err(|source| RunError::Noise { survey: name.clone(), source })?;
    let likelihood = SurveyLikelihood::from_covariance(table.values(), covariance, &noise)
        .map_err(|source| RunError::Likelihood { survey: name.clone(), source })?;
    Ok(SurveyMeasurements { name, h, table, cut, likelihood, bins, window })
}

/// The h of lengths in Mpc: of the background that made them, else the one that is held (checked when the study was
/// resolved).
fn conversion_h(study: &Study, section: &SurveySection) -> f64 {
    if let Some(h) = section.fiducial.as_ref().and_then(|fiducial| fiducial.h.as_ref()) {
        return h.value;
    }
    study.default_hypothesis().quantity("background.h").map_or(f64::NAN, |h| h.form.constant)
}

/// The covariance of all rows of the table, in the table's order.
fn read_covariance(
    study: &Study,
    section: &SurveySection,
    table: &MultipoleTable,
    columns: &BTreeMap<String, String>,
    inputs: &mut InputHashes,
) -> Result<Covariance, RunError> {
    let in_survey = |source| RunError::Likelihood { survey: section.name.value.clone(), source };
    let Some(covariance) = &section.covariance else {
        return Covariance::from_errors(table).map_err(|error| in_survey(error.into()));
    };
    let path = study.file.path_of(&covariance.value);
    let result = match &section.covariance_rows {
        None => read_covariance_file(&path, table.len())?,
        Some(names) => {
            let names_path = study.file.path_of(&names.value);
            let named: CovarianceRows = read_covariance_rows(&names_path, columns)?;
            inputs.add(&names_path, file_sha256(&names_path));
            let positions = named.positions(table)?;
            read_covariance_file(&path, named.len())?.select(&positions)
        }
    };
    inputs.add(&path, file_sha256(&path));
    Ok(result)
}

fn bins_of_rows(
    section: &SurveySection,
    table: &MultipoleTable,
    first_bin: usize,
) -> Result<Vec<usize>, RunError> {
    let names = || section.bins.iter().map(|bin| bin.name.value.as_str());
    table
        .rows
        .iter()
        .map(|row| {
            names().position(|name| name == row.bin).map(|position| first_bin + position).ok_or_else(|| {
                let nearest = Nearest::find(&row.bin, names());
                let close = nearest.name().filter(|_| nearest.is_close());
                let suggestion = close.map(|name| format!("; did you mean `{name}`?")).unwrap_or_default();
                RunError::RowWithoutBin {
                    file: table.file.clone(),
                    line: row.line,
                    bin: row.bin.clone(),
                    survey: section.name.value.clone(),
                    known: names().map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", "),
                    suggestion,
                }
            })
        })
        .collect()
}

fn check_every_bin_has_rows(
    study: &Study,
    section: &SurveySection,
    table: &MultipoleTable,
    before_keep: &[String],
) -> Result<(), RunError> {
    let lacks = |bin: &&BinSection| table.rows.iter().all(|row| row.bin != bin.name.value);
    match section.bins.iter().find(lacks) {
        None => Ok(()),
        Some(bin) => Err(RunError::BinWithoutRow {
            study: study.file.source.name().to_owned(),
            line: bin.name.origin.line().unwrap_or(1),
            survey: section.name.value.clone(),
            bin: bin.name.value.clone(),
            file: table.file.clone(),
            after_keep: if before_keep.contains(&bin.name.value) { " that passes `keep`" } else { "" },
        }),
    }
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
