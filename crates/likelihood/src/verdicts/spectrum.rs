//! The modes of a covariance.

use nalgebra::{DMatrix, SymmetricEigen};

use crate::covariance::Covariance;

/// A mode: a combination of rows, in units of their standard deviations, that varies by itself.
#[derive(Clone, Debug, PartialEq)]
pub struct Mode {
    /// Its variance: 1 for rows without correlation.
    pub eigenvalue: f64,
    /// The rows that make up nine tenths of it, at most `rows_shown`, with the share of each; the largest first.
    pub rows: Vec<(usize, f64)>,
}

/// The eigenvalues of the correlations.
#[derive(Clone, Debug, PartialEq)]
pub struct Spectrum {
    /// All of them, the largest first. They add up to the number of rows.
    pub eigenvalues: Vec<f64>,
    /// Largest over smallest; infinite where the smallest is not above 0.
    pub condition: f64,
    /// The smallest modes, the smallest first.
    pub smallest: Vec<Mode>,
}

/// The spectrum of a covariance's correlations (so that rows of different units compare), with the `modes` smallest modes
/// and at most `rows_shown` rows of each. The matrix need not be definite.
pub fn spectrum(covariance: &Covariance, modes: usize, rows_shown: usize) -> Spectrum {
    if covariance.is_empty() {
        return Spectrum { eigenvalues: Vec::new(), condition: 1.0, smallest: Vec::new() };
    }
    let deviations = covariance.standard_deviations();
    let size = covariance.len();
    let matrix = covariance.matrix();
    let correlations = DMatrix::from_fn(size, size, |i, j| matrix[(i, j)] / (deviations[i] * deviations[j]));
    let eigen = SymmetricEigen::new(correlations);
    let mut order: Vec<usize> = (0..size).collect();
    order.sort_by(|left, right| eigen.eigenvalues[*right].total_cmp(&eigen.eigenvalues[*left]));
    let eigenvalues: Vec<f64> = order.iter().map(|mode| eigen.eigenvalues[*mode]).collect();
    let condition = match (eigenvalues.first(), eigenvalues.last()) {
        (Some(largest), Some(smallest)) if *smallest > 0.0 => largest / smallest,
        _ => f64::INFINITY,
    };
    let mode = |index: &usize| {
        let share = |row: &usize| eigen.eigenvectors[(*row, *index)].powi(2);
        let mut rows: Vec<usize> = (0..size).collect();
        rows.sort_by(|left, right| share(right).total_cmp(&share(left)));
        let mut covered = 0.0;
        let mut shown = Vec::new();
        for row in rows.into_iter().take(rows_shown) {
            if covered > 0.9 {
                break;
            }
            covered += share(&row);
            shown.push((row, share(&row)));
        }
        Mode { eigenvalue: eigen.eigenvalues[*index], rows: shown }
    };
    let smallest = order.iter().rev().take(modes).map(mode).collect();
    Spectrum { eigenvalues, condition, smallest }
}
