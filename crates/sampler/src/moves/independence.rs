//! The independence move: proposals from a fixed Student t fitted beforehand.

use super::{Move, Others, Random};
use crate::diagnostics::product_sum;
use nalgebra::{Cholesky, DMatrix, DVector};
use rand::RngExt;
use rand_distr::{Distribution, StandardNormal};
use serde::{Deserialize, Serialize};

/// A location and a scale matrix, ready to draw from and to measure distances with.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Fit {
    location: Vec<f64>,
    /// Lower Cholesky factor, row after row, triangle packed.
    lower: Vec<f64>,
    /// Its inverse, packed the same way.
    inverse: Vec<f64>,
    half_freedom: u32,
}

/// Half the degrees of freedom of a fit to nothing known: tails that are safe for normal ones.
const HALF_FREEDOM: u32 = 6;

/// Bounds of half the degrees of freedom of a fit to draws.
const HALF_FREEDOM_RANGE: (f64, f64) = (2.0, 15.0);

impl Fit {
    /// From a location and a covariance; `None` where the covariance is not positive definite or not finite.
    pub fn new(location: Vec<f64>, covariance: DMatrix<f64>) -> Option<Self> {
        let dimension = location.len();
        let finite = covariance.iter().chain(&location).all(|entry| entry.is_finite());
        if !finite || covariance.nrows() != dimension {
            return None;
        }
        // Cholesky of the correlations: scales that differ by many orders of magnitude do not lose digits.
        let widths = covariance.diagonal().map(f64::sqrt);
        if !widths.iter().all(|width| *width > 0.0) {
            return None;
        }
        let correlation =
            DMatrix::from_fn(dimension, dimension, |i, j| covariance[(i, j)] / (widths[i] * widths[j]));
        let lower = DMatrix::from_diagonal(&widths) * Cholesky::new(correlation)?.l();
        let inverse = lower.solve_lower_triangular(&DMatrix::identity(dimension, dimension))?;
        let pack = |matrix: &DMatrix<f64>| -> Vec<f64> {
            (0..dimension)
                .flat_map(|row| (0..=row).map(move |column| (row, column)))
                .map(|at| matrix[at])
                .collect()
        };
        Some(Self { location, lower: pack(&lower), inverse: pack(&inverse), half_freedom: HALF_FREEDOM })
    }

    /// From draws, rows of `dimension` coordinates: their mean and covariance, and degrees of freedom from Mardia's (1970)
    /// kurtosis κ = mean of squared Mahalanobis distances squared over n(n + 2), which is (ν − 2)/(ν − 4) for a Student t;
    /// ν even, between 4 and 30. `None` where the covariance is not positive definite.
    ///
    /// The covariance is inflated by 1 + √(n/N), N = `effective` samples among the draws. The narrowest directions of a
    /// sample covariance are too narrow by 2√(n/N) (Marchenko & Pastur 1967), and in their tails walkers get stuck; half of
    /// that did best over 0, ½, 1 and 2 times √(n/N) on Gaussians, edges and a Student t (`benches/efficiency.rs`).
    pub(crate) fn to_draws<'a>(
        dimension: usize,
        rows: impl Iterator<Item = &'a [f64]> + Clone,
        effective: f64,
    ) -> Option<Self> {
        let (mean, covariance) = mean_and_covariance(dimension, rows.clone());
        let inflation = 1.0 + (dimension as f64 / effective).sqrt().min(1.0);
        let mut fit = Self::new(mean.as_slice().to_vec(), covariance * inflation)?;
        let (mut sum, mut count) = (0.0, 0.0);
        for row in rows {
            let distance = fit.distance_squared(row);
            sum += distance * distance;
            count += 1.0;
        }
        let expected = dimension as f64 * (dimension as f64 + 2.0) / (inflation * inflation);
        let excess = (sum / count / expected - 1.0).max(1e-6);
        fit.half_freedom = (2.0 + excess.recip()).clamp(HALF_FREEDOM_RANGE.0, HALF_FREEDOM_RANGE.1) as u32;
        Some(fit)
    }

    /// Half the degrees of freedom of the Student t.
    pub fn half_freedom(&self) -> u32 {
        self.half_freedom
    }

    /// Number of coordinates.
    pub fn dimension(&self) -> usize {
        self.location.len()
    }

    /// Standard deviations of the coordinates.
    pub fn widths(&self) -> Vec<f64> {
        let row = |row: usize| &self.lower[row * (row + 1) / 2..(row + 1) * (row + 2) / 2];
        (0..self.dimension())
            .map(|at| row(at).iter().map(|entry| entry * entry).sum::<f64>().sqrt())
            .collect()
    }

    /// Location.
    pub fn location(&self) -> &[f64] {
        &self.location
    }

    /// Covariance.
    pub fn covariance(&self) -> DMatrix<f64> {
        let dimension = self.dimension();
        let mut lower = DMatrix::zeros(dimension, dimension);
        let mut entries = self.lower.iter();
        for row in 0..dimension {
            for (column, entry) in (0..=row).zip(entries.by_ref()) {
                lower[(row, column)] = *entry;
            }
        }
        &lower * lower.transpose()
    }

    /// (x − location)ᵀ covariance⁻¹ (x − location); allocates nothing.
    fn distance_squared(&self, point: &[f64]) -> f64 {
        let (mut sum, mut from) = (0.0, 0);
        for row in 0..point.len() {
            let weights = &self.inverse[from..=from + row];
            let whitened = shifted_product(weights, &point[..=row], &self.location[..=row]);
            sum += whitened * whitened;
            from += row + 1;
        }
        sum
    }

    /// Log density of the Student t at a point, without its constant.
    pub(crate) fn log_proposal(&self, point: &[f64]) -> f64 {
        let freedom = 2.0 * f64::from(self.half_freedom);
        -0.5 * (freedom + point.len() as f64) * (self.distance_squared(point) / freedom).ln_1p()
    }

    /// Replaces independent normals by location + `scale` · L · normals, in place.
    fn colour(&self, scale: f64, normals: &mut [f64]) {
        // From the last row up: row i needs the normals up to i, and is the last one to need number i.
        let mut to = self.lower.len();
        for row in (0..normals.len()).rev() {
            let weights = &self.lower[to - row - 1..to];
            let sum = product_sum(weights, &normals[..=row]);
            normals[row] = self.location[row] + scale * sum;
            to -= row + 1;
        }
    }
}

/// Σ wᵢ (xᵢ − mᵢ) in four interleaved sums, which the processor can add side by side.
fn shifted_product(weights: &[f64], point: &[f64], location: &[f64]) -> f64 {
    let mut sums = [0.0; 4];
    let (w, x, m) = (weights.chunks_exact(4), point.chunks_exact(4), location.chunks_exact(4));
    let rest = w.remainder().iter().zip(x.remainder()).zip(m.remainder());
    let rest: f64 = rest.map(|((w, x), m)| w * (x - m)).sum();
    for ((w, x), m) in w.zip(x).zip(m) {
        for lane in 0..4 {
            sums[lane] += w[lane] * (x[lane] - m[lane]);
        }
    }
    sums.iter().sum::<f64>() + rest
}

/// Mean and covariance of rows of `dimension` coordinates.
fn mean_and_covariance<'a>(
    dimension: usize,
    rows: impl Iterator<Item = &'a [f64]> + Clone,
) -> (DVector<f64>, DMatrix<f64>) {
    let (mut mean, mut count) = (DVector::zeros(dimension), 0.0);
    for row in rows.clone() {
        count += 1.0;
        for (sum, x) in mean.iter_mut().zip(row) {
            *sum += x;
        }
    }
    mean /= count;
    let mut covariance = DMatrix::zeros(dimension, dimension);
    for row in rows {
        for i in 0..dimension {
            let shift = row[i] - mean[i];
            for j in 0..=i {
                covariance[(i, j)] += shift * (row[j] - mean[j]);
            }
        }
    }
    covariance.fill_upper_triangle_with_lower_triangle();
    covariance /= count;
    (mean, covariance)
}

/// Proposes x′ from a multivariate Student t about a fixed fit, wherever the walker is; factor q(x)/q(x′) (Hastings 1970,
/// Biometrika 57, 97, §2.5; Tierney 1994, Ann. Stat. 22, 1701, §2.3.3).
///
/// The tails of the t keep the ratio target/proposal bounded for any target with normal tails; heavier ones, and shapes
/// that the fit misses, are what the other moves of a mixture are for.
#[derive(Debug, Clone)]
pub struct Independence {
    fit: Fit,
    freedom: f64,
    power: f64,
}

impl Independence {
    /// Registry name.
    pub const NAME: &'static str = "independence";

    /// The move with proposals about `fit`.
    pub fn new(fit: Fit) -> Self {
        let freedom = 2.0 * f64::from(fit.half_freedom);
        let power = 0.5 * (freedom + fit.dimension() as f64);
        Self { fit, freedom, power }
    }

    /// Log density of the proposals, without its constant, at a squared distance.
    fn log_density(&self, distance_squared: f64) -> f64 {
        -self.power * (distance_squared / self.freedom).ln_1p()
    }
}

impl Move for Independence {
    fn name(&self) -> &'static str {
        Self::NAME
    }

    fn propose(
        &self,
        current: &[f64],
        _others: Others<'_>,
        random: &mut Random,
        proposal: &mut [f64],
    ) -> f64 {
        let mut squares = 0.0;
        for entry in proposal.iter_mut() {
            let normal: f64 = StandardNormal.sample(random);
            *entry = normal;
            squares += normal * normal;
        }
        // χ² of 2k degrees of freedom is −2 ln of a product of k uniform numbers in (0, 1]; k ≤ 15 keeps it normal.
        let product: f64 = (0..self.fit.half_freedom).map(|_| 1.0 - random.random::<f64>()).product();
        let scale_squared = self.freedom / (-2.0 * product.ln());
        self.fit.colour(scale_squared.sqrt(), proposal);
        self.fit.log_proposal(current) - self.log_density(scale_squared * squares)
    }
}
