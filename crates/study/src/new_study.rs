//! `oddwell new`: the template's study with measurements drawn for it.

use crate::file::{Override, StudyFile};
use crate::resolve::Study;
use crate::run_error::RunError;
use crate::simulate::{Design, simulate};
use crate::template::{STUDY_FILE, TemplateData, study_text, write_template};
use oddwell_model::covariance::Sampling;
use std::path::{Path, PathBuf};

/// What the invented measurements are drawn from, besides the centres of the priors.
const TRUTH: [&str; 4] = [
    "departure.tau=2.0",
    "windmere.near.offset=5.0",
    "windmere.far.offset=-4.0",
    "windmere.near.first.evolution=0.1",
];
const SEED: u64 = 1907;

/// Writes a small working study with invented data into a folder that does not exist or is empty; returns the files, the
/// study first.
///
/// # Errors
/// [`RunError::Study`] for a folder with something in it, or one that can't be written.
pub fn write_new_study(folder: &Path) -> Result<Vec<PathBuf>, RunError> {
    let resolve = |overrides: &[Override]| -> Result<Study, RunError> {
        let file = StudyFile::parse(STUDY_FILE, study_text(), folder)?;
        Ok(Study::resolve(file, overrides)?)
    };
    let overrides: Vec<Override> = TRUTH.into_iter().map(Override::parse).collect::<Result<_, _>>()?;
    let (truth, fiducial) = (resolve(&overrides)?, resolve(&[])?);
    let design = Design {
        multipoles: vec![1, 3],
        edges: (0..=15).map(|i| 24.0 + 8.0 * f64::from(i)).collect(),
        bins: vec![
            Sampling { volume: 2.0e9, first_density: 8e-4, second_density: 3e-3 },
            Sampling { volume: 5.0e9, first_density: 6e-4, second_density: 2e-3 },
        ],
    };
    let drawn = simulate(
        &truth,
        truth.hypothesis(Some("constant"))?,
        (&fiducial, fiducial.hypothesis(Some("gr"))?),
        &design,
        SEED,
    )?;
    // The template has one survey.
    let (multipoles, covariance) = drawn.into_iter().next().map_or_else(Default::default, |survey| {
        let note = "# Invented measurements of an invented survey.\n";
        (format!("{note}{}", survey.multipoles), survey.covariance)
    });
    Ok(write_template(folder, &TemplateData { multipoles: &multipoles, covariance: &covariance })?)
}
