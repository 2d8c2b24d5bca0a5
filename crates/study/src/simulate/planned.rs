//! Surveys that are known by their design: their tables and covariances, as files that the readers of measured ones read.

use super::in_general_relativity;
use crate::assemble::{Measurements, model_setup};
use crate::copy::StudyCopy;
use crate::file::{BinDesignSection, DesignSection, Located, Origin, SurveySection};
use crate::parameter_map::ParameterMap;
use crate::resolve::{Hypothesis, Study};
use crate::run_error::RunError;
use nalgebra::DMatrix;
use oddwell_cosmology::Background;
use oddwell_likelihood::noise_families;
use oddwell_model::covariance::{Sampling, gaussian_covariance};
use oddwell_model::{Model, Pair, Row, Space, Workspace};
use std::fmt::Write;
use std::fs;
use tempfile::TempDir;

/// Square degrees in a steradian, (180/π)².
const SQUARE_DEGREES: f64 = 3_282.806_350_011_743_6;

/// A study whose every survey has a table and a covariance: those of a survey with a design stand in a folder that goes when
/// this does.
pub(super) struct Plan {
    study: Study,
    folder: Option<TempDir>,
}

impl Plan {
    /// Tables with zeros for values, and Gaussian covariances in general relativity at the centre of the priors of
    /// `fiducial` (with its hypothesis), for every survey of `study` with a design. With `mocks`, every row of every survey is
    /// kept.
    pub(super) fn new(
        study: &Study,
        fiducial: &Study,
        hypothesis: &Hypothesis,
        mocks: usize,
    ) -> Result<Plan, RunError> {
        let mut planned = study.clone();
        for section in &mut planned.file.surveys {
            if section.design.is_some() || mocks > 0 {
                section.keep.clear();
            }
        }
        if planned.file.surveys.iter().all(|section| section.design.is_none()) {
            return Ok(Plan { study: planned, folder: None });
        }
        check_noise(study, mocks)?;
        let windowed = |section: &&SurveySection| section.design.is_some() && section.window.is_some();
        if let Some(section) = study.file.surveys.iter().find(windowed) {
            return Err(RunError::DesignWithWindow { survey: section.name.value.clone() });
        }
        let jointly = |section: &&SurveySection| {
            section.design.is_some() && study.file.joint_covariance_of(&section.name.value).is_some()
        };
        if let Some(section) = study.file.surveys.iter().find(jointly) {
            return Err(RunError::DesignOfShared { survey: section.name.value.clone() });
        }
        let rows = rows_of(study);
        let (model, values) = at_centre(fiducial, hypothesis, rows)?;
        let folder = tempfile::tempdir().map_err(RunError::unwritable(std::env::temp_dir()))?;
        let mut bin = 0;
        for section in &mut planned.file.surveys {
            let bins = bin..bin + section.bins.len();
            bin = bins.end;
            let Some(design) = section.design.clone() else { continue };
            let mut blocks = Vec::new();
            for (bin, within) in bins.zip(&section.bins) {
                let Some(sampling) = sampling(hypothesis, &design, within.design.as_ref())? else {
                    continue;
                };
                blocks.push(gaussian_covariance(&model, &values, &mut Workspace::new(), bin, &sampling)?);
            }
            let write = |name: String, text: String| -> Result<String, RunError> {
                let path = folder.path().join(name);
                fs::write(&path, text).map_err(RunError::unwritable(&path))?;
                Ok(path.to_string_lossy().into_owned())
            };
            let name = section.name.value.clone();
            section.multipoles.value = write(format!("{name}-multipoles.csv"), table(section, &design))?;
            let covariance = write(format!("{name}-covariance.csv"), square_table(&blocks))?;
            let origin = section.covariance.as_ref().map_or(Origin::Default, |given| given.origin);
            section.covariance = Some(Located { value: covariance, origin });
            if section.multipoles.origin == Origin::Default {
                // It is there now.
                section.multipoles.origin = Origin::Set;
            }
            without_mocks(section);
        }
        Ok(Plan { study: planned, folder: Some(folder) })
    }

    /// The study to be read.
    pub(super) fn study(&self) -> &Study {
        &self.study
    }

    /// Rounds the values of planned surveys to the seven digits that their tables carry.
    pub(super) fn round(&self, measurements: &Measurements, values: &mut [f64]) {
        let mut first = 0;
        for (section, survey) in self.study.file.surveys.iter().zip(&measurements.surveys) {
            let own = first..first + survey.table.len();
            first = own.end;
            if section.design.is_some() {
                for value in &mut values[own] {
                    // A number's own digits read back.
                    *value = format!("{value:.6e}").parse().unwrap_or(*value);
                }
            }
        }
    }

    /// Has the copy name the tables and covariances that its text did not name before, and no longer what described an older
    /// covariance.
    pub(super) fn name_files(&self, copy: &mut StudyCopy) -> Result<(), RunError> {
        if self.folder.is_none() {
            return Ok(());
        }
        for section in &self.study.file.surveys {
            if section.design.is_some() {
                let name = &section.name.value;
                let files = [
                    ("multipoles", format!("{name}-multipoles.csv")),
                    ("covariance", format!("{name}-covariance.csv")),
                ];
                copy.edit_survey(
                    name,
                    &files,
                    &["covariance_rows", "mocks", "mock_count", "shrink_towards"],
                )?;
            }
        }
        Ok(())
    }
}

/// Normal noise with a known covariance.
fn without_mocks(section: &mut SurveySection) {
    section.covariance_rows = None;
    section.mocks = None;
    section.mock_count = None;
    section.shrink_towards = None;
    section.noise = Located::default_of("gaussian");
}

fn check_noise(study: &Study, mocks: usize) -> Result<(), RunError> {
    let needs = |section: &&SurveySection| {
        section.design.is_some()
            && noise_families().iter().any(|family| family.name == section.noise.value && family.needs_mocks)
    };
    match study.file.surveys.iter().find(needs) {
        Some(section) if mocks == 0 => Err(RunError::NeedsMocks {
            survey: section.name.value.clone(),
            noise: section.noise.value.to_owned(),
        }),
        _ => Ok(()),
    }
}

/// The rows of all surveys with a design.
fn rows_of(study: &Study) -> Vec<Row> {
    let mut rows = Vec::new();
    let mut bin = 0;
    for section in &study.file.surveys {
        for _ in &section.bins {
            if let Some(design) = &section.design {
                let space = if design.fourier { Space::Fourier } else { Space::Separation };
                for &multipole in &design.multipoles.value {
                    rows.extend(design.shells().map(|(at, edges)| Row {
                        bin,
                        pair: Pair::FirstSecond,
                        multipole,
                        space,
                        at,
                        edges: Some(edges),
                    }));
                }
            }
            bin += 1;
        }
    }
    rows
}

/// The model in general relativity, and its quantities at the centre of the priors.
fn at_centre(study: &Study, hypothesis: &Hypothesis, rows: Vec<Row>) -> Result<(Model, Vec<f64>), RunError> {
    let model = Model::new(in_general_relativity(model_setup(study, hypothesis, rows)?))?;
    let mut without = hypothesis.clone();
    without.quantities.retain(|quantity| !quantity.name.starts_with("departure."));
    let map = ParameterMap::new(&without, model.layout().names())?;
    let mut values = vec![0.0; map.slots()];
    map.fill(&hypothesis.start(), &mut values);
    Ok((model, values))
}

/// Volume and densities of a bin; none for a bin without design (never: that is an error of the study).
pub(crate) fn sampling(
    hypothesis: &Hypothesis,
    design: &DesignSection,
    bin: Option<&BinDesignSection>,
) -> Result<Option<Sampling>, RunError> {
    let Some(bin) = bin else { return Ok(None) };
    let volume = match (&bin.volume, &bin.redshifts, &design.area) {
        (Some(volume), ..) => volume.value,
        (None, Some(redshifts), Some(area)) => {
            let centre = hypothesis.start();
            let value =
                |name: &str| hypothesis.quantity(name).map_or(0.0, |quantity| quantity.form.value(&centre));
            let background = Background::new(
                value("background.omega_m"),
                value("background.omega_k"),
                value("background.w0"),
                value("background.wa"),
            )?;
            let (low, high) = redshifts.value;
            background.epoch(high)?;
            area.value / SQUARE_DEGREES * background.comoving_volume(low, high)
        }
        _ => return Ok(None),
    };
    let (first_density, second_density) = (bin.first_density.value, bin.second_density.value);
    Ok(Some(Sampling { volume, first_density, second_density }))
}

/// A table of multipoles with zeros for values, with the headers that the survey's columns go by.
fn table(section: &SurveySection, design: &DesignSection) -> String {
    let place = if design.fourier { "wavenumber" } else { "separation" };
    let header =
        |name: &str| section.columns.get(name).map_or(name.to_owned(), |theirs| theirs.value.clone());
    let headers = ["bin", "multipole", place, "low", "high", "value"].map(header);
    let mut table = headers.join(",") + "\n";
    for bin in &section.bins {
        let name = &bin.name.value;
        for multipole in &design.multipoles.value {
            for (at, (low, high)) in design.shells() {
                // Writing to a string can't fail.
                let _ = writeln!(table, "{name},{multipole},{at},{low},{high},0");
            }
        }
    }
    table
}

/// A block-diagonal matrix as a square CSV table.
fn square_table(blocks: &[DMatrix<f64>]) -> String {
    let size: usize = blocks.iter().map(DMatrix::nrows).sum();
    let mut table = String::new();
    let mut first = 0;
    for block in blocks {
        for row in 0..block.nrows() {
            for column in 0..size {
                let inside = (first..first + block.ncols()).contains(&column);
                let value = if inside { block[(row, column - first)] } else { 0.0 };
                let separator = if column == 0 { "" } else { "," };
                let _ = if value == 0.0 {
                    write!(table, "{separator}0")
                } else {
                    write!(table, "{separator}{value:.8e}")
                };
            }
            table.push('\n');
        }
        first += block.nrows();
    }
    table
}
