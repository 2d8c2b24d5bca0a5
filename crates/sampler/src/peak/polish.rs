//! Newton steps inside the support, and the Laplace covariance where they end.

use super::coordinates::Coordinates;
use super::evaluator::Evaluator;
use super::hessian::{curvature, fit_steps, gradient};
use crate::priors::PriorSet;
use crate::target::Target;
use nalgebra::{DMatrix, DVector};

/// Gain of log posterior below which a Newton step is not worth making.
const GAIN: f64 = 1e-6;

/// Smallest curvature, in units of the prior's spread, that counts as measured: a standard deviation of two spreads.
const LEAST_CURVATURE: f64 = 0.25;

/// Where the Newton steps ended.
#[derive(Debug, Clone)]
pub(super) struct Polished {
    pub(super) point: Vec<f64>,
    pub(super) value: f64,
    /// Dimensions that sit on an end of their support.
    pub(super) pinned: Vec<usize>,
    pub(super) converged: bool,
    steps: Vec<f64>,
}

/// The Laplace covariance in physical units.
#[derive(Debug, Clone)]
pub(super) struct Laplace {
    pub(super) covariance: DMatrix<f64>,
    pub(super) bounded_by_prior: bool,
}

/// The log posterior along the free dimensions, in units of the prior's spread, about a point.
struct Slice<'e, 'a, T: Target> {
    evaluator: &'e mut Evaluator<'a, T>,
    spreads: Vec<f64>,
    free: Vec<usize>,
    origin: Vec<f64>,
    point: Vec<f64>,
}

impl<T: Target> Slice<'_, '_, T> {
    fn value(&mut self, shift: &[f64]) -> f64 {
        for ((dimension, spread), shift) in self.free.iter().zip(&self.spreads).zip(shift) {
            self.point[*dimension] = self.origin[*dimension] + spread * shift;
        }
        self.evaluator.log_posterior(&self.point)
    }
}

fn slice<'e, 'a, T: Target>(
    evaluator: &'e mut Evaluator<'a, T>,
    coordinates: &Coordinates,
    point: &[f64],
    pinned: &[usize],
) -> Slice<'e, 'a, T> {
    let free: Vec<usize> = (0..point.len()).filter(|dimension| !pinned.contains(dimension)).collect();
    let spreads = free.iter().map(|dimension| coordinates.spread(*dimension)).collect();
    Slice { evaluator, spreads, free, origin: point.to_vec(), point: point.to_vec() }
}

/// Climbs from `point` by Newton steps with the absolute eigenvalues of the Hessian, halved until the log posterior
/// rises, and clipped to the support. A curvature is used again as long as steps shrink tenfold each time.
pub(super) fn polish<T: Target>(
    evaluator: &mut Evaluator<'_, T>,
    priors: &PriorSet,
    coordinates: &Coordinates,
    mut point: Vec<f64>,
) -> Polished {
    const ITERATIONS: usize = 200;
    let mut value = evaluator.log_posterior(&point);
    let mut all_steps = vec![1e-2; point.len()];
    let mut converged = false;
    let mut known: Option<(Vec<usize>, DMatrix<f64>, f64)> = None;
    for _ in 0..ITERATIONS {
        let pinned = pinned(evaluator, priors, coordinates, &point, value);
        if pinned.len() == point.len() {
            converged = true;
            break;
        }
        let mut slice = slice(evaluator, coordinates, &point, &pinned);
        let free = slice.free.clone();
        let origin = vec![0.0; free.len()];
        let mut steps: Vec<f64> = free.iter().map(|dimension| all_steps[*dimension]).collect();
        let reusable = known.take().filter(|(for_free, _, _)| *for_free == free);
        let (slope, bend, fresh, last_gain) = match reusable {
            Some((_, bend, last_gain)) => {
                let slope = gradient(&mut |shift| slice.value(shift), &origin, &steps);
                (slope, bend, false, last_gain)
            }
            None => {
                fit_steps(&mut |shift| slice.value(shift), &origin, value, &mut steps);
                for (dimension, step) in free.iter().zip(&steps) {
                    all_steps[*dimension] = *step;
                }
                let slope = gradient(&mut |shift| slice.value(shift), &origin, &steps);
                let bend = curvature(&mut |shift| slice.value(shift), &origin, value, &steps);
                (slope, bend, true, f64::INFINITY)
            }
        };
        if slope.iter().chain(bend.iter()).any(|entry| !entry.is_finite()) {
            break;
        }
        let (step, gain) = newton_step(&bend, &slope);
        if gain < GAIN && fresh {
            converged = true;
            break;
        }
        if !fresh && gain > 0.1 * last_gain {
            continue;
        }
        let taken = backtrack(&mut slice, priors, &step, value);
        match taken {
            Some((next, next_value)) => {
                point = next;
                value = next_value;
                if gain >= GAIN {
                    known = Some((free, bend, gain));
                }
            }
            None if fresh => break,
            None => {}
        }
    }
    let pinned = pinned(evaluator, priors, coordinates, &point, value);
    Polished { point, value, pinned, converged, steps: all_steps }
}

/// |H|⁻¹ g and the gain ½ gᵀ|H|⁻¹ g that it promises.
fn newton_step(bend: &DMatrix<f64>, slope: &DVector<f64>) -> (DVector<f64>, f64) {
    let eigen = bend.clone().symmetric_eigen();
    let mut along = eigen.eigenvectors.tr_mul(slope);
    let mut gain = 0.0;
    for (component, eigenvalue) in along.iter_mut().zip(eigen.eigenvalues.iter()) {
        let step = *component / eigenvalue.abs().max(1e-2);
        gain += 0.5 * step * *component;
        *component = step;
    }
    (&eigen.eigenvectors * along, gain)
}

/// The first of the step, its half, its quarter … that raises the log posterior, clipped to the support.
fn backtrack<T: Target>(
    slice: &mut Slice<'_, '_, T>,
    priors: &PriorSet,
    step: &DVector<f64>,
    value: f64,
) -> Option<(Vec<f64>, f64)> {
    let mut factor = 1.0;
    for _ in 0..30 {
        let mut next = slice.origin.clone();
        for ((dimension, spread), shift) in slice.free.iter().zip(&slice.spreads).zip(step.iter()) {
            let (low, high) = priors.support(*dimension);
            next[*dimension] = (next[*dimension] + spread * factor * shift).clamp(low, high);
        }
        let reached = slice.evaluator.log_posterior(&next);
        if reached > value {
            return Some((next, reached));
        }
        factor *= 0.5;
    }
    None
}

/// Dimensions that are on an end of their support (or within 1e-9 spreads of it) and would fall by moving inwards.
fn pinned<T: Target>(
    evaluator: &mut Evaluator<'_, T>,
    priors: &PriorSet,
    coordinates: &Coordinates,
    point: &[f64],
    value: f64,
) -> Vec<usize> {
    const TOUCHING: f64 = 1e-9;
    const INWARDS: f64 = 1e-5;
    let mut moved = point.to_vec();
    (0..point.len())
        .filter(|&dimension| {
            let (low, high) = priors.support(dimension);
            let spread = coordinates.spread(dimension);
            let inwards = if point[dimension] - low <= TOUCHING * spread {
                INWARDS * spread
            } else if high - point[dimension] <= TOUCHING * spread {
                -INWARDS * spread
            } else {
                return false;
            };
            moved[dimension] = point[dimension] + inwards;
            let falls = evaluator.log_posterior(&moved) <= value;
            moved[dimension] = point[dimension];
            falls
        })
        .collect()
}

impl Polished {
    /// Inverse of the curvature along the free dimensions; one-sided widths along the pinned ones.
    pub(super) fn covariance<T: Target>(
        &self,
        evaluator: &mut Evaluator<'_, T>,
        priors: &PriorSet,
        coordinates: &Coordinates,
    ) -> Laplace {
        let dimension = self.point.len();
        let mut covariance = DMatrix::zeros(dimension, dimension);
        for &pinned in &self.pinned {
            let width = width_inwards(evaluator, priors, coordinates, self, pinned);
            covariance[(pinned, pinned)] = width * width;
        }
        let mut slice = slice(evaluator, coordinates, &self.point, &self.pinned);
        let (free, spreads) = (slice.free.clone(), slice.spreads.clone());
        if free.is_empty() {
            return Laplace { covariance, bounded_by_prior: false };
        }
        let origin = vec![0.0; free.len()];
        let mut steps: Vec<f64> = free.iter().map(|dimension| self.steps[*dimension]).collect();
        fit_steps(&mut |shift| slice.value(shift), &origin, self.value, &mut steps);
        let mut bend = curvature(&mut |shift| slice.value(shift), &origin, self.value, &steps);
        let mut bounded_by_prior = false;
        for entry in bend.iter_mut().filter(|entry| !entry.is_finite()) {
            bounded_by_prior = true;
            *entry = 0.0;
        }
        let mut eigen = bend.symmetric_eigen();
        for eigenvalue in eigen.eigenvalues.iter_mut() {
            bounded_by_prior |= *eigenvalue < LEAST_CURVATURE;
            *eigenvalue = eigenvalue.max(LEAST_CURVATURE).recip();
        }
        let inverse =
            &eigen.eigenvectors * DMatrix::from_diagonal(&eigen.eigenvalues) * eigen.eigenvectors.transpose();
        for (row, &i) in free.iter().enumerate() {
            for (column, &j) in free.iter().enumerate() {
                covariance[(i, j)] = inverse[(row, column)] * spreads[row] * spreads[column];
            }
        }
        Laplace { covariance, bounded_by_prior }
    }
}

/// Distance from the edge at which the log posterior has fallen by ½, by bisection to a tenth; at most the spread.
fn width_inwards<T: Target>(
    evaluator: &mut Evaluator<'_, T>,
    priors: &PriorSet,
    coordinates: &Coordinates,
    polished: &Polished,
    dimension: usize,
) -> f64 {
    let spread = coordinates.spread(dimension);
    let (low, high) = priors.support(dimension);
    let sign = if polished.point[dimension] - low < high - polished.point[dimension] { 1.0 } else { -1.0 };
    let mut moved = polished.point.clone();
    let mut width = spread;
    let mut drop = |width: f64| {
        moved[dimension] = polished.point[dimension] + sign * width;
        polished.value - evaluator.log_posterior(&moved)
    };
    while drop(width) > 0.5 && width > 1e-12 * spread {
        width *= 0.5;
    }
    if width < spread {
        let (mut below, mut above) = (width, 2.0 * width);
        for _ in 0..4 {
            let middle = 0.5 * (below + above);
            if drop(middle) > 0.5 { above = middle } else { below = middle }
        }
        width = below;
    }
    width
}
