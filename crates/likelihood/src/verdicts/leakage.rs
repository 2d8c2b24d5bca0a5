//! An even multipole that leaks into an odd one.

use nalgebra::DVector;

/// The direction of a leak: `values[source]` at each target row of `leaks` (target, source), zero elsewhere. `values` are
/// those of all rows, predicted or measured: with the even multipole of the same bin, pair and place as source of an odd
/// one, [`amplitude`](super::amplitude) gives the share that leaks, with its error.
///
/// Predicted values are better: measured ones bring their noise, which correlates with that of the target.
pub fn leakage_direction(values: &DVector<f64>, leaks: &[(usize, usize)]) -> DVector<f64> {
    let mut direction = DVector::zeros(values.len());
    for (target, source) in leaks {
        direction[*target] += values[*source];
    }
    direction
}
