//! `oddwell new`: the template's study with measurements drawn for it.

use crate::file::{Override, StudyFile};
use crate::resolve::Study;
use crate::run_error::RunError;
use crate::simulate::{Draw, Truth, drawn};
use crate::template::{
    COVARIANCE_FILE, MULTIPOLES_FILE, STUDY_FILE, TemplateData, study_text, write_template,
};
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
    let overrides: Vec<Override> = TRUTH.into_iter().map(Override::parse).collect::<Result<_, _>>()?;
    let file = StudyFile::parse(STUDY_FILE, study_text(), folder)?;
    let study = Study::resolve(file, &overrides)?;
    let draw = Draw { truth: Truth::Centre, seed: SEED, mocks: 0 };
    let (drawn, _) = drawn(&study, study.hypothesis(Some("constant"))?, draw)?;
    let multipoles =
        format!("# Invented measurements of an invented survey.\n{}", drawn.text_of(MULTIPOLES_FILE));
    let covariance = drawn.text_of(COVARIANCE_FILE);
    Ok(write_template(folder, &TemplateData { multipoles: &multipoles, covariance: &covariance })?)
}
