//! A weighing read back.

use super::read_json;
use crate::record::WeighRecord;
use crate::run_error::RunError;
use std::path::{Path, PathBuf};

/// A directory that `oddwell weigh` wrote.
#[derive(Clone, Debug)]
pub struct Weighing {
    /// The directory, as given.
    pub directory: PathBuf,
    /// `weigh.json`.
    pub record: WeighRecord,
}

impl Weighing {
    /// The directories of the posteriors in it, in the order of the hypotheses.
    #[must_use]
    pub fn runs(&self) -> Vec<PathBuf> {
        let named = self.record.hypotheses.iter().filter_map(|hypothesis| hypothesis.run.as_ref());
        named.map(|run| self.directory.join(run)).collect()
    }
}

/// Reads a directory's `weigh.json`; none where it has none.
///
/// # Errors
/// [`RunError::UnreadableRun`].
pub fn read_weighing(directory: &Path) -> Result<Option<Weighing>, RunError> {
    let path = directory.join("weigh.json");
    if !path.exists() {
        return Ok(None);
    }
    Ok(Some(Weighing { directory: directory.to_owned(), record: read_json(&path)? }))
}
