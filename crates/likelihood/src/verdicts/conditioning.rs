//! What priors become when some parameters are known.

use nalgebra::DMatrix;

/// The prior covariance with the parameters of `held` known exactly, at their means: Σ_ff − Σ_fh Σ_hh⁺ Σ_hf for
/// those that stay free, zero for those held. An error that held and free parameters have in common is known with them.
pub(super) fn conditioned(prior: &DMatrix<f64>, held: &[usize]) -> DMatrix<f64> {
    if held.is_empty() {
        return prior.clone();
    }
    let block = prior.select_rows(held).select_columns(held);
    // In units of their own standard deviations; directions that have no variance (below rounding) tell nothing.
    let scale = block.diagonal().map(|variance| if variance > 0.0 { variance.sqrt().recip() } else { 0.0 });
    let scaled = DMatrix::from_fn(held.len(), held.len(), |i, j| block[(i, j)] * scale[i] * scale[j]);
    let eigen = scaled.symmetric_eigen();
    let across = DMatrix::from_fn(held.len(), prior.ncols(), |i, j| prior[(held[i], j)] * scale[i]);
    let along = eigen.eigenvectors.tr_mul(&across);
    let mut conditioned = prior.clone();
    for (mode, eigenvalue) in eigen.eigenvalues.iter().enumerate().filter(|(_, value)| **value > 1e-12) {
        let row = along.row(mode).transpose();
        conditioned.ger(-eigenvalue.recip(), &row, &row, 1.0);
    }
    for parameter in held {
        conditioned.row_mut(*parameter).fill(0.0);
        conditioned.column_mut(*parameter).fill(0.0);
    }
    // Rounding can leave a variance that ought to be zero below it.
    for index in 0..conditioned.nrows() {
        if conditioned[(index, index)] <= 1e-14 * prior[(index, index)] {
            conditioned.row_mut(index).fill(0.0);
            conditioned.column_mut(index).fill(0.0);
        }
    }
    conditioned
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_left_is_the_conditional_variance() {
        // Var a = 4, b = 1, covariance 1, and c by itself.
        let prior = DMatrix::from_row_slice(3, 3, &[4.0, 1.0, 0.0, 1.0, 1.0, 0.0, 0.0, 0.0, 2.0]);
        let found = conditioned(&prior, &[1]);
        assert!(
            (found - DMatrix::from_row_slice(3, 3, &[3.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 2.0])).amax()
                < 1e-15
        );
        assert_eq!(conditioned(&prior, &[]), prior);
        // One error in common: known with either. Held already: nothing changes.
        let shared = DMatrix::from_element(2, 2, 0.09);
        assert_eq!(conditioned(&shared, &[0]), DMatrix::zeros(2, 2));
        assert_eq!(conditioned(&shared, &[0, 1]), DMatrix::zeros(2, 2));
        let held = DMatrix::from_row_slice(2, 2, &[0.0, 0.0, 0.0, 5.0]);
        assert_eq!(conditioned(&held, &[0]), held);
    }
}
