//! Reads the matrix of a window.

use nalgebra::DMatrix;
use oddwell_likelihood::{ArrayError, DataError, array_formats};
use std::path::Path;

/// A matrix from a file, in any of [`array_formats`], told from the ending.
///
/// # Errors
/// [`DataError`]: no such file, an ending that no format has, not such a file, a number that is not finite.
pub(super) fn read_matrix(path: &Path) -> Result<DMatrix<f64>, DataError> {
    let file = || path.display().to_string();
    let extension = path.extension().map(|text| text.to_string_lossy().to_lowercase()).unwrap_or_default();
    let format = array_formats().iter().find(|format| format.extensions().contains(&extension.as_str()));
    let Some(format) = format else {
        let known = array_formats().iter().map(|format| format!(".{}", format.extensions()[0]));
        let known = known.collect::<Vec<_>>().join(", ");
        return Err(ArrayError::UnknownExtension { file: file(), known }.into());
    };
    let bytes = std::fs::read(path).map_err(|reason| match reason.kind() {
        std::io::ErrorKind::NotFound => DataError::Missing { file: file() },
        _ => DataError::Unreadable { file: file(), reason },
    })?;
    // Which shape is right is for the caller to say, who knows the rows.
    let (matrix, lines) = format.numbers(&file(), &bytes, &|_, _| Ok(()))?;
    for (column, numbers) in matrix.column_iter().enumerate() {
        if let Some((line, &value)) = numbers.iter().enumerate().find(|(_, value)| !value.is_finite()) {
            let line = lines[line].clone();
            return Err(ArrayError::NotFinite { file: file(), line, column: column + 1, value }.into());
        }
    }
    Ok(matrix)
}
