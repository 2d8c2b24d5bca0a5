//! The block of a covariance between odd and even rows, against what is expected of it.

use nalgebra::DMatrix;

use crate::covariance::Covariance;
use crate::goodness::tails;
use crate::triangle::LowerTriangle;

use super::comparison::VerdictError;

/// Correlations between two groups of rows.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ParityBlock {
    /// The correlation largest in size, and its place: row of the first group, row of the second.
    pub largest: (f64, usize, usize),
    /// The difference from the expected correlation largest in size.
    pub largest_difference: f64,
    /// The probability that an estimate from mocks differs from the expectation at least this much; `None` where the
    /// covariance was not estimated, or from no more mocks than rows.
    pub p_value: Option<f64>,
}

/// Compares the block of `covariance` between rows `first` and rows `second` (odd and even multipoles) with that of
/// `expected`, a covariance of the same rows; without one, with none at all between the groups.
///
/// p-value, for an estimate from n mocks: in units in which the expected covariance is unity, Wilks' Λ = det S/(det S₁ det S₂)
/// tests whether the groups are independent: −[n − 1 − (p + q + 1)/2] ln Λ follows χ² with pq degrees of freedom (Bartlett
/// 1938, Proc. Cambridge Philos. Soc. 34, 33), to a few per cent of p for n above 2(p + q). With an expectation, a wrong block
/// between the groups shows; wrong correlations within a group do not, unless they reach across.
///
/// # Errors
/// An expectation of other size; a block that is not definite.
pub fn parity_block(
    covariance: &Covariance,
    expected: Option<&Covariance>,
    first: &[usize],
    second: &[usize],
    mock_count: Option<usize>,
) -> Result<ParityBlock, VerdictError> {
    if let Some(expected) = expected.filter(|expected| expected.len() != covariance.len()) {
        let (of, what) = ("rows", "the expected covariance");
        return Err(VerdictError::Shape { what, of, expected: covariance.len(), found: expected.len() });
    }
    let correlation = |matrix: &DMatrix<f64>, i: usize, j: usize| {
        matrix[(i, j)] / (matrix[(i, i)].sqrt() * matrix[(j, j)].sqrt())
    };
    let (mut largest, mut largest_difference) = ((0.0_f64, 0, 0), 0.0_f64);
    for (i, j) in first.iter().flat_map(|i| second.iter().map(move |j| (*i, *j))) {
        let found = correlation(covariance.matrix(), i, j);
        let wanted = expected.map_or(0.0, |expected| correlation(expected.matrix(), i, j));
        if found.abs() > largest.0.abs() {
            largest = (found, i, j);
        }
        if (found - wanted).abs() > largest_difference.abs() {
            largest_difference = found - wanted;
        }
    }
    let rows: Vec<usize> = first.iter().chain(second).copied().collect();
    let p_value = match mock_count {
        Some(mocks) if mocks > rows.len() && !first.is_empty() && !second.is_empty() => {
            let estimate = covariance.select(&rows);
            let whitened = match expected {
                Some(expected) => in_units_of(&estimate, &expected.select(&rows).factor()?),
                None => estimate.matrix().clone(),
            };
            let log_lambda = log_determinant(&whitened)
                - log_determinant(&whitened.view_range(..first.len(), ..first.len()).into_owned())
                - log_determinant(&whitened.view_range(first.len().., first.len()..).into_owned());
            let (p, q, n) = (first.len() as f64, second.len() as f64, mocks as f64);
            let statistic = -(n - 1.0 - 0.5 * (p + q + 1.0)) * log_lambda;
            tails(statistic.max(0.0), p * q, None).map(|(_, upper)| upper)
        }
        _ => None,
    };
    Ok(ParityBlock { largest, largest_difference, p_value })
}

/// L⁻¹ S L⁻ᵀ.
fn in_units_of(covariance: &Covariance, factor: &LowerTriangle) -> DMatrix<f64> {
    let half = |matrix: &DMatrix<f64>| {
        let mut solved = matrix.clone();
        for mut column in solved.column_iter_mut() {
            factor.solve_in_place(column.as_mut_slice());
        }
        solved.transpose()
    };
    half(&half(covariance.matrix()))
}

/// NaN, which makes no p-value, where the matrix is not definite.
fn log_determinant(matrix: &DMatrix<f64>) -> f64 {
    LowerTriangle::factor(matrix).map_or(f64::NAN, |factor| factor.log_determinant())
}
