//! Comma-separated numbers without a header.

use nalgebra::DMatrix;

use super::ArrayFormat;
use crate::error::{DataError, shown};
use crate::records::{Records, finite_number};

const WANTED: &str = "a matrix of numbers, one line a row";

/// Text, a line a row; lines that begin with `#` are notes. Numbers must be finite.
#[derive(Debug)]
pub(super) struct Csv;

impl ArrayFormat for Csv {
    fn name(&self) -> &'static str {
        "csv"
    }

    fn extensions(&self) -> &'static [&'static str] {
        &["csv"]
    }

    fn summary(&self) -> &'static str {
        "comma-separated numbers, one line a row, no header; lines that begin with # are notes"
    }

    fn numbers(
        &self,
        file: &str,
        bytes: &[u8],
        rule: &dyn Fn(usize, usize) -> Result<(), DataError>,
    ) -> Result<(DMatrix<f64>, Vec<String>), DataError> {
        let records = Records::parse(file.to_owned(), bytes, WANTED)?;
        let first = &records.records[0];
        if first.fields.iter().all(|text| text.parse::<f64>().is_err() && !text.contains(char::is_whitespace))
        {
            let text = shown(&first.fields[0]);
            return Err(DataError::MatrixHeader { file: records.file.clone(), line: first.line, text });
        }
        let (lines, columns) = (records.records.len(), first.fields.len());
        rule(lines, columns)?;
        records.check_field_counts()?;
        let mut matrix = DMatrix::zeros(lines, columns);
        for (i, record) in records.records.iter().enumerate() {
            for (j, text) in record.fields.iter().enumerate() {
                matrix[(i, j)] = finite_number(text, || records.place(record.line, &(j + 1).to_string()))?;
            }
        }
        let names = records.records.iter().map(|record| format!("line {}", record.line)).collect();
        Ok((matrix, names))
    }
}
