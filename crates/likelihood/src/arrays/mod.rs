//! Tables of numbers without names: covariances, mocks, templates. One format a file, one line in [`array_formats`].

mod csv;
mod error;
mod fits;
mod npy;

use std::fmt::Debug;
use std::path::Path;

use nalgebra::DMatrix;

pub use error::ArrayError;
pub use npy::npy_bytes;

use crate::error::DataError;

/// Numbers in lines and columns, as a file holds them. They may be not finite: who uses them decides.
#[derive(Clone, Debug)]
pub(crate) struct NumberArray {
    /// The path, as it was given.
    pub(crate) file: String,
    pub(crate) numbers: DMatrix<f64>,
    /// What a line is called in messages: `line 3` of a text file, `row 3` of an array.
    pub(crate) line_names: Vec<String>,
}

/// Called with the numbers of lines and columns before any number is read; says whether the shape is the wanted one.
pub(crate) type ShapeRule<'a> = &'a dyn Fn(&str, usize, usize) -> Result<(), DataError>;

/// A way to write a table of numbers in a file.
pub trait ArrayFormat: Debug + Sync {
    /// The name for help and messages: `csv`, `npy`, `fits`.
    fn name(&self) -> &'static str;

    /// The endings of file names, without the dot, in lower case; the first is the usual one.
    fn extensions(&self) -> &'static [&'static str];

    /// One line for help and manual.
    fn summary(&self) -> &'static str;

    /// Reads the bytes of a file; `file` names it in messages. Must neither panic nor allocate more than some
    /// multiples of the file's size, whatever the bytes are. `rule` is called with the numbers of lines and columns
    /// before any number is read. Returns the numbers, which may be not finite, and what each line is called in
    /// messages: `line 3` of a text file, `row 3` of an array.
    ///
    /// # Errors
    /// Bytes that are no such file, an array of more than two dimensions, numbers of another type, what `rule` says.
    fn numbers(
        &self,
        file: &str,
        bytes: &[u8],
        rule: &dyn Fn(usize, usize) -> Result<(), DataError>,
    ) -> Result<(DMatrix<f64>, Vec<String>), DataError>;
}

/// The formats that a covariance, an array of mocks or a template can have.
pub fn array_formats() -> &'static [&'static dyn ArrayFormat] {
    &[&csv::Csv, &npy::Npy, &fits::Fits]
}

/// The format for a path, by what follows its last dot, capitals aside.
pub(crate) fn format_of(path: &Path) -> Result<&'static dyn ArrayFormat, DataError> {
    let extension = path.extension().map(|text| text.to_string_lossy().to_lowercase()).unwrap_or_default();
    let found = array_formats().iter().find(|format| format.extensions().contains(&extension.as_str()));
    found.copied().ok_or_else(|| {
        let known: Vec<String> =
            array_formats().iter().map(|format| format!(".{}", format.extensions()[0])).collect();
        ArrayError::UnknownExtension { file: path.display().to_string(), known: known.join(", ") }.into()
    })
}

/// The bytes of a file.
pub(crate) fn file_bytes(path: &Path) -> Result<Vec<u8>, DataError> {
    let file = || path.display().to_string();
    std::fs::read(path).map_err(|reason| match reason.kind() {
        std::io::ErrorKind::NotFound => DataError::Missing { file: file() },
        _ => DataError::Unreadable { file: file(), reason },
    })
}

/// Reads the bytes of a file as a table of numbers of the shape that `rule` accepts; `file` names it in messages.
pub(crate) fn parse_array(
    format: &dyn ArrayFormat,
    file: &str,
    bytes: &[u8],
    rule: ShapeRule<'_>,
) -> Result<NumberArray, DataError> {
    let (numbers, line_names) = format.numbers(file, bytes, &|lines, columns| rule(file, lines, columns))?;
    Ok(NumberArray { file: file.to_owned(), numbers, line_names })
}

impl NumberArray {
    /// Every number must be finite.
    pub(crate) fn check_finite(&self) -> Result<(), DataError> {
        for (column, numbers) in self.numbers.column_iter().enumerate() {
            if let Some((line, value)) = numbers.iter().enumerate().find(|(_, value)| !value.is_finite()) {
                let (file, line) = (self.file.clone(), self.line_names[line].clone());
                return Err(ArrayError::NotFinite { file, line, column: column + 1, value: *value }.into());
            }
        }
        Ok(())
    }
}

/// `row 1`, `row 2`, …
fn row_names(count: usize) -> Vec<String> {
    (1..=count).map(|row| format!("row {row}")).collect()
}

/// Lines and columns of an array of one or two dimensions, slowest first; a list of numbers is one column.
fn two_dimensions(file: &str, shape: &[usize]) -> Result<(usize, usize), DataError> {
    match *shape {
        [lines] => Ok((lines, 1)),
        [lines, columns] => Ok((lines, columns)),
        _ => {
            let shown: Vec<String> = shape.iter().map(ToString::to_string).collect();
            let (file, shape) = (file.to_owned(), format!("({})", shown.join(", ")));
            Err(ArrayError::Dimensions { file, found: shown.len(), shape }.into())
        }
    }
}
