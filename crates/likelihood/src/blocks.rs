//! The parts of a compressed likelihood that have nothing to do with each other, and the hot loop over one of them.

use nalgebra::{ColPivQR, DMatrix, DVector};

/// Rows and columns (ascending) of one independent part.
pub(crate) struct Part {
    pub(crate) rows: Vec<usize>,
    pub(crate) columns: Vec<usize>,
}

/// Splits rows into parts between which neither covariance nor kernels have an entry. Columns of zeros are in none.
/// L⁻¹ of the covariance is zero between parts as well: elimination fills in only where a chain of entries leads.
pub(crate) fn independent_parts(covariance: &DMatrix<f64>, kernels: &DMatrix<f64>) -> Vec<Part> {
    let (rows, columns) = kernels.shape();
    let mut leader: Vec<usize> = (0..rows + columns).collect();
    fn find(leader: &mut [usize], mut node: usize) -> usize {
        while leader[node] != node {
            leader[node] = leader[leader[node]];
            node = leader[node];
        }
        node
    }
    let mut join = |a: usize, b: usize| {
        let (a, b) = (find(&mut leader, a), find(&mut leader, b));
        leader[a.max(b)] = a.min(b);
    };
    for j in 0..rows {
        for i in (j + 1..rows).filter(|i| covariance[(*i, j)] != 0.0) {
            join(i, j);
        }
    }
    for j in 0..columns {
        for i in (0..rows).filter(|i| kernels[(*i, j)] != 0.0) {
            join(i, rows + j);
        }
    }
    let mut parts: Vec<Part> = Vec::new();
    let mut part_of = vec![None; rows + columns];
    for row in 0..rows {
        let leader = find(&mut leader, row);
        let part = *part_of[leader].get_or_insert(parts.len());
        if part == parts.len() {
            parts.push(Part { rows: Vec::new(), columns: Vec::new() });
        }
        parts[part].rows.push(row);
    }
    for column in 0..columns {
        let leader = find(&mut leader, rows + column);
        if let Some(part) = part_of[leader] {
            parts[part].columns.push(column);
        }
    }
    parts
}

/// |R c − t|² over some of the coefficients.
///
/// R (rank × columns, upper trapezoidal) is stored in panels of four rows. A panel begins at its first row's diagonal
/// and holds, column by column, the four entries side by side; entries left of a diagonal are stored zeros. The sum
/// over columns then runs in four lanes with one broadcast coefficient a step, needs no horizontal sum, and two
/// alternating accumulators hide the latency of the addition.
#[derive(Clone, Debug)]
pub(crate) struct Block {
    columns: Vec<usize>,
    rank: usize,
    panels: Vec<[f64; LANES]>,
    targets: Vec<[f64; LANES]>,
}

const LANES: usize = 4;

impl Block {
    /// From whitened kernels and data of one part; `columns` are the kernels' places among all coefficients. Also
    /// returns |y|² − |Qᵀy|², the squared length of the data that no coefficients can fit.
    pub(crate) fn new(kernels: DMatrix<f64>, data: Vec<f64>, columns: &[usize]) -> (Option<Self>, f64) {
        let mut data = DVector::from_vec(data);
        if columns.is_empty() {
            return (None, data.norm_squared());
        }
        let (rows, count) = kernels.shape();
        let lengths: Vec<f64> = kernels.column_iter().map(|column| column.norm()).collect();
        let scaled = DMatrix::from_fn(rows, count, |i, j| kernels[(i, j)] / lengths[j]);
        let factors = ColPivQR::new(scaled);
        factors.q_tr_mul(&mut data);
        let triangle = factors.r();
        let mut order = DMatrix::from_fn(1, count, |_, j| j);
        factors.p().permute_columns(&mut order);
        // Columns have unit length: what rounding leaves of a dependent one is of order 2⁻⁵² times their number.
        let rounding = rows.max(count) as f64 * f64::EPSILON;
        let rank =
            (0..rows.min(count)).find(|i| triangle[(*i, *i)].abs() <= rounding).unwrap_or(rows.min(count));
        let unfitted = data.rows_range(rank..).norm_squared();
        let entry = |i: usize, j: usize| match i < rank && i <= j {
            true => triangle[(i, j)] * lengths[order[(0, j)]],
            false => 0.0,
        };
        let mut panels = Vec::new();
        let mut targets = Vec::new();
        for start in (0..rank).step_by(LANES) {
            let lane = |lane: usize| {
                if start + lane < rank { data[start + lane] } else { 0.0 }
            };
            targets.push(std::array::from_fn(lane));
            panels.extend((start..count).map(|j| std::array::from_fn(|lane| entry(start + lane, j))));
        }
        let columns = order.iter().map(|column| columns[*column]).collect();
        (Some(Self { columns, rank, panels, targets }), unfitted)
    }

    /// The coefficients, in the order of R's columns.
    pub(crate) fn columns(&self) -> &[usize] {
        &self.columns
    }

    pub(crate) fn rank(&self) -> usize {
        self.rank
    }

    /// R, rank × columns.
    pub(crate) fn triangle(&self) -> DMatrix<f64> {
        let count = self.columns.len();
        let mut triangle = DMatrix::zeros(self.rank, count);
        let mut first = 0;
        for start in (0..self.rank).step_by(LANES) {
            for (j, entries) in (start..count).zip(&self.panels[first..]) {
                for (lane, entry) in entries.iter().enumerate().take(self.rank - start) {
                    triangle[(start + lane, j)] = *entry;
                }
            }
            first += count - start;
        }
        triangle
    }

    /// t = Qᵀy, rank numbers.
    pub(crate) fn target(&self) -> DVector<f64> {
        DVector::from_iterator(self.rank, self.targets.iter().flatten().copied().take(self.rank))
    }

    /// |R c − t|², c picked from all coefficients into an array on the stack.
    #[inline]
    pub(crate) fn squared_distance(&self, coefficients: &[f64]) -> f64 {
        match self.columns.len() {
            0..=32 => self.gathered::<32>(coefficients),
            33..=128 => self.gathered::<128>(coefficients),
            129..=512 => self.gathered::<512>(coefficients),
            _ => {
                let picked: Vec<f64> = self.columns.iter().map(|column| coefficients[*column]).collect();
                self.sum_panels(&picked)
            }
        }
    }

    #[inline]
    fn gathered<const CAPACITY: usize>(&self, coefficients: &[f64]) -> f64 {
        let mut picked = [0.0; CAPACITY];
        for (slot, column) in picked.iter_mut().zip(&self.columns) {
            *slot = coefficients[*column];
        }
        self.sum_panels(&picked[..self.columns.len()])
    }

    #[inline]
    fn sum_panels(&self, picked: &[f64]) -> f64 {
        let mut panels = self.panels.as_slice();
        let mut squares = [0.0; LANES];
        for (panel, target) in self.targets.iter().enumerate() {
            let picked = &picked[LANES * panel..];
            let (entries, below) = panels.split_at(picked.len());
            panels = below;
            let mut even = target.map(|t| -t);
            let mut odd = [0.0; LANES];
            let (pairs, last) = entries.as_chunks::<2>();
            let (picked_pairs, picked_last) = picked.as_chunks::<2>();
            for ([first, second], [c_first, c_second]) in pairs.iter().zip(picked_pairs) {
                for lane in 0..LANES {
                    even[lane] += first[lane] * c_first;
                    odd[lane] += second[lane] * c_second;
                }
            }
            for (entry, c) in last.iter().zip(picked_last) {
                for lane in 0..LANES {
                    even[lane] += entry[lane] * c;
                }
            }
            for lane in 0..LANES {
                let residual = even[lane] + odd[lane];
                squares[lane] += residual * residual;
            }
        }
        (squares[0] + squares[1]) + (squares[2] + squares[3])
    }
}
