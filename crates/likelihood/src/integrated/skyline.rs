//! Symmetric matrices whose rows begin at their first entry that can differ from 0, and their Cholesky factors.

/// Where rows begin. Row i holds columns first[i] to i; a Cholesky factor has entries nowhere else.
#[derive(Clone, Debug)]
pub(super) struct Skyline {
    first: Vec<usize>,
    /// Where each row's entries stand, less first[i]: entry (i, j) is at base[i] + j.
    base: Vec<isize>,
    length: usize,
}

impl Skyline {
    /// For entries in the lower triangle at these places, and every diagonal.
    pub(super) fn new(size: usize, entries: impl Iterator<Item = (usize, usize)>) -> Self {
        let mut first: Vec<usize> = (0..size).collect();
        for (row, column) in entries {
            let (row, column) = (row.max(column), row.min(column));
            first[row] = first[row].min(column);
        }
        let (mut base, mut length) = (Vec::with_capacity(size), 0);
        for (row, first) in first.iter().enumerate() {
            base.push(length as isize - *first as isize);
            length += row - first + 1;
        }
        Self { first, base, length }
    }

    /// Numbers in all rows.
    pub(super) fn length(&self) -> usize {
        self.length
    }

    /// Where an entry of the lower triangle stands, which must be one that the skyline holds.
    pub(super) fn place(&self, row: usize, column: usize) -> usize {
        let (row, column) = (row.max(column), row.min(column));
        (self.base[row] + column as isize) as usize
    }

    /// Row i from its first entry to the diagonal.
    fn row(&self, row: usize) -> std::ops::Range<usize> {
        self.place(row, self.first[row])..self.place(row, row) + 1
    }

    /// M ← L with M = L Lᵀ, its diagonal inverted (1/L_ii stands there), and x ← L⁻¹ x. Returns ln det L: NaN or −∞ where M
    /// is not positive definite.
    pub(super) fn factor_and_solve(&self, matrix: &mut [f64], x: &mut [f64]) -> f64 {
        let (mut product, mut logarithm) = (1.0, 0.0);
        for i in 0..self.first.len() {
            let range = self.row(i);
            let (above, rest) = matrix.split_at_mut(range.start);
            let row = &mut rest[..range.len()];
            let start = self.first[i];
            for j in start..i {
                let from = start.max(self.first[j]);
                let other = self.row(j);
                let other = &above[other.start + (from - self.first[j])..other.end];
                let (diagonal, other) = other.split_last().unwrap_or((&0.0, &[]));
                let sum = dot(other, &row[from - start..j - start]);
                row[j - start] = (row[j - start] - sum) * diagonal;
            }
            let (row, diagonal) = row.split_at_mut(i - start);
            let pivot = (diagonal[0] - dot(row, row)).sqrt();
            diagonal[0] = pivot.recip();
            x[i] = (x[i] - dot(row, &x[start..i])) * diagonal[0];
            product *= pivot;
            // One logarithm for many pivots.
            if !(1e-150..1e150).contains(&product) {
                logarithm += product.ln();
                product = 1.0;
            }
        }
        logarithm + product.ln()
    }

    /// x ← L⁻ᵀ x for a factor of [`Self::factor_and_solve`], after `set` had its say on the last entry.
    pub(super) fn back_substitute(&self, factor: &[f64], x: &mut [f64], set_last: Option<f64>) {
        for i in (0..self.first.len()).rev() {
            let row = &factor[self.row(i)];
            let (diagonal, row) = row.split_last().unwrap_or((&0.0, &[]));
            x[i] = match set_last {
                Some(value) if i + 1 == self.first.len() => value,
                _ => x[i] * diagonal,
            };
            let value = x[i];
            for (entry, above) in row.iter().zip(&mut x[self.first[i]..i]) {
                *above -= entry * value;
            }
        }
    }

    /// 1/L_ii of the last row.
    pub(super) fn last_inverse_pivot(&self, factor: &[f64]) -> f64 {
        factor[self.length - 1]
    }
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::{DMatrix, DVector};

    /// Two blocks of two and a row across: against nalgebra's factor of the full matrix.
    #[test]
    fn factor_solve_and_back_substitution_are_those_of_the_full_matrix() {
        let entries = [(1, 0), (3, 2), (4, 0), (4, 1), (4, 2), (4, 3)];
        let mut matrix = DMatrix::from_diagonal(&DVector::from_vec(vec![3.0, 4.0, 5.0, 6.0, 7.0]));
        let skyline = Skyline::new(5, entries.into_iter());
        let mut packed = vec![0.0; skyline.length()];
        assert_eq!(skyline.length(), 11);
        for (n, (i, j)) in entries.into_iter().enumerate() {
            matrix[(i, j)] = 0.3 + 0.2 * n as f64;
            matrix[(j, i)] = matrix[(i, j)];
            packed[skyline.place(i, j)] = matrix[(i, j)];
        }
        (0..5).for_each(|i| packed[skyline.place(i, i)] = matrix[(i, i)]);
        let right = DVector::from_vec(vec![1.0, -2.0, 0.5, 3.0, -1.0]);
        let mut x = right.as_slice().to_vec();
        let logarithm = skyline.factor_and_solve(&mut packed, &mut x);
        let full = nalgebra::Cholesky::new(matrix).unwrap();
        assert!((logarithm - 0.5 * full.determinant().ln()).abs() < 1e-14);
        skyline.back_substitute(&packed, &mut x, None);
        let expected = full.solve(&right);
        assert!(x.iter().zip(expected.iter()).all(|(a, b)| (a - b).abs() < 1e-14), "{x:?} {expected}");
        assert!((skyline.last_inverse_pivot(&packed) - 1.0 / full.l()[(4, 4)]).abs() < 1e-15);
    }

    #[test]
    fn a_matrix_that_is_not_definite_has_no_logarithm() {
        let skyline = Skyline::new(2, [(1, 0)].into_iter());
        let mut packed = vec![1.0, 2.0, 1.0];
        assert!(skyline.factor_and_solve(&mut packed, &mut [0.0; 2]).is_nan());
    }
}
