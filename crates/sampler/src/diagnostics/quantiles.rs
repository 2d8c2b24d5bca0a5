//! Quantiles and central intervals of draws.

/// Quantile of sorted values, linear between order statistics: position p·(n − 1) (Hyndman & Fan 1996, definition 7).
///
/// NaN for no values.
pub fn quantile_of_sorted(sorted: &[f64], p: f64) -> f64 {
    let Some(last) = sorted.len().checked_sub(1) else {
        return f64::NAN;
    };
    let position = p.clamp(0.0, 1.0) * last as f64;
    let below = (position.floor() as usize).min(last);
    let above = (below + 1).min(last);
    let fraction = position - below as f64;
    // Two forms, so that the ends are met exactly and the result is monotone in p.
    let (a, b) = (sorted[below], sorted[above]);
    if fraction < 0.5 { a + fraction * (b - a) } else { b - (1.0 - fraction) * (b - a) }
}

/// Quantile of values in any order; sorts a copy.
pub fn quantile(values: &[f64], p: f64) -> f64 {
    quantile_of_sorted(&sorted(values), p)
}

/// Median of values in any order.
pub fn median(values: &[f64]) -> f64 {
    quantile(values, 0.5)
}

/// The interval that leaves (1 − `probability`)/2 on each side; sorts a copy.
pub fn central_interval(values: &[f64], probability: f64) -> (f64, f64) {
    let sorted = sorted(values);
    let tail = 0.5 * (1.0 - probability);
    (quantile_of_sorted(&sorted, tail), quantile_of_sorted(&sorted, 1.0 - tail))
}

/// A sorted copy.
pub(crate) fn sorted(values: &[f64]) -> Vec<f64> {
    let mut copy = values.to_vec();
    copy.sort_unstable_by(f64::total_cmp);
    copy
}
