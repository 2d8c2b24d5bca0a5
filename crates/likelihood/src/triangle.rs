//! The lower triangle of a Cholesky factor, packed by rows.

use nalgebra::DMatrix;

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
    /// Factored as correlations, so that rows in different units (ξ beside (Mpc/h)³) compare: the square of the
    /// i-th pivot is then the share of row i's variance that the rows before it do not explain. Rounding alone
    /// makes up to about n·2⁻⁵² of it; a share below that is not known to differ from zero.
    pub(crate) fn factor(matrix: &DMatrix<f64>) -> Option<Self> {
        let size = matrix.nrows();
        let deviations: Vec<f64> = matrix.diagonal().iter().map(|variance| variance.sqrt()).collect();
        let correlation =
            DMatrix::from_fn(size, size, |i, j| matrix[(i, j)] / (deviations[i] * deviations[j]));
        let factor = correlation.cholesky()?;
        let factor = factor.l_dirty();
        let rounding = size as f64 * f64::EPSILON;
        let sound = (0..size).all(|i| factor[(i, i)].powi(2) > rounding);
        if !sound {
            return None;
        }
        let mut entries = Vec::with_capacity(size * (size + 1) / 2);
        for i in 0..size {
            entries.extend((0..=i).map(|j| factor[(i, j)] * deviations[i]));
        }
        Some(Self { size, entries })
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
