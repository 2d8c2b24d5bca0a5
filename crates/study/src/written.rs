//! Files that a command leaves behind: complete or not there at all.

use crate::run_error::RunError;
use std::fs;
use std::path::Path;

/// Writes a file under another name beside its place, then moves it there.
///
/// # Errors
/// [`RunError::FileExists`] where there is one already and it may not be replaced; [`RunError::Unwritable`].
pub fn write_file(path: &Path, bytes: &[u8], replace: bool) -> Result<(), RunError> {
    may_write(path, replace)?;
    let name = path.file_name().unwrap_or_default().to_string_lossy();
    let unfinished = path.with_file_name(format!(".{name}.unfinished-{}", std::process::id()));
    let written = fs::write(&unfinished, bytes).and_then(|()| fs::rename(&unfinished, path));
    written.map_err(|error| {
        // Nothing half-written stays behind.
        let _ = fs::remove_file(&unfinished);
        RunError::unwritable(path)(error)
    })
}

/// Whether [`write_file`] may write there: better known before long work than after it.
///
/// # Errors
/// [`RunError::FileExists`].
pub fn may_write(path: &Path, replace: bool) -> Result<(), RunError> {
    if !replace && path.symlink_metadata().is_ok() {
        return Err(RunError::FileExists { path: path.to_owned() });
    }
    Ok(())
}

/// Makes a folder, and those above it, unless it is there.
///
/// # Errors
/// [`RunError::Unwritable`].
pub fn make_folder(path: &Path) -> Result<(), RunError> {
    fs::create_dir_all(path).map_err(RunError::unwritable(path))
}
