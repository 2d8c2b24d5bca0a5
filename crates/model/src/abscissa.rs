//! One separation or shell, one wavenumber or wavenumber bin: what turns a spectrum into a number there.

use crate::grid::WavenumberGrid;
use crate::rows::{Row, Space};
use oddwell_cosmology::{gauss_legendre, spherical_bessel_all};

/// Where a row stands, shared by all rows that stand there.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Abscissa {
    pub(crate) space: Space,
    pub(crate) at: f64,
    pub(crate) edges: Option<(f64, f64)>,
}

impl Abscissa {
    pub(crate) fn of(row: &Row) -> Abscissa {
        Abscissa { space: row.space, at: row.at, edges: row.edges }
    }

    /// The largest separation or wavenumber it reaches.
    pub(crate) fn end(&self) -> f64 {
        self.edges.map_or(self.at, |(_, high)| high)
    }

    /// Points and weights of the average: weight x²dx over the shell, 3/(hi³−lo³) in front; `n` Gauss–Legendre points.
    fn average(&self, n: usize) -> Vec<(f64, f64)> {
        let Some((low, high)) = self.edges else {
            return vec![(self.at, 1.0)];
        };
        let rule = gauss_legendre(n);
        let (centre, half) = (0.5 * (low + high), 0.5 * (high - low));
        let norm = 3.0 * half / (high.powi(3) - low.powi(3));
        let points = rule.nodes.iter().zip(&rule.weights);
        points
            .map(|(node, weight)| (centre + half * node, weight))
            .map(|(x, w)| (x, norm * w * x * x))
            .collect()
    }

    /// The wavenumbers and weights over which a Fourier row is averaged. Twenty-four points resolve the acoustic
    /// feature over a bin as wide as 0.3 h/Mpc.
    pub(crate) fn wavenumbers(&self) -> Vec<(f64, f64)> {
        self.average(24)
    }
}

/// jₗ(ks) and s·jₗ(ks), averaged over a shell, at every wavenumber of a grid and times the grid's weight.
#[derive(Clone, Debug)]
pub(crate) struct ShellTable {
    /// By separation power (0, 1), then order 0–4, then wavenumber.
    values: [[Vec<f64>; 5]; 2],
}

impl ShellTable {
    /// Averages with enough points for the phase k·(hi − lo) that the shell spans: n points integrate a polynomial of
    /// degree 2n − 1, and cos(φx/2) on [−1, 1] to 1e-11 once n > φ/4 + 10. A few rules are made and shared.
    pub(crate) fn new(abscissa: &Abscissa, grid: &WavenumberGrid) -> ShellTable {
        let length = grid.wavenumbers.len();
        let mut values: [[Vec<f64>; 5]; 2] = Default::default();
        for table in values.iter_mut().flatten() {
            table.reserve_exact(length);
        }
        let width = abscissa.edges.map_or(0.0, |(low, high)| high - low);
        let mut points = Vec::new();
        for (&k, &weight) in grid.wavenumbers.iter().zip(&grid.weights) {
            // Multiples of eight points, so that a rule serves many wavenumbers.
            let needed = (((0.3 * k * width) as usize + 10) / 8 + 1) * 8;
            if width == 0.0 && points.is_empty() || width > 0.0 && points.len() != needed {
                points = abscissa.average(needed);
            }
            let mut sums = [[0.0; 5]; 2];
            for &(s, share) in &points {
                for (order, bessel) in spherical_bessel_all(k * s).into_iter().enumerate() {
                    sums[0][order] += share * bessel;
                    sums[1][order] += share * s * bessel;
                }
            }
            for (tables, sums) in values.iter_mut().zip(&sums) {
                for (table, sum) in tables.iter_mut().zip(sums) {
                    table.push(weight * sum);
                }
            }
        }
        ShellTable { values }
    }

    /// Weighted averages of s^separation jₗ(ks) by wavenumber.
    pub(crate) fn get(&self, separation: usize, order: usize) -> &[f64] {
        &self.values[separation][order]
    }
}
