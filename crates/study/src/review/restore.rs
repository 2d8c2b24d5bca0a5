//! From a manifest back to the study and its measurements, if they are still those of the run.

use super::ReviewError;
use crate::assemble::{Measurements, read_measurements};
use crate::file::{Override, StudyFile};
use crate::record::Manifest;
use crate::resolve::{Restriction, Study};
use std::path::Path;

/// The study as the run read it, and the measurements that it names, which must have the run's checksums.
pub(super) fn restore(manifest: &Manifest) -> Result<(Study, Measurements), ReviewError> {
    let path = Path::new(&manifest.study_file);
    let folder = path.parent().map(Path::to_owned).unwrap_or_default();
    let failed = |error: &dyn std::fmt::Display| ReviewError::Unusable { reason: error.to_string() };
    let file = StudyFile::parse(&manifest.study_file, manifest.study_text.clone(), folder)
        .map_err(|error| failed(&error))?;
    // The manifest has them as the command line did.
    let written = manifest.overrides.iter().map(|text| text.strip_prefix("--set ").unwrap_or(text));
    let overrides: Result<Vec<Override>, _> = written.map(Override::parse).collect();
    let overrides = overrides.map_err(|error| failed(&error))?;
    let study = Study::resolve(file, &overrides).map_err(|error| failed(&error))?;
    let restriction = Restriction { only: manifest.only.clone(), without: manifest.without.clone() };
    let study = study.restricted(&restriction).map_err(|error| failed(&error))?;
    let measurements = read_measurements(&study).map_err(|error| failed(&error))?;
    let before = |path: &str| manifest.inputs.iter().find(|input| input.path == path);
    for input in &measurements.inputs {
        if before(&input.path).is_none_or(|known| known.sha256 != input.sha256) {
            return Err(ReviewError::Changed { path: input.path.clone() });
        }
    }
    Ok((study, measurements))
}
