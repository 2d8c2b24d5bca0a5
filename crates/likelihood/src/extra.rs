//! What is added to a covariance or taken out of it: theory errors, blocks declared empty.

use std::path::Path;

use nalgebra::{DMatrix, SymmetricEigen};

use crate::arrays::{file_bytes, format_of};
use crate::covariance::{Covariance, CovarianceError, SYMMETRY_TOLERANCE};
use crate::covariance_file::square_array;
use crate::error::DataError;

/// An additional covariance: finite, symmetric, without a negative eigenvalue. Unlike a [`Covariance`] it may be singular
/// and have rows of variance zero: a theory error need not concern every row.
#[derive(Clone, Debug, PartialEq)]
pub struct ExtraCovariance {
    matrix: DMatrix<f64>,
    origin: String,
}

/// An additional covariance's smallest eigenvalue, of the matrix scaled to a unit diagonal, may be this far below zero:
/// what single precision leaves of a singular matrix.
const ROUNDING: f64 = 1e-6;

impl ExtraCovariance {
    /// Checks a matrix. `origin` says in messages where it comes from.
    ///
    /// # Errors
    /// Not square, not finite, not symmetric (to [`SYMMETRY_TOLERANCE`] of the two standard deviations), a negative
    /// variance or eigenvalue (below −10⁻⁶ of a unit diagonal).
    pub fn new(mut matrix: DMatrix<f64>, origin: impl Into<String>) -> Result<Self, CovarianceError> {
        let origin = origin.into();
        let (size, columns) = matrix.shape();
        if size != columns {
            return Err(CovarianceError::NotSquare { origin, rows: size, columns });
        }
        let name = |row: usize| format!("row {}", row + 1);
        let deviations: Vec<f64> =
            matrix.diagonal().iter().map(|variance| variance.max(0.0).sqrt()).collect();
        for (i, j) in (0..size).flat_map(|i| (0..=i).map(move |j| (i, j))) {
            let (lower, upper) = (matrix[(i, j)], matrix[(j, i)]);
            if let Some(value) = [lower, upper].into_iter().find(|value| !value.is_finite()) {
                let (row, column) = (name(i), name(j));
                return Err(CovarianceError::NotFinite { origin, row, column, value });
            }
            if i == j && lower < 0.0 {
                return Err(CovarianceError::VarianceNegative { origin, row: name(i), value: lower });
            }
            if (upper - lower).abs() > SYMMETRY_TOLERANCE * deviations[i] * deviations[j] {
                let (row, column) = (name(j), name(i));
                return Err(CovarianceError::Asymmetric { origin, row, column, upper, lower });
            }
            let mean = 0.5 * lower + 0.5 * upper;
            matrix[(i, j)] = mean;
            matrix[(j, i)] = mean;
        }
        let inverse = |row: usize| if deviations[row] > 0.0 { deviations[row].recip() } else { 0.0 };
        let scaled = DMatrix::from_fn(size, size, |i, j| matrix[(i, j)] * inverse(i) * inverse(j));
        // A row without variance can have no covariance either.
        let forbidden = (0..size)
            .flat_map(|i| (0..size).map(move |j| (i, j)))
            .find(|(i, j)| deviations[*i] == 0.0 && matrix[(*i, *j)] != 0.0);
        let smallest = match forbidden {
            Some(_) => f64::NEG_INFINITY,
            None if size == 0 => 0.0,
            None => SymmetricEigen::new(scaled).eigenvalues.min(),
        };
        match smallest < -ROUNDING {
            true => Err(CovarianceError::ExtraNegative { origin, eigenvalue: smallest }),
            false => Ok(Self { matrix, origin }),
        }
    }

    /// The matrix.
    pub fn matrix(&self) -> &DMatrix<f64> {
        &self.matrix
    }

    /// Number of rows.
    pub fn len(&self) -> usize {
        self.matrix.nrows()
    }

    /// Whether it has no rows.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Rows and columns at these positions (each below [`Self::len`], none twice), in this order.
    pub fn select(&self, positions: &[usize]) -> Self {
        let size = positions.len();
        let matrix = DMatrix::from_fn(size, size, |i, j| self.matrix[(positions[i], positions[j])]);
        Self { matrix, origin: self.origin.clone() }
    }

    /// C_ij f_i f_j, as [`Covariance::scaled`].
    pub fn scaled(&self, factors: &[f64]) -> Self {
        assert_eq!(factors.len(), self.len(), "a factor for each row of the covariance");
        let size = self.len();
        let matrix = DMatrix::from_fn(size, size, |i, j| self.matrix[(i, j)] * (factors[i] * factors[j]));
        Self { matrix, origin: self.origin.clone() }
    }
}

/// Reads an additional covariance of `rows` rows, as [`read_covariance`](crate::read_covariance).
///
/// # Errors
/// As [`read_covariance`](crate::read_covariance) and [`ExtraCovariance::new`].
pub fn read_extra_covariance(path: impl AsRef<Path>, rows: usize) -> Result<ExtraCovariance, DataError> {
    let path = path.as_ref();
    let array = square_array(format_of(path)?, &path.display().to_string(), &file_bytes(path)?, rows)?;
    Ok(ExtraCovariance::new(array.numbers, array.file)?)
}

impl Covariance {
    /// The sum with an additional covariance (an error of the theory, say) of the same rows.
    ///
    /// The sum with an estimate from mocks is not distributed as such an estimate: the noise models for mocks then
    /// inflate the whole of it, a little more than they need to.
    ///
    /// # Errors
    /// [`CovarianceError::WrongSize`].
    pub fn plus(&self, extra: &ExtraCovariance) -> Result<Covariance, CovarianceError> {
        if extra.len() != self.len() {
            let (origin, expected, found) = (extra.origin.clone(), self.len(), extra.len());
            return Err(CovarianceError::WrongSize { origin, expected, found });
        }
        let origin = format!("{} with {}", self.origin(), extra.origin);
        Covariance::labelled(self.matrix() + &extra.matrix, origin, self.labels().to_vec())
    }

    /// The covariance with the blocks between `rows` and `columns` (positions below [`Self::len`]) set to zero, both ways
    /// round; variances stay. For pairs of bins, say, that are known to be independent.
    ///
    /// What remains may have lost its definiteness, which shows when it is factored, and is no longer distributed as an
    /// estimate from mocks; where a block is independent of everything else, a survey of its own is better.
    pub fn with_empty_block(&self, rows: &[usize], columns: &[usize]) -> Covariance {
        let mut matrix = self.matrix().clone();
        for (i, j) in rows.iter().flat_map(|i| columns.iter().map(move |j| (*i, *j))).filter(|(i, j)| i != j)
        {
            matrix[(i, j)] = 0.0;
            matrix[(j, i)] = 0.0;
        }
        self.with_matrix(matrix)
    }
}
