//! Mock measurements, and the covariance that they estimate.

mod error;
mod tables;

use std::path::Path;

use nalgebra::{DMatrix, DVector};

pub use error::MockError;
pub use tables::{MockTables, mock_files, read_mock_tables};

use crate::arrays::{ArrayFormat, NumberArray, file_bytes, format_of, parse_array};
use crate::covariance::Covariance;
use crate::error::DataError;

/// Mock measurements of the same rows, one realisation a line; at least two, all numbers finite.
#[derive(Clone, Debug, PartialEq)]
pub struct MockSet {
    measurements: DMatrix<f64>,
    origin: String,
    labels: Vec<String>,
}

impl MockSet {
    /// From n_s × n_d numbers, a mock a row. `origin` says in messages where they come from.
    ///
    /// # Errors
    /// Fewer than two mocks; a number that is not finite.
    pub fn new(measurements: DMatrix<f64>, origin: impl Into<String>) -> Result<Self, MockError> {
        let origin = origin.into();
        if measurements.nrows() < 2 {
            return Err(MockError::TooFew { origin, mocks: measurements.nrows() });
        }
        for (mock, numbers) in measurements.row_iter().enumerate() {
            if let Some((row, value)) = numbers.iter().enumerate().find(|(_, value)| !value.is_finite()) {
                return Err(MockError::NotFinite { origin, mock: mock + 1, row: row + 1, value: *value });
            }
        }
        let labels = (1..=measurements.ncols()).map(|row| format!("row {row}")).collect();
        Ok(Self { measurements, origin, labels })
    }

    /// As [`read_mocks`], from memory; `file` names it in messages and its ending the format.
    ///
    /// # Errors
    /// As [`read_mocks`].
    pub fn parse(file: &str, bytes: &[u8], rows: usize) -> Result<Self, DataError> {
        mocks_from(format_of(Path::new(file))?, file, bytes, rows)
    }

    /// Names the rows, for messages: as a table's, by [`MultipoleTable::row_labels`](crate::MultipoleTable::row_labels).
    /// As many as there are rows.
    pub fn with_labels(mut self, labels: Vec<String>) -> Self {
        assert_eq!(labels.len(), self.rows(), "a label for each row of the mocks");
        self.labels = labels;
        self
    }

    /// n_s: how many there are.
    pub fn mock_count(&self) -> usize {
        self.measurements.nrows()
    }

    /// n_d: numbers of each.
    pub fn rows(&self) -> usize {
        self.measurements.ncols()
    }

    /// n_s × n_d numbers.
    pub fn measurements(&self) -> &DMatrix<f64> {
        &self.measurements
    }

    /// What its rows are called in messages.
    pub fn labels(&self) -> &[String] {
        &self.labels
    }

    /// The mean of the mocks.
    pub fn mean(&self) -> DVector<f64> {
        DVector::from_iterator(self.rows(), self.measurements.column_iter().map(|column| column.mean()))
    }

    /// The mocks less their mean, n_s × n_d.
    pub(crate) fn deviations(&self) -> DMatrix<f64> {
        let mut deviations = self.measurements.clone();
        for mut column in deviations.column_iter_mut() {
            // Twice: the first mean carries rounding of the size of the numbers, which may be far above their scatter.
            for _ in 0..2 {
                let mean = column.mean();
                column.add_scalar_mut(-mean);
            }
        }
        deviations
    }

    /// The unbiased sample covariance Σ (x − x̄)(x − x̄)ᵀ/(n_s − 1), which goes with [`Self::mock_count`].
    ///
    /// It is singular where n_s ≤ n_d, which shows when it is factored: it may be sound over the rows that are kept.
    ///
    /// # Errors
    /// A row that is the same in every mock.
    pub fn covariance(&self) -> Result<Covariance, DataError> {
        let deviations = self.deviations();
        let matrix = deviations.tr_mul(&deviations) / (self.mock_count() - 1) as f64;
        let origin = format!("{} ({} mocks)", self.origin, self.mock_count());
        Ok(Covariance::labelled(matrix, origin, self.labels.clone())?)
    }

    /// Only these rows (each below [`Self::rows`], none twice), in this order.
    pub fn select(&self, positions: &[usize]) -> Self {
        Self {
            measurements: self.measurements.select_columns(positions),
            origin: self.origin.clone(),
            labels: positions.iter().map(|position| self.labels[*position].clone()).collect(),
        }
    }

    /// Rows multiplied by `factors`, one a row and above 0: a change of units.
    pub fn scaled(mut self, factors: &[f64]) -> Self {
        assert_eq!(factors.len(), self.rows(), "a factor for each row of the mocks");
        for (mut column, factor) in self.measurements.column_iter_mut().zip(factors) {
            column *= *factor;
        }
        self
    }

    /// Surveys that share volume: mock k of the first beside mock k of the next, which must be of the same realisation.
    ///
    /// # Errors
    /// Surveys with different numbers of mocks, or none at all.
    pub fn joined(surveys: &[MockSet]) -> Result<Self, MockError> {
        let mut all = surveys.first().cloned().ok_or(MockError::NothingToJoin)?;
        for survey in &surveys[1..] {
            if survey.mock_count() != all.mock_count() {
                return Err(MockError::CountsDiffer {
                    first: all.origin,
                    first_count: all.measurements.nrows(),
                    second: survey.origin.clone(),
                    second_count: survey.mock_count(),
                });
            }
            let (mocks, before, added) = (all.mock_count(), all.rows(), survey.rows());
            let mut measurements = DMatrix::zeros(mocks, before + added);
            measurements.columns_mut(0, before).copy_from(&all.measurements);
            measurements.columns_mut(before, added).copy_from(&survey.measurements);
            all.measurements = measurements;
            all.origin = format!("{} with {}", all.origin, survey.origin);
            all.labels.extend(survey.labels.iter().cloned());
        }
        Ok(all)
    }
}

/// Reads one array of mock measurements, a mock a line and a column for each of `rows` rows (those of the table, or of
/// `covariance_rows` where it is given), in any of [`array_formats`](crate::array_formats).
///
/// # Errors
/// No such file; a file that is not of its format; another number of columns; fewer than two mocks; a number that is
/// not finite.
pub fn read_mocks(path: impl AsRef<Path>, rows: usize) -> Result<MockSet, DataError> {
    let path = path.as_ref();
    mocks_from(format_of(path)?, &path.display().to_string(), &file_bytes(path)?, rows)
}

fn mocks_from(format: &dyn ArrayFormat, file: &str, bytes: &[u8], rows: usize) -> Result<MockSet, DataError> {
    let fits = |file: &str, lines: usize, columns: usize| match columns == rows {
        true => Ok(()),
        false => Err(MockError::Columns {
            file: file.to_owned(),
            expected: rows,
            lines,
            columns,
            way_out: if lines == rows {
                "transpose it: a line is one mock"
            } else {
                "give each mock's measurement of all rows of the table, in the table's order"
            },
        }
        .into()),
    };
    let array = parse_array(format, file, bytes, &fits)?;
    array.check_finite()?;
    let NumberArray { file, numbers, .. } = array;
    Ok(MockSet::new(numbers, file)?)
}
