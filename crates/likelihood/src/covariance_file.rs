//! Covariances from files, and which of their rows are the table's.

use std::collections::BTreeMap;
use std::path::Path;

use nalgebra::DMatrix;

use crate::covariance::Covariance;
use crate::error::DataError;
use crate::header::Header;
use crate::records::{Records, finite_number};
use crate::rows::{RowIndex, RowKey, RowReader};
use crate::table::MultipoleTable;

/// Reads a square CSV file without a header as the covariance of `rows` rows; lines that begin with `#` are notes.
///
/// `rows` is the number of rows of the table, or of `covariance_rows` where it is given.
///
/// # Errors
/// No such file; text in a number or a number that is not finite (line and column named); lines of unequal length;
/// not `rows` × `rows`; not symmetric; a variance ≤ 0.
pub fn read_covariance_csv(path: impl AsRef<Path>, rows: usize) -> Result<Covariance, DataError> {
    let records = Records::read(path.as_ref(), "a square matrix, one line a row")?;
    let (found_rows, columns) = (records.records.len(), records.records[0].fields.len());
    let entry = |line: u64, column: usize, text: &str| {
        finite_number(text, || records.place(line, &(column + 1).to_string()))
    };
    if found_rows != rows || columns != rows {
        // A header is the likeliest reason for one line too many: say so at its place.
        let first = &records.records[0];
        for (column, text) in first.fields.iter().enumerate() {
            entry(first.line, column, text)?;
        }
        let way_out = match found_rows == columns && found_rows > rows {
            true => "if it holds more rows than the table, name its rows with `covariance_rows`",
            false => "give the covariance of the table's rows, before any `keep`, in the table's order",
        };
        return Err(DataError::CovarianceSize {
            file: records.file,
            expected: rows,
            rows: found_rows,
            columns,
            way_out,
        });
    }
    records.check_field_counts()?;
    let mut matrix = DMatrix::zeros(rows, rows);
    for (i, record) in records.records.iter().enumerate() {
        for (j, text) in record.fields.iter().enumerate() {
            matrix[(i, j)] = entry(record.line, j, text)?;
        }
    }
    let labels = records
        .records
        .iter()
        .map(|record| format!("line {}", record.line))
        .collect();
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
/// below it a line for each row of the covariance, in its order. It may hold more rows than the table.
///
/// # Errors
/// As [`read_multipoles`](crate::read_multipoles); two lines for the same row are an error.
pub fn read_covariance_rows(
    path: impl AsRef<Path>,
    columns: &BTreeMap<String, String>,
) -> Result<CovarianceRows, DataError> {
    let wanted = "a header such as bin,multipole,separation and a line for each row of the covariance";
    let records = Records::read(path.as_ref(), wanted)?;
    let known_only: BTreeMap<String, String> = columns
        .iter()
        .filter(|(name, _)| !["low", "high", "value", "error"].contains(&name.as_str()))
        .map(|(name, in_file)| (name.clone(), in_file.clone()))
        .collect();
    let header = Header::new(&records, &COVARIANCE_ROW_COLUMNS, &known_only)?;
    for any_of in [&["bin"][..], &["multipole"], &["separation", "wavenumber"]] {
        header.require(&records, any_of)?;
    }
    records.check_field_counts()?;
    let mut index = RowIndex::default();
    let mut keys: Vec<RowKey> = Vec::new();
    for record in &records.records[1..] {
        let key = RowReader {
            records: &records,
            header: &header,
            record,
        }
        .key()?;
        if let Some(first) = index.find(&key) {
            return Err(DataError::DuplicateRow {
                file: records.file.clone(),
                line: record.line,
                first: records.records[first + 1].line,
                row: key.to_string(),
            });
        }
        index.insert(&key, keys.len());
        keys.push(key);
    }
    if keys.is_empty() {
        return Err(DataError::NoRows {
            file: records.file,
            line: records.records[0].line,
        });
    }
    Ok(CovarianceRows {
        file: records.file,
        keys,
    })
}

impl CovarianceRows {
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
        let position = |row: &crate::table::MeasuredRow| {
            index
                .find(&row.key())
                .ok_or_else(|| DataError::RowNotInCovariance {
                    file: self.file.clone(),
                    row: row.description(),
                    table: table.file.clone(),
                    line: row.line,
                })
        };
        table.rows.iter().map(position).collect()
    }
}
