//! From the rows that a model predicts to the numbers that were measured.

use super::measurements::SurveyMeasurements;
use nalgebra::DMatrix;
use std::ops::Range;

/// Entries of 0 between two others that are multiplied all the same: a run costs its look-up, about as much as these.
const BRIDGED: usize = 8;

/// measured = M · predicted: the identity for a survey without a window, its window matrix for one with.
///
/// A row of a window holds runs of entries that are not 0: as fast as a dense product where all are, and as a sparse one
/// where few are.
#[derive(Clone, Debug)]
pub(super) struct Projection {
    rows: Vec<Vec<Run>>,
    predicted: usize,
    identity: bool,
}

/// Entries of one row of M that follow each other.
#[derive(Clone, Debug)]
struct Run {
    columns: Range<usize>,
    values: Vec<f64>,
}

impl Projection {
    /// Of all surveys, one after another.
    pub(super) fn new(surveys: &[SurveyMeasurements]) -> Projection {
        let (mut rows, mut predicted) = (Vec::new(), 0);
        for survey in surveys {
            match &survey.window {
                Some(window) => {
                    let of_window = (0..window.matrix.nrows()).map(|row| {
                        let entries: Vec<f64> = window.matrix.row(row).iter().copied().collect();
                        runs(&entries, predicted)
                    });
                    rows.extend(of_window);
                    predicted += window.rows.len();
                }
                None => {
                    let own = predicted..predicted + survey.table.len();
                    predicted = own.end;
                    rows.extend(own.map(|at| vec![Run { columns: at..at + 1, values: vec![1.0] }]));
                }
            }
        }
        let identity = surveys.iter().all(|survey| survey.window.is_none());
        Projection { rows, predicted, identity }
    }

    /// Rows that the model predicts.
    pub(super) fn predicted(&self) -> usize {
        self.predicted
    }

    /// Whether measured rows are predicted rows.
    pub(super) fn is_identity(&self) -> bool {
        self.identity
    }

    /// Writes one number a measured row.
    pub(super) fn apply(&self, predicted: &[f64], measured: &mut [f64]) {
        for (out, row) in measured.iter_mut().zip(&self.rows) {
            *out = row.iter().map(|run| run.times(&predicted[run.columns.clone()])).sum();
        }
    }

    /// M times the kernels: measured rows × coefficients.
    pub(super) fn of_kernels(&self, kernels: &DMatrix<f64>) -> DMatrix<f64> {
        let mut projected = DMatrix::zeros(self.rows.len(), kernels.ncols());
        for (kernel, mut out) in kernels.column_iter().zip(projected.column_iter_mut()) {
            self.apply(kernel.as_slice(), out.as_mut_slice());
        }
        projected
    }
}

impl Run {
    fn times(&self, predicted: &[f64]) -> f64 {
        self.values.iter().zip(predicted).map(|(weight, value)| weight * value).sum()
    }
}

fn runs(entries: &[f64], first: usize) -> Vec<Run> {
    let mut ranges: Vec<Range<usize>> = Vec::new();
    for column in (0..entries.len()).filter(|&column| entries[column] != 0.0) {
        match ranges.last_mut() {
            Some(range) if column <= range.end + BRIDGED => range.end = column + 1,
            _ => ranges.push(column..column + 1),
        }
    }
    let run = |range: Range<usize>| Run {
        columns: first + range.start..first + range.end,
        values: entries[range].to_vec(),
    };
    ranges.into_iter().map(run).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn runs_leave_out_long_stretches_of_zeros_only() {
        let mut entries = vec![0.0; 40];
        for (column, value) in [(2, 1.0), (3, 2.0), (10, 3.0), (30, 4.0)] {
            entries[column] = value;
        }
        let runs = runs(&entries, 100);
        let columns: Vec<Range<usize>> = runs.iter().map(|run| run.columns.clone()).collect();
        assert_eq!(columns, [102..111, 130..131]);
        let predicted: Vec<f64> = (0..140).map(f64::from).collect();
        let product: f64 = runs.iter().map(|run| run.times(&predicted[run.columns.clone()])).sum();
        assert_eq!(product, 102.0 + 2.0 * 103.0 + 3.0 * 110.0 + 4.0 * 130.0);
    }
}
