//! Measured multipoles: one number a row, read from a CSV table.

use std::collections::BTreeMap;
use std::path::Path;

use nalgebra::DVector;

use crate::error::DataError;
use crate::header::{Header, IgnoredColumn};
use crate::records::Records;
use crate::rows::{Axis, RowIndex, RowKey, RowReader};

/// The columns of a table of multipoles, by our names; the file's may differ (`columns`).
pub const TABLE_COLUMNS: [&str; 9] =
    ["bin", "pair", "multipole", "separation", "wavenumber", "low", "high", "value", "error"];

/// One measured number.
#[derive(Clone, Debug, PartialEq)]
pub struct MeasuredRow {
    /// Name of the redshift bin.
    pub bin: String,
    /// `first-second`, `first-first` or `second-second`.
    pub pair: String,
    /// 0 … 4.
    pub multipole: u8,
    /// What `at` is.
    pub axis: Axis,
    /// Separation in Mpc/h or wavenumber in h/Mpc, above 0.
    pub at: f64,
    /// The shell (or wavenumber bin) that the number is an average over; contains `at`.
    pub edges: Option<(f64, f64)>,
    /// The multipole: of ξ (no unit) or of P in (Mpc/h)³, its imaginary part where the multipole is odd.
    pub value: f64,
    /// Standard deviation in the unit of `value`, above 0.
    pub error: Option<f64>,
    /// The line of the file, from 1.
    pub line: u64,
}

impl MeasuredRow {
    pub(crate) fn key(&self) -> RowKey {
        let Self { bin, pair, multipole, axis, at, .. } = self;
        RowKey { bin: bin.clone(), pair: pair.clone(), multipole: *multipole, axis: *axis, at: *at }
    }

    /// The row in words: bin, pair, multipole and where.
    pub fn description(&self) -> String {
        self.key().to_string()
    }
}

/// The rows of one survey's file, in the file's order.
#[derive(Clone, Debug, PartialEq)]
pub struct MultipoleTable {
    /// The path, as it was given; for messages.
    pub file: String,
    /// The rows.
    pub rows: Vec<MeasuredRow>,
    /// Columns of the file that were not read.
    pub ignored_columns: Vec<IgnoredColumn>,
}

impl MultipoleTable {
    /// Reads a table that is already in memory; `file` names it in messages. See [`read_multipoles`].
    pub fn parse(file: &str, bytes: &[u8], columns: &BTreeMap<String, String>) -> Result<Self, DataError> {
        Self::from_records(&Records::parse(file.to_owned(), bytes, WANTED)?, columns)
    }

    fn from_records(records: &Records, columns: &BTreeMap<String, String>) -> Result<Self, DataError> {
        let header = Header::new(records, &TABLE_COLUMNS, columns)?;
        for any_of in [&["bin"][..], &["multipole"], &["separation", "wavenumber"], &["value"]] {
            header.require(records, any_of)?;
        }
        for (edge, other) in [("low", "high"), ("high", "low")] {
            if header.field(edge).is_some() {
                header.require(records, &[other])?;
            }
        }
        let below = records.below_header()?;
        let mut index = RowIndex::default();
        let mut rows: Vec<MeasuredRow> = Vec::with_capacity(below.len());
        for record in below {
            let row = measured_row(&RowReader { records, header: &header, record })?;
            if let Some(first) = index.find(&row.key()) {
                return Err(DataError::DuplicateRow {
                    file: records.file.clone(),
                    line: row.line,
                    first: rows[first].line,
                    row: row.description(),
                });
            }
            index.insert(&row.key(), rows.len());
            rows.push(row);
        }
        Ok(Self { file: records.file.clone(), rows, ignored_columns: header.ignored })
    }

    /// Number of rows.
    pub fn len(&self) -> usize {
        self.rows.len()
    }

    /// Whether there are no rows (a table that was read has some).
    pub fn is_empty(&self) -> bool {
        self.rows.is_empty()
    }

    /// The measured numbers.
    pub fn values(&self) -> DVector<f64> {
        DVector::from_iterator(self.len(), self.rows.iter().map(|row| row.value))
    }

    /// The rows at these positions, in this order. Positions are below [`Self::len`].
    pub fn select(&self, positions: &[usize]) -> Self {
        let rows = positions.iter().map(|position| self.rows[*position].clone()).collect();
        Self { file: self.file.clone(), rows, ignored_columns: self.ignored_columns.clone() }
    }

    /// What the rows are called in messages: line and what is measured.
    pub fn row_labels(&self) -> Vec<String> {
        self.rows.iter().map(|row| format!("line {} ({})", row.line, row.description())).collect()
    }

    /// The distinct bins, in order of appearance.
    pub fn bins(&self) -> Vec<&str> {
        let mut bins: Vec<&str> = Vec::new();
        for row in &self.rows {
            if !bins.contains(&row.bin.as_str()) {
                bins.push(&row.bin);
            }
        }
        bins
    }
}

/// Reads a table of measured multipoles.
///
/// A CSV file with a header, columns in any order: `bin`, `multipole` (0 … 4), `separation` (Mpc/h) or `wavenumber`
/// (h/Mpc), `value`; optionally `pair` (default `first-second`), `low` and `high` (the shell that the number is an
/// average over) and `error`. A file may have both `separation` and `wavenumber`; a row fills exactly one. Lines
/// that begin with `#` are notes. `columns` maps our name of a column to the file's header. Other columns are ignored
/// and listed in [`MultipoleTable::ignored_columns`].
///
/// # Errors
/// The first thing that is wrong, with file, line and column: no such file, a missing or doubled column, text in a
/// number, NaN, no rows, a row that repeats another's bin, pair, multipole and place (to one part in 10⁶), a
/// separation of 0, low ≥ high, a centre outside its shell, multipole 7, an error of 0.
pub fn read_multipoles(
    path: impl AsRef<Path>,
    columns: &BTreeMap<String, String>,
) -> Result<MultipoleTable, DataError> {
    MultipoleTable::from_records(&Records::read(path.as_ref(), WANTED)?, columns)
}

const WANTED: &str = "a header such as bin,multipole,separation,value and a row for each measured number";

fn measured_row(reader: &RowReader<'_>) -> Result<MeasuredRow, DataError> {
    let RowKey { bin, pair, multipole, axis, at } = reader.key()?;
    reader.needed("value", "write the measured number, or leave the row out")?;
    let value = reader.number("value")?.unwrap_or_default();
    let error = reader.number("error")?;
    if let Some(error) = error.filter(|error| *error <= 0.0) {
        let way_out = "an error is a standard deviation; leave the row out if it was not measured";
        return Err(DataError::NotPositive { place: reader.place("error"), value: error, way_out });
    }
    Ok(MeasuredRow {
        edges: edges(reader, axis, at)?,
        bin,
        pair,
        multipole,
        axis,
        at,
        value,
        error,
        line: reader.record.line,
    })
}

fn edges(reader: &RowReader<'_>, axis: Axis, at: f64) -> Result<Option<(f64, f64)>, DataError> {
    let (file, line) = (reader.records.file.clone(), reader.record.line);
    let name = |column: &str| reader.header.in_file(column).to_owned();
    let (low, high) = match (reader.number("low")?, reader.number("high")?) {
        (None, None) => return Ok(None),
        (Some(low), Some(high)) => (low, high),
        (Some(_), None) => {
            return Err(DataError::OneEdge { file, line, present: name("low"), absent: name("high") });
        }
        (None, Some(_)) => {
            return Err(DataError::OneEdge { file, line, present: name("high"), absent: name("low") });
        }
    };
    if low < 0.0 {
        return Err(DataError::NegativeEdge { place: reader.place("low"), value: low });
    }
    if low >= high {
        return Err(DataError::EdgesInverted { file, line, low, high });
    }
    if at < low || at > high {
        return Err(DataError::OutsideEdges { place: reader.place(axis.name()), at, low, high });
    }
    Ok(Some((low, high)))
}
