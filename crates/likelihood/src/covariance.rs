//! The covariance of one survey's rows, checked.

use nalgebra::{DMatrix, SymmetricEigen};

use crate::table::MultipoleTable;
use crate::triangle::LowerTriangle;

/// Largest difference of C_ij and C_ji, in units of σ_i σ_j, that is taken for rounding. A matrix that was summed
/// in single precision differs by 10⁻⁷ or so; a mistake in the order of rows, or a triangle left empty, by far
/// more. What passes is averaged.
pub const SYMMETRY_TOLERANCE: f64 = 1e-6;

/// A matrix that is no covariance of the rows at hand.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum CovarianceError {
    /// Not square.
    #[error(
        "{origin}: a covariance must be square, found {rows} × {columns}; give a line and a column for each row"
    )]
    NotSquare {
        /// Where the matrix comes from.
        origin: String,
        /// Lines.
        rows: usize,
        /// Columns.
        columns: usize,
    },
    /// Not as many rows as there are measurements.
    #[error(
        "{origin}: must have a row for each of the {expected} measured rows, found {found}; give one covariance for the same rows in the same order"
    )]
    WrongSize {
        /// Where the matrix comes from.
        origin: String,
        /// Measured rows.
        expected: usize,
        /// Rows of the matrix.
        found: usize,
    },
    /// An entry that is no number.
    #[error(
        "{origin}: the covariance of {row} with {column} must be a finite number, found {value}; correct the entry, or cut the row with `keep` where it was not measured"
    )]
    NotFinite {
        /// Where the matrix comes from.
        origin: String,
        /// One row.
        row: String,
        /// The other.
        column: String,
        /// The entry.
        value: f64,
    },
    /// A variance of zero or below.
    #[error(
        "{origin}: the variance of {row} must be above 0, found {value:e}; give its variance, or remove the row where it was not measured"
    )]
    VarianceNotPositive {
        /// Where the matrix comes from.
        origin: String,
        /// The row.
        row: String,
        /// The diagonal entry.
        value: f64,
    },
    /// A variance below zero, of an additional covariance.
    #[error(
        "{origin}: the variance of {row} must be 0 or above, found {value:e}; correct it, or give 0 where nothing is added"
    )]
    VarianceNegative {
        /// Where the matrix comes from.
        origin: String,
        /// The row.
        row: String,
        /// The diagonal entry.
        value: f64,
    },
    /// An additional covariance with a negative eigenvalue.
    #[error(
        "{origin}: an additional covariance must have no negative eigenvalue, but the smallest is {eigenvalue:.3} of a unit diagonal; check that the file is whole and that its correlations stay within -1 and 1"
    )]
    ExtraNegative {
        /// Where the matrix comes from.
        origin: String,
        /// Smallest eigenvalue once scaled to a unit diagonal; −∞ where a row without variance has a covariance.
        eigenvalue: f64,
    },
    /// C_ij and C_ji differ beyond rounding.
    #[error(
        "{origin}: must be symmetric, but the covariance of {row} with {column} is {upper:e} one way and {lower:e} the other; they may differ by 1e-6 of the two standard deviations: check that the file is whole and in one order"
    )]
    Asymmetric {
        /// Where the matrix comes from.
        origin: String,
        /// The row of the entry above the diagonal.
        row: String,
        /// Its column.
        column: String,
        /// The entry above the diagonal.
        upper: f64,
        /// The entry below it.
        lower: f64,
    },
    /// Not positive definite.
    #[error(
        "{origin}: must be positive definite, but the smallest eigenvalue of its correlations is {}; that mode is made of {mode}: cut or merge such rows, or estimate the covariance from more mocks than rows",
        eigenvalue_text(*.eigenvalue)
    )]
    NotDefinite {
        /// Where the matrix comes from.
        origin: String,
        /// Smallest eigenvalue of the correlation matrix; within rounding of zero or below.
        eigenvalue: f64,
        /// The rows with the largest shares of its eigenvector, with the shares.
        mode: String,
    },
    /// No covariance and no error either.
    #[error(
        "{file}, line {line}: has no `error`, which each row needs where no covariance is given; add the column, or give `covariance` or `mocks`"
    )]
    NoError {
        /// The table.
        file: String,
        /// The row's line.
        line: u64,
    },
}

/// An eigenvalue of a matrix with unit diagonal; rounding in matrices of thousands of rows stays below 10⁻¹².
fn eigenvalue_text(eigenvalue: f64) -> String {
    match eigenvalue.abs() < 1e-12 {
        true => "0 within rounding".to_owned(),
        false => format!("{eigenvalue:.3}"),
    }
}

/// A covariance matrix: finite, exactly symmetric, variances above zero. Whether it is positive definite is asked
/// of the rows that are kept, by [`check_definite`](Self::check_definite) and wherever it is factored: an estimate
/// from few mocks may be singular over all rows and sound over those.
#[derive(Clone, Debug, PartialEq)]
pub struct Covariance {
    matrix: DMatrix<f64>,
    origin: String,
    labels: Vec<String>,
}

impl Covariance {
    /// Checks a matrix. `origin` says in messages where it comes from.
    ///
    /// # Errors
    /// Not square; an entry not finite; a variance ≤ 0; |C_ij − C_ji| > 10⁻⁶ σ_i σ_j ([`SYMMETRY_TOLERANCE`]; below
    /// it the two are averaged).
    pub fn new(matrix: DMatrix<f64>, origin: impl Into<String>) -> Result<Self, CovarianceError> {
        let labels = (1..=matrix.nrows()).map(|row| format!("row {row}")).collect();
        Self::labelled(matrix, origin.into(), labels)
    }

    pub(crate) fn labelled(
        mut matrix: DMatrix<f64>,
        origin: String,
        labels: Vec<String>,
    ) -> Result<Self, CovarianceError> {
        let (size, columns) = matrix.shape();
        if size != columns {
            return Err(CovarianceError::NotSquare { origin, rows: size, columns });
        }
        for (i, j) in (0..size).flat_map(|i| (0..size).map(move |j| (i, j))) {
            let value = matrix[(i, j)];
            if !value.is_finite() {
                let (row, column) = (labels[i].clone(), labels[j].clone());
                return Err(CovarianceError::NotFinite { origin, row, column, value });
            }
        }
        if let Some(i) = (0..size).find(|i| matrix[(*i, *i)] <= 0.0) {
            return Err(CovarianceError::VarianceNotPositive {
                origin,
                row: labels[i].clone(),
                value: matrix[(i, i)],
            });
        }
        for (i, j) in (0..size).flat_map(|j| (0..j).map(move |i| (i, j))) {
            let (upper, lower) = (matrix[(i, j)], matrix[(j, i)]);
            let scale = matrix[(i, i)].sqrt() * matrix[(j, j)].sqrt();
            if (upper - lower).abs() > SYMMETRY_TOLERANCE * scale {
                let (row, column) = (labels[i].clone(), labels[j].clone());
                return Err(CovarianceError::Asymmetric { origin, row, column, upper, lower });
            }
            let mean = 0.5 * upper + 0.5 * lower;
            matrix[(i, j)] = mean;
            matrix[(j, i)] = mean;
        }
        Ok(Self { matrix, origin, labels })
    }

    /// The diagonal covariance of a table's `error` column.
    ///
    /// # Errors
    /// [`CovarianceError::NoError`] for the first row without one.
    pub fn from_errors(table: &MultipoleTable) -> Result<Self, CovarianceError> {
        let mut matrix = DMatrix::zeros(table.len(), table.len());
        for (i, row) in table.rows.iter().enumerate() {
            let no_error = || CovarianceError::NoError { file: table.file.clone(), line: row.line };
            matrix[(i, i)] = row.error.ok_or_else(no_error)?.powi(2);
        }
        Self::labelled(matrix, format!("{} (column `error`)", table.file), table.row_labels())
    }

    /// Names the rows, for messages: as a table's, by [`MultipoleTable::row_labels`]. As many as there are rows.
    pub fn with_labels(mut self, labels: Vec<String>) -> Self {
        assert_eq!(labels.len(), self.len(), "a label for each row of the covariance");
        self.labels = labels;
        self
    }

    /// The matrix.
    pub fn matrix(&self) -> &DMatrix<f64> {
        &self.matrix
    }

    /// Where it comes from.
    pub fn origin(&self) -> &str {
        &self.origin
    }

    /// What its rows are called in messages.
    pub fn labels(&self) -> &[String] {
        &self.labels
    }

    /// Number of rows.
    pub fn len(&self) -> usize {
        self.matrix.nrows()
    }

    /// Whether it has no rows.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Square roots of the variances.
    pub fn standard_deviations(&self) -> Vec<f64> {
        self.matrix.diagonal().iter().map(|variance| variance.sqrt()).collect()
    }

    /// Rows and columns at these positions (each below [`Self::len`], none twice), in this order.
    pub fn select(&self, positions: &[usize]) -> Self {
        let size = positions.len();
        let matrix = DMatrix::from_fn(size, size, |i, j| self.matrix[(positions[i], positions[j])]);
        let labels = positions.iter().map(|position| self.labels[*position].clone()).collect();
        Self { matrix, origin: self.origin.clone(), labels }
    }

    /// C_ij f_i f_j: the covariance of rows that were multiplied by `factors`, one a row and above 0.
    pub fn scaled(&self, factors: &[f64]) -> Self {
        assert_eq!(factors.len(), self.len(), "a factor for each row of the covariance");
        let matrix =
            DMatrix::from_fn(self.len(), self.len(), |i, j| self.matrix[(i, j)] * (factors[i] * factors[j]));
        Self { matrix, origin: self.origin.clone(), labels: self.labels.clone() }
    }

    /// The same rows with another matrix, which must be symmetric and have positive variances.
    pub(crate) fn with_matrix(&self, matrix: DMatrix<f64>) -> Self {
        Self { matrix, origin: self.origin.clone(), labels: self.labels.clone() }
    }

    /// Whether it is positive definite beyond rounding: by Cholesky on the correlations, whose smallest
    /// eigenvalue must exceed n·2⁻⁵² of the largest.
    ///
    /// # Errors
    /// [`CovarianceError::NotDefinite`] with the smallest eigenvalue of the correlations and the rows that make up
    /// its eigenvector. Two rows with correlation 1 are the plainest case.
    pub fn check_definite(&self) -> Result<(), CovarianceError> {
        self.factor().map(|_| ())
    }

    pub(crate) fn factor(&self) -> Result<LowerTriangle, CovarianceError> {
        LowerTriangle::factor(&self.matrix).ok_or_else(|| self.not_definite())
    }

    fn not_definite(&self) -> CovarianceError {
        let deviations = self.standard_deviations();
        let correlation = DMatrix::from_fn(self.len(), self.len(), |i, j| {
            self.matrix[(i, j)] / (deviations[i] * deviations[j])
        });
        let eigen = SymmetricEigen::new(correlation);
        let smallest = eigen.eigenvalues.imin();
        let mode = eigen.eigenvectors.column(smallest);
        let mut by_share: Vec<usize> = (0..self.len()).collect();
        by_share.sort_by(|left, right| mode[*right].abs().total_cmp(&mode[*left].abs()));
        // The rows to look at: those that make up nine tenths of the mode, at most four, in the matrix's order.
        let share = |row: &usize| mode[*row].powi(2);
        let enough =
            (1..4).find(|count| by_share.iter().take(*count).map(share).sum::<f64>() > 0.9).unwrap_or(4);
        by_share.truncate(enough);
        by_share.sort_unstable();
        let shown = |row: &usize| format!("{} ({:.0} %)", self.labels[*row], 100.0 * share(row));
        CovarianceError::NotDefinite {
            origin: self.origin.clone(),
            eigenvalue: eigen.eigenvalues[smallest],
            mode: by_share.iter().map(shown).collect::<Vec<_>>().join(", "),
        }
    }
}
