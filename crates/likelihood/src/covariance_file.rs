//! Covariances from files, and which of their rows are the table's.

use std::collections::BTreeMap;
use std::path::Path;

use nalgebra::DMatrix;

use crate::covariance::Covariance;
use crate::error::{DataError, shown};
use crate::header::Header;
use crate::records::{Records, finite_number};
use crate::rows::{RowIndex, RowKey, RowReader};
use crate::table::{MeasuredRow, MultipoleTable};

const MATRIX: &str = "a square matrix, one line a row";
const ROWS: &str = "a header such as bin,multipole,separation and a line for each row of the covariance";

/// Reads a square CSV file without a header as the covariance of `rows` rows; lines that begin with `#` are notes.
///
/// `rows` is the number of rows of the table, or of `covariance_rows` where it is given.
///
/// # Errors
/// No such file; text in a number or a number that is not finite (line and column named); lines of unequal length;
/// not `rows` × `rows`; not symmetric; a variance ≤ 0.
pub fn read_covariance_csv(path: impl AsRef<Path>, rows: usize) -> Result<Covariance, DataError> {
    covariance_from(Records::read(path.as_ref(), MATRIX)?, rows)
}

impl Covariance {
    /// As [`read_covariance_csv`], from memory; `file` names it in messages.
    ///
    /// # Errors
    /// As [`read_covariance_csv`].
    pub fn parse_csv(file: &str, bytes: &[u8], rows: usize) -> Result<Self, DataError> {
        covariance_from(Records::parse(file.to_owned(), bytes, MATRIX)?, rows)
    }
}

fn covariance_from(records: Records, rows: usize) -> Result<Covariance, DataError> {
    let first = &records.records[0];
    if first.fields.iter().all(|text| text.parse::<f64>().is_err() && !text.contains(char::is_whitespace)) {
        let text = shown(&first.fields[0]);
        return Err(DataError::MatrixHeader { file: records.file.clone(), line: first.line, text });
    }
    let (lines, columns) = (records.records.len(), first.fields.len());
    if (lines, columns) != (rows, rows) {
        let way_out = if columns == 1 && rows > 1 {
            "separate the numbers of a line with commas"
        } else if lines == columns && lines > rows {
            "if it holds more rows than the table, name its rows with `covariance_rows`"
        } else {
            "give the covariance of all rows of the table, in the table's order"
        };
        return Err(DataError::CovarianceSize {
            file: records.file,
            expected: rows,
            rows: lines,
            columns,
            way_out,
        });
    }
    records.check_field_counts()?;
    let mut matrix = DMatrix::zeros(rows, rows);
    for (i, record) in records.records.iter().enumerate() {
        for (j, text) in record.fields.iter().enumerate() {
            matrix[(i, j)] = finite_number(text, || records.place(record.line, &(j + 1).to_string()))?;
        }
    }
    let labels = records.records.iter().map(|record| format!("line {}", record.line)).collect();
    Ok(Covariance::labelled(matrix, records.file, labels)?)
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
