//! Lines of equal density.

/// The line segments at which a field on a grid crosses `level`, by marching squares with linear interpolation. `field`
/// has a row for each of `first` and in it a number for each of `second`. Saddles are cut as if their middle were below.
pub(crate) fn contours(
    (first, second): (&[f64], &[f64]),
    field: &[Vec<f64>],
    level: f64,
) -> Vec<[(f64, f64); 2]> {
    let mut segments = Vec::new();
    for i in 0..first.len().saturating_sub(1) {
        for j in 0..second.len().saturating_sub(1) {
            let corners = [(i, j), (i + 1, j), (i + 1, j + 1), (i, j + 1)];
            let mut crossings = Vec::new();
            for edge in 0..4 {
                let (one, other) = (corners[edge], corners[(edge + 1) % 4]);
                let (low, high) = (field[one.0][one.1] - level, field[other.0][other.1] - level);
                if (low > 0.0) != (high > 0.0) {
                    let part = low / (low - high);
                    let between = |from: f64, to: f64| from + part * (to - from);
                    crossings.push((
                        between(first[one.0], first[other.0]),
                        between(second[one.1], second[other.1]),
                    ));
                }
            }
            segments.extend(crossings.chunks_exact(2).map(|pair| [pair[0], pair[1]]));
        }
    }
    segments
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cone_has_round_contours() {
        let axis: Vec<f64> = (-20..=20).map(|index| f64::from(index) / 10.0).collect();
        let field: Vec<Vec<f64>> =
            axis.iter().map(|x: &f64| axis.iter().map(|y| 2.0 - x.hypot(*y)).collect()).collect();
        let segments = contours((&axis, &axis), &field, 1.0);
        assert!(segments.len() > 40, "{}", segments.len());
        for (x, y) in segments.into_iter().flatten() {
            // Linear interpolation over a cell of 0.1: the arc's height over its chord, 0.1²/8.
            assert!((x.hypot(y) - 1.0).abs() < 2e-3, "{x} {y}");
        }
    }
}
