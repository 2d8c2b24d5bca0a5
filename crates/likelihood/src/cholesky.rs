//! Cholesky factorisation by blocks, for thousands of rows.

use nalgebra::{Cholesky, DMatrix, Dyn};

/// Rows of a block: three blocks of doubles (3 × 72 KiB) fit in a second-level cache.
const BLOCK: usize = 96;

/// The factor of a symmetric matrix of which the lower triangle is read, or `None` where a pivot is not above zero.
///
/// Column by column, as in the library this builds on, every column streams all earlier ones through memory, n³/3
/// numbers in all; by blocks (Golub & Van Loan, Matrix Computations) the work is matrix products, which
/// reuse what is in cache.
pub(crate) fn blocked_cholesky(mut matrix: DMatrix<f64>) -> Option<Cholesky<f64, Dyn>> {
    let size = matrix.nrows();
    for start in (0..size).step_by(BLOCK) {
        let end = (start + BLOCK).min(size);
        let width = end - start;
        let diagonal = matrix.view((start, start), (width, width)).into_owned().cholesky()?.unpack();
        matrix.view_mut((start, start), (width, width)).copy_from(&diagonal);
        if end == size {
            break;
        }
        // Below the diagonal block: L₂₁ᵀ = L₁₁⁻¹ A₂₁ᵀ.
        let mut transposed = matrix.view((end, start), (size - end, width)).transpose();
        if !diagonal.solve_lower_triangular_mut(&mut transposed) {
            return None;
        }
        let below = transposed.transpose();
        matrix.view_mut((end, start), (size - end, width)).copy_from(&below);
        // What remains: A₂₂ ← A₂₂ − L₂₁ L₂₁ᵀ, in block columns from the diagonal down.
        for first in (end..size).step_by(BLOCK) {
            let count = BLOCK.min(size - first);
            let left = below.rows(first - end, size - first);
            let right = transposed.columns(first - end, count);
            matrix.view_mut((first, first), (size - first, count)).gemm(-1.0, &left, &right, 1.0);
        }
    }
    Some(Cholesky::pack_dirty(matrix))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Below, at and above one and two blocks. The rounding of a factor is of order n·2⁻⁵² of unit diagonals.
    #[test]
    fn the_factor_times_its_transpose_is_the_matrix() {
        for size in [1, 2, BLOCK - 1, BLOCK, BLOCK + 1, 2 * BLOCK, 2 * BLOCK + 37] {
            let correlation = |i: usize, j: usize| (-(i.abs_diff(j) as f64) / 7.0).exp();
            let matrix = DMatrix::from_fn(size, size, correlation);
            let factor = blocked_cholesky(matrix.clone()).unwrap().unpack();
            let difference = &factor * factor.transpose() - &matrix;
            assert!(difference.amax() < 1e-14, "{size}: {:e}", difference.amax());
            let column_by_column = matrix.cholesky().unwrap().unpack();
            assert!((factor - column_by_column).amax() < 1e-13, "{size}");
        }
    }

    #[test]
    fn an_indefinite_matrix_has_no_factor() {
        for negative in [0, BLOCK - 1, BLOCK, 2 * BLOCK] {
            let mut matrix = DMatrix::identity(2 * BLOCK + 1, 2 * BLOCK + 1);
            matrix[(negative, negative)] = -1.0;
            assert!(blocked_cholesky(matrix).is_none(), "{negative}");
        }
        // A correlation above 1 across blocks.
        let mut matrix = DMatrix::identity(2 * BLOCK, 2 * BLOCK);
        matrix[(BLOCK + 5, 3)] = 1.5;
        matrix[(3, BLOCK + 5)] = 1.5;
        assert!(blocked_cholesky(matrix).is_none());
    }
}
