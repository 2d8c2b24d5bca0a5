//! Covariances from files, and which of their rows are the table's.

use std::collections::BTreeMap;
use std::path::Path;

use crate::arrays::{ArrayFormat, NumberArray, array_formats, file_bytes, format_of, parse_array};
use crate::covariance::Covariance;
use crate::error::DataError;
use crate::header::Header;
use crate::records::Records;
use crate::rows::{RowIndex, RowKey, RowReader};
use crate::table::{MeasuredRow, MultipoleTable};

const MATRIX: &str = "a square matrix, one line a row";
const ROWS: &str = "a header such as bin,multipole,separation and a line for each row of the covariance";

/// Reads a square table of numbers as the covariance of `rows` rows, in the format that the file's ending names: a CSV
/// file without a header, a NumPy array or a FITS image ([`array_formats`](crate::array_formats)).
///
/// `rows` is the number of rows of the table, or of `covariance_rows` where it is given.
///
/// # Errors
/// No such file; an ending that no format has; a file that is not of its format, is cut short, holds integers or more
/// than two dimensions; text in a number (line and column named); not `rows` × `rows`; a number that is not finite; not
/// symmetric; a variance ≤ 0.
pub fn read_covariance(path: impl AsRef<Path>, rows: usize) -> Result<Covariance, DataError> {
    let path = path.as_ref();
    covariance_from(format_of(path)?, &path.display().to_string(), &file_bytes(path)?, rows)
}

/// As [`read_covariance`], for a CSV file whatever its ending.
///
/// # Errors
/// As [`read_covariance`].
pub fn read_covariance_csv(path: impl AsRef<Path>, rows: usize) -> Result<Covariance, DataError> {
    let path = path.as_ref();
    Covariance::parse_csv(&path.display().to_string(), &file_bytes(path)?, rows)
}

impl Covariance {
    /// As [`read_covariance`], from memory; `file` names it in messages and its ending the format.
    ///
    /// # Errors
    /// As [`read_covariance`].
    pub fn parse(file: &str, bytes: &[u8], rows: usize) -> Result<Self, DataError> {
        covariance_from(format_of(Path::new(file))?, file, bytes, rows)
    }

    /// As [`read_covariance_csv`], from memory; `file` names it in messages.
    ///
    /// # Errors
    /// As [`read_covariance`].
    pub fn parse_csv(file: &str, bytes: &[u8], rows: usize) -> Result<Self, DataError> {
        covariance_from(array_formats()[0], file, bytes, rows)
    }
}

fn covariance_from(
    format: &dyn ArrayFormat,
    file: &str,
    bytes: &[u8],
    rows: usize,
) -> Result<Covariance, DataError> {
    let NumberArray { file, numbers, line_names } = square_array(format, file, bytes, rows)?;
    Ok(Covariance::labelled(numbers, file, line_names)?)
}

/// A table of `rows` × `rows` numbers, not checked further.
pub(crate) fn square_array(
    format: &dyn ArrayFormat,
    file: &str,
    bytes: &[u8],
    rows: usize,
) -> Result<NumberArray, DataError> {
    let square = |file: &str, lines: usize, columns: usize| {
        if (lines, columns) == (rows, rows) {
            return Ok(());
        }
        let way_out = if columns == 1 && rows > 1 && format.name() == "csv" {
            "separate the numbers of a line with commas"
        } else if lines == columns && lines > rows {
            "if it holds more rows than the table, name its rows with `covariance_rows`"
        } else {
            "give the covariance of all rows of the table, in the table's order"
        };
        let (file, expected) = (file.to_owned(), rows);
        Err(DataError::CovarianceSize { file, expected, rows: lines, columns, way_out })
    };
    parse_array(format, file, bytes, &square).map_err(|error| match error {
        DataError::Empty { file, .. } => DataError::Empty { file, wanted: MATRIX },
        other => other,
    })
}

/// The columns of a `covariance_rows` file.
pub const COVARIANCE_ROW_COLUMNS: [&str; 5] = ["bin", "pair", "multipole", "separation", "wavenumber"];

/// What each row of a covariance is about.
#[derive(Clone, Debug)]
pub struct CovarianceRows {
    file: String,
    keys: Vec<RowKey>,
}

/// Reads a `covariance_rows` file: a CSV header `bin`, `multipole`, `separation` or `wavenumber`, optionally `pair`, and
/// below it a line for each row of the covariance, in its order. It may hold more rows than the table. `columns` is the
/// table's, of which the entries for other columns are passed over.
///
/// # Errors
/// As [`read_multipoles`](crate::read_multipoles); two lines for the same row are an error.
pub fn read_covariance_rows(
    path: impl AsRef<Path>,
    columns: &BTreeMap<String, String>,
) -> Result<CovarianceRows, DataError> {
    CovarianceRows::from_records(&Records::read(path.as_ref(), ROWS)?, columns)
}

impl CovarianceRows {
    /// As [`read_covariance_rows`], from memory; `file` names it in messages.
    ///
    /// # Errors
    /// As [`read_covariance_rows`].
    pub fn parse(file: &str, bytes: &[u8], columns: &BTreeMap<String, String>) -> Result<Self, DataError> {
        Self::from_records(&Records::parse(file.to_owned(), bytes, ROWS)?, columns)
    }

    fn from_records(records: &Records, columns: &BTreeMap<String, String>) -> Result<Self, DataError> {
        let of_the_table_only = ["low", "high", "value", "error"];
        let columns = columns.iter().filter(|(name, _)| !of_the_table_only.contains(&name.as_str()));
        let columns = columns.map(|(name, in_file)| (name.clone(), in_file.clone())).collect();
        let header = Header::new(records, &COVARIANCE_ROW_COLUMNS, &columns)?;
        for any_of in [&["bin"][..], &["multipole"], &["separation", "wavenumber"]] {
            header.require(records, any_of)?;
        }
        let file = records.file.clone();
        let below = records.below_header()?;
        let mut index = RowIndex::default();
        let mut keys: Vec<RowKey> = Vec::with_capacity(below.len());
        for record in below {
            let key = RowReader { records, header: &header, record }.key()?;
            if let Some(earlier) = index.find(&key) {
                let (line, first) = (record.line, below[earlier].line);
                return Err(DataError::DuplicateRow { file, line, first, row: key.to_string() });
            }
            index.insert(&key, keys.len());
            keys.push(key);
        }
        Ok(Self { file, keys })
    }

    /// Number of rows, so the size of the covariance.
    pub fn len(&self) -> usize {
        self.keys.len()
    }

    /// Whether there are none (a file that was read has some).
    pub fn is_empty(&self) -> bool {
        self.keys.is_empty()
    }

    /// For each row of the table, its row in the covariance; for [`Covariance::select`]. Places (separation or
    /// wavenumber) are compared to one part in 10⁶. Both must be in the same unit: do this before any conversion.
    ///
    /// # Errors
    /// [`DataError::RowNotInCovariance`] for the first row that is not there.
    pub fn positions(&self, table: &MultipoleTable) -> Result<Vec<usize>, DataError> {
        let mut index = RowIndex::default();
        for (position, key) in self.keys.iter().enumerate() {
            index.insert(key, position);
        }
        let position = |row: &MeasuredRow| {
            index.find(&row.key()).ok_or_else(|| DataError::RowNotInCovariance {
                file: self.file.clone(),
                row: row.description(),
                table: table.file.clone(),
                line: row.line,
            })
        };
        table.rows.iter().map(position).collect()
    }
}
