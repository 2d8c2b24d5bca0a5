//! The lower triangle of a Cholesky factor, packed by rows.

use nalgebra::{Cholesky, DMatrix, DVector, Dyn};

use crate::cholesky::blocked_cholesky;

/// Sum of products, in eight running sums so that it vectorises and no long chain of roundings builds up.
pub(crate) fn dot(left: &[f64], right: &[f64]) -> f64 {
    let (left_blocks, left_rest) = left.as_chunks::<8>();
    let (right_blocks, right_rest) = right.as_chunks::<8>();
    let mut sums = [0.0; 8];
    for (a, b) in left_blocks.iter().zip(right_blocks) {
        for lane in 0..8 {
            sums[lane] += a[lane] * b[lane];
        }
    }
    let rest: f64 = left_rest.iter().zip(right_rest).map(|(a, b)| a * b).sum();
    let [a, b, c, d, e, f, g, h] = sums;
    ((a + b) + (c + d)) + ((e + f) + (g + h)) + rest
}

/// L with C = L Lᵀ; row i holds i + 1 numbers, so that a forward substitution reads memory once, in order.
#[derive(Clone, Debug)]
pub(crate) struct LowerTriangle {
    size: usize,
    entries: Vec<f64>,
}

impl LowerTriangle {
    /// The Cholesky factor of a symmetric matrix, or `None` where it is not positive definite beyond rounding.
    ///
    /// Factored as correlations, so that rows in different units (ξ beside (Mpc/h)³) compare. Elimination alone lets
    /// half of all singular matrices through: their last pivot is rounding of either sign. So the smallest eigenvalue
    /// must also exceed n·2⁻⁵² of the largest, the usual rule for a numerical rank.
    pub(crate) fn factor(matrix: &DMatrix<f64>) -> Option<Self> {
        let size = matrix.nrows();
        let deviations: Vec<f64> = matrix.diagonal().iter().map(|variance| variance.sqrt()).collect();
        let correlation =
            DMatrix::from_fn(size, size, |i, j| matrix[(i, j)] / (deviations[i] * deviations[j]));
        // The largest sum of a row's sizes bounds the largest eigenvalue.
        let largest = correlation.row_iter().map(|row| row.lp_norm(1)).fold(0.0, f64::max);
        let factor = blocked_cholesky(correlation)?;
        if size > 1 && smallest_eigenvalue(&factor) <= size as f64 * f64::EPSILON * largest {
            return None;
        }
        let factor = factor.l_dirty();
        let mut entries = Vec::with_capacity(size * (size + 1) / 2);
        for i in 0..size {
            entries.extend((0..=i).map(|j| factor[(i, j)] * deviations[i]));
        }
        Some(Self { size, entries })
    }

    /// Rows.
    pub(crate) fn size(&self) -> usize {
        self.size
    }

    /// ln det(L Lᵀ).
    pub(crate) fn log_determinant(&self) -> f64 {
        let mut end = 0;
        let mut sum = 0.0;
        for i in 0..self.size {
            end += i + 1;
            sum += self.entries[end - 1].ln();
        }
        2.0 * sum
    }

    /// x ← L⁻¹ x. The length of `x` is the size of the triangle.
    pub(crate) fn solve_in_place(&self, x: &mut [f64]) {
        let mut rows = self.entries.as_slice();
        for i in 0..self.size {
            let (row, below) = rows.split_at(i + 1);
            let (solved, rest) = x.split_at_mut(i);
            rest[0] = (rest[0] - dot(&row[..i], solved)) / row[i];
            rows = below;
        }
    }
}

/// Estimate, from above, of the smallest eigenvalue by inverse iteration. Each step shrinks the error by the square
/// of the ratio to the next eigenvalue, which for a matrix that is singular to rounding is 10⁻¹⁰ or so; where the two
/// smallest are close, the estimate lies between them, which serves as well.
fn smallest_eigenvalue(factor: &Cholesky<f64, Dyn>) -> f64 {
    let size = factor.l_dirty().nrows();
    // Any start that is not orthogonal to the mode; this one has no pattern in common with shells or bins.
    let mut direction = DVector::from_fn(size, |i, _| 1.0 + (12.9898 * i as f64).sin()).normalize();
    let mut inverse = 0.0;
    for _ in 0..4 {
        let solved = factor.solve(&direction);
        inverse = direction.dot(&solved);
        direction = solved.normalize();
    }
    inverse.recip()
}
