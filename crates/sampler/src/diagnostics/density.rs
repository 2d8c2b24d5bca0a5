//! Densities of draws, for pictures: one quantity, and two together.
//!
//! Draws are counted on a fine grid and smoothed by a normal kernel, which costs the same for any number of draws. The
//! bandwidth is Silverman's (1986, Density Estimation for Statistics and Data Analysis, eqs. 3.31 and 4.14), with the
//! effective number of draws in place of their number, since correlated draws know less than they count.

use super::quantiles::{quantile_of_sorted, sorted};

/// Points of a density of one quantity.
const POINTS: usize = 201;
/// Points a side of a joint density.
const SIDE: usize = 61;
/// Kernels end at this many bandwidths: beyond, a normal density is 3e-4 of its peak.
const REACH: f64 = 4.0;

/// The density of one quantity on an even grid.
#[derive(Clone, Debug, PartialEq)]
pub struct Density {
    /// Where.
    pub at: Vec<f64>,
    /// Probability per unit; integrates to 1 over the grid by the trapezium rule.
    pub density: Vec<f64>,
}

/// The joint density of two quantities on an even grid.
#[derive(Clone, Debug, PartialEq)]
pub struct JointDensity {
    /// Where, along the first quantity.
    pub first: Vec<f64>,
    /// Where, along the second.
    pub second: Vec<f64>,
    /// Relative density, `first.len()` rows of `second.len()`, with its largest value 1.
    pub density: Vec<Vec<f64>>,
    /// The level above which lie 68 % of the probability.
    pub level68: f64,
    /// The level above which lie 95 %.
    pub level95: f64,
}

/// Silverman's robust scale: the smaller of the standard deviation and IQR/1.34.
fn scale(sorted: &[f64]) -> f64 {
    let count = sorted.len() as f64;
    let mean = sorted.iter().sum::<f64>() / count;
    let variance = sorted.iter().map(|value| (value - mean).powi(2)).sum::<f64>() / (count - 1.0).max(1.0);
    let iqr = (quantile_of_sorted(sorted, 0.75) - quantile_of_sorted(sorted, 0.25)) / 1.34;
    if iqr > 0.0 { variance.sqrt().min(iqr) } else { variance.sqrt() }
}

struct Axis {
    low: f64,
    step: f64,
    bandwidth: f64,
    reflect: (bool, bool),
}

impl Axis {
    /// None where the draws do not spread, or are not all finite.
    fn new(draws: &[f64], support: (f64, f64), bandwidth: f64, points: usize) -> Option<Axis> {
        let sorted = sorted(draws);
        let (smallest, largest) = (*sorted.first()?, *sorted.last()?);
        let bandwidth = bandwidth * scale(&sorted);
        if !(bandwidth > 0.0 && bandwidth.is_finite() && smallest.is_finite() && largest.is_finite()) {
            return None;
        }
        // A thousandth at each end is left out unless the kernel reaches it: pictures are of the bulk.
        let low = (quantile_of_sorted(&sorted, 0.001) - REACH * bandwidth).max(support.0);
        let high = (quantile_of_sorted(&sorted, 0.999) + REACH * bandwidth).min(support.1);
        let step = (high - low) / (points as f64 - 1.0);
        (step > 0.0).then_some(Axis { low, step, bandwidth, reflect: (low == support.0, high == support.1) })
    }

    fn grid(&self, points: usize) -> Vec<f64> {
        (0..points).map(|index| self.low + self.step * index as f64).collect()
    }

    /// The nearest grid point; none outside.
    fn cell(&self, value: f64, points: usize) -> Option<usize> {
        let position = ((value - self.low) / self.step).round();
        (position >= 0.0 && position < points as f64).then_some(position as usize)
    }

    /// Smooths counts along the axis; what would leave a hard end of the support is folded back.
    fn smooth(&self, counts: &[f64]) -> Vec<f64> {
        let points = counts.len() as isize;
        let width = self.bandwidth / self.step;
        let reach = (REACH * width).ceil() as isize;
        let kernel: Vec<f64> =
            (-reach..=reach).map(|at| (-0.5 * (at as f64 / width).powi(2)).exp()).collect();
        let mut out = vec![0.0; counts.len()];
        for (index, &count) in counts.iter().enumerate().filter(|(_, count)| **count > 0.0) {
            for (offset, weight) in (-reach..=reach).zip(&kernel) {
                let mut at = index as isize + offset;
                if at < 0 && self.reflect.0 {
                    at = -at;
                }
                if at >= points && self.reflect.1 {
                    at = 2 * (points - 1) - at;
                }
                if (0..points).contains(&at) {
                    out[at as usize] += count * weight;
                }
            }
        }
        // The cell at a hard end is half inside the support.
        for (end, hard) in [(0, self.reflect.0), (counts.len() - 1, self.reflect.1)] {
            if hard {
                out[end] *= 2.0;
            }
        }
        out
    }
}

/// The density of draws worth `effective` independent ones. `support` is where the quantity can lie; the density does not
/// leak out of it. `None` where the draws do not spread.
#[must_use]
pub fn density(draws: &[f64], effective: f64, support: (f64, f64)) -> Option<Density> {
    let bandwidth = 0.9 * effective.clamp(2.0, draws.len().max(2) as f64).powf(-0.2);
    let axis = Axis::new(draws, support, bandwidth, POINTS)?;
    let mut counts = vec![0.0; POINTS];
    for cell in draws.iter().filter_map(|&draw| axis.cell(draw, POINTS)) {
        counts[cell] += 1.0;
    }
    let mut smoothed = axis.smooth(&counts);
    let ends = 0.5 * (smoothed[0] + smoothed[POINTS - 1]);
    let area = axis.step * (smoothed.iter().sum::<f64>() - ends);
    smoothed.iter_mut().for_each(|value| *value /= area);
    Some(Density { at: axis.grid(POINTS), density: smoothed })
}

/// The joint density of two quantities, as [`density`].
#[must_use]
pub fn joint_density(
    (first, second): (&[f64], &[f64]),
    effective: f64,
    supports: ((f64, f64), (f64, f64)),
) -> Option<JointDensity> {
    let bandwidth = effective.clamp(2.0, first.len().max(2) as f64).powf(-1.0 / 6.0);
    let axes =
        (Axis::new(first, supports.0, bandwidth, SIDE)?, Axis::new(second, supports.1, bandwidth, SIDE)?);
    let mut counts = vec![vec![0.0; SIDE]; SIDE];
    for (&x, &y) in first.iter().zip(second) {
        if let (Some(row), Some(column)) = (axes.0.cell(x, SIDE), axes.1.cell(y, SIDE)) {
            counts[row][column] += 1.0;
        }
    }
    let rows: Vec<Vec<f64>> = counts.iter().map(|row| axes.1.smooth(row)).collect();
    let mut density = vec![vec![0.0; SIDE]; SIDE];
    for column in 0..SIDE {
        let along: Vec<f64> = rows.iter().map(|row| row[column]).collect();
        for (row, value) in axes.0.smooth(&along).into_iter().enumerate() {
            density[row][column] = value;
        }
    }
    let peak = density.iter().flatten().fold(0.0, |most: f64, value| most.max(*value));
    density.iter_mut().flatten().for_each(|value| *value /= peak);
    let (level68, level95) = (level(&density, 0.68), level(&density, 0.95));
    Some(JointDensity { first: axes.0.grid(SIDE), second: axes.1.grid(SIDE), density, level68, level95 })
}

/// The density above which lies a share of the whole.
fn level(density: &[Vec<f64>], share: f64) -> f64 {
    let mut values: Vec<f64> = density.iter().flatten().copied().collect();
    values.sort_unstable_by(|one, other| other.total_cmp(one));
    let whole: f64 = values.iter().sum();
    let mut sum = 0.0;
    values
        .into_iter()
        .find(|value| {
            sum += value;
            sum >= share * whole
        })
        .unwrap_or(0.0)
}

#[cfg(test)]
mod tests {
    use super::*;
    use statrs::distribution::{ContinuousCDF, Normal};

    fn normal_scores(count: usize) -> Vec<f64> {
        let normal = Normal::standard();
        (0..count).map(|index| normal.inverse_cdf((index as f64 + 0.5) / count as f64)).collect()
    }

    /// Evenly spread quantiles have no noise, so what is left is the kernel's own widening: 1/√(1 + h²) at the peak.
    #[test]
    fn a_normal_density_comes_back() {
        let draws = normal_scores(4000);
        let found = density(&draws, 4000.0, (f64::NEG_INFINITY, f64::INFINITY)).expect("it spreads");
        let width: f64 = 0.9 * 4000f64.powf(-0.2);
        for (&x, &density) in found.at.iter().zip(&found.density) {
            let variance = 1.0 + width * width;
            let expected = (-0.5 * x * x / variance).exp() / (std::f64::consts::TAU * variance).sqrt();
            // Cells of a fiftieth of a standard deviation, and the ends of the draws, leave 2 ‰ of the peak.
            assert!((density - expected).abs() < 2e-3 * 0.4, "{x}: {density} {expected}");
        }
    }

    #[test]
    fn an_even_density_stays_even_up_to_its_ends() {
        let draws: Vec<f64> = (0..5000).map(|index| (f64::from(index) + 0.5) / 5000.0).collect();
        let found = density(&draws, 5000.0, (0.0, 1.0)).expect("it spreads");
        assert_eq!((found.at[0], found.density.len()), (0.0, POINTS));
        for density in &found.density {
            // 25 draws a cell, and end cells that hold half as many: no more than 3 %.
            assert!((density - 1.0).abs() < 0.03, "{density}");
        }
    }

    #[test]
    fn levels_of_a_joint_normal_hold_their_share() {
        let scores = normal_scores(200);
        let pairs: Vec<(f64, f64)> =
            scores.iter().flat_map(|x| scores.iter().map(move |y| (*x, 0.8 * x + 0.6 * y))).collect();
        let (first, second): (Vec<f64>, Vec<f64>) = pairs.into_iter().unzip();
        let everywhere = (f64::NEG_INFINITY, f64::INFINITY);
        let found = joint_density((&first, &second), 40_000.0, (everywhere, everywhere)).expect("it spreads");
        // Density above 1 − p of its peak holds the share p of a normal in two dimensions; the grid's cells of a seventh
        // of a standard deviation blur that by under 0.02.
        assert!((found.level68 - 0.32).abs() < 0.02, "{}", found.level68);
        assert!((found.level95 - 0.05).abs() < 0.02, "{}", found.level95);
    }

    #[test]
    fn what_does_not_spread_has_no_density() {
        assert_eq!(density(&[1.0; 50], 50.0, (0.0, 2.0)), None);
        assert_eq!(density(&[], 50.0, (0.0, 2.0)), None);
        assert_eq!(density(&[f64::NAN, 1.0, 2.0], 3.0, (0.0, 2.0)), None);
    }
}
