//! Rows that changed places.

use nalgebra::DMatrix;

use super::comparison::{Comparison, VerdictError};

/// What changed places.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Swap {
    /// The measured values alone, against labels and covariance.
    Values,
    /// The labels: values and covariance are in one order, what they are said to be of in another.
    Labels,
}

/// Whether rows would fit better in another order.
#[derive(Clone, Debug, PartialEq)]
pub struct RowOrder {
    /// What would change places.
    pub swap: Swap,
    /// For each row, the row whose value (or label) belongs there; each its own where no other order is better.
    pub order: Vec<usize>,
    /// How much lower −2 ln L is in that order.
    pub improvement: f64,
    /// A bound on the probability of finding such an order among all that are as far from the given one, were the given
    /// one right.
    pub p_value: f64,
}

/// Looks for an order of a comparison's rows (those of one bin, say, by [`Comparison::select`]) that the data prefer.
///
/// Swaps of two rows are made as long as they lower χ² the most, once with values changing places and once with labels. One
/// given order has a likelihood e^(Δ/2) times that of the order as given with probability e^(−Δ/2) at most; k swaps reach no
/// more than [n(n − 1)/2]^k of them, and no more than n!; so p = 2 k_max · (number) · e^(−Δ/2), the least over k, bounds the rate
/// of false alarms whatever the data. What is found need not be the true order, only better by far than chance can be.
///
/// Rows need a signal, or noise in common with their neighbours, that tells them apart: of n rows, Δ must exceed 2 ln(n!).
///
/// # Errors
/// A covariance that is not definite.
pub fn row_order(comparison: &Comparison) -> Result<RowOrder, VerdictError> {
    let factored = comparison.factored()?;
    let size = comparison.len();
    let whitened = factored.whiten_matrix(&DMatrix::identity(size, size));
    let precision = whitened.tr_mul(&whitened);
    let start = factored.chi_squared(&comparison.residual());
    let mut lowest_log_p = 0.0;
    let mut best =
        RowOrder { swap: Swap::Values, order: (0..size).collect(), improvement: 0.0, p_value: 1.0 };
    for (swap, numbers, sign) in
        [(Swap::Values, comparison.data(), 1.0), (Swap::Labels, comparison.prediction(), -1.0)]
    {
        let mut numbers = numbers.clone();
        let mut order: Vec<usize> = (0..size).collect();
        // g = C⁻¹ r.
        let mut gradient = &precision * comparison.residual();
        let mut chi_squared = start;
        for swaps in 1..=most_swaps(size) {
            let mut lowest = (0.0, 0, 0);
            for (i, j) in (0..size).flat_map(|j| (0..j).map(move |i| (i, j))) {
                let step = sign * (numbers[j] - numbers[i]);
                let curvature = precision[(i, i)] + precision[(j, j)] - 2.0 * precision[(i, j)];
                let change = step * (2.0 * (gradient[i] - gradient[j]) + step * curvature);
                if change < lowest.0 {
                    lowest = (change, i, j);
                }
            }
            let (change, i, j) = lowest;
            if change >= 0.0 {
                break;
            }
            let step = sign * (numbers[j] - numbers[i]);
            gradient += (precision.column(i) - precision.column(j)) * step;
            numbers.swap_rows(i, j);
            order.swap(i, j);
            chi_squared = (chi_squared + change).max(0.0);
            let improvement = factored.badness(start) - factored.badness(chi_squared);
            let log_p = log_orders(size, swaps) + (2.0 * most_swaps(size) as f64).ln() - 0.5 * improvement;
            if log_p < lowest_log_p {
                lowest_log_p = log_p;
                let p_value = log_p.exp();
                best = RowOrder { swap, order: order.clone(), improvement, p_value };
            }
        }
    }
    Ok(best)
}

/// Swaps that any order of n rows can be reached with.
fn most_swaps(size: usize) -> usize {
    size.saturating_sub(1)
}

/// ln of a number that the orders at k swaps do not exceed.
fn log_orders(size: usize, swaps: usize) -> f64 {
    let pairs = (size * (size - 1) / 2) as f64;
    let all: f64 = (2..=size).map(|count| (count as f64).ln()).sum();
    (swaps as f64 * pairs.ln()).min(all)
}
