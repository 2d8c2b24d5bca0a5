//! Where the walkers start: around the peak, inside the prior's support.

use crate::chain::BestPoint;
use crate::ensemble::{Ensemble, height, streams};
use crate::error::SamplerError;
use crate::moves::Random;
use crate::peak::Peak;
use crate::priors::PriorSet;
use crate::target::{EvaluationFailure, Target};
use nalgebra::DMatrix;
use rand_distr::{Distribution, StandardNormal};

/// Walkers start this much wider than the Laplace approximation, so that the ensemble falls inwards rather than having to
/// spread, which takes longer.
const WIDENED: f64 = 1.2;

/// Square root of the Laplace covariance: draws are point + root · normals.
pub(crate) fn laplace_root(covariance: &DMatrix<f64>) -> DMatrix<f64> {
    let eigen = covariance.clone().symmetric_eigen();
    let roots = eigen.eigenvalues.map(|eigenvalue| eigenvalue.max(0.0).sqrt());
    &eigen.eigenvectors * DMatrix::from_diagonal(&roots)
}

/// One ensemble at its start, with the evaluations that took counted.
///
/// A draw outside the support, or without a finite likelihood, is drawn again closer to the peak; after forty tries the
/// walker starts from a draw of the prior, after forty more at the peak itself.
pub(crate) fn start_ensemble<T: Target>(
    target: &T,
    priors: &PriorSet,
    peak: &Peak,
    (seed, index, walkers): (u64, usize, usize),
    moves: usize,
) -> Result<Ensemble, SamplerError> {
    let dimension = priors.dimension();
    let root = laplace_root(&peak.covariance);
    let (mut random, streams) = streams(seed, index, walkers);
    let mut scratch = target.scratch();
    let mut best = BestPoint {
        point: peak.point.clone(),
        log_prior: peak.log_prior,
        log_likelihood: peak.log_likelihood,
    };
    let mut points = vec![0.0; walkers * dimension];
    let (mut log_prior, mut log_likelihood) = (Vec::with_capacity(walkers), Vec::with_capacity(walkers));
    let mut evaluations = 0;
    for point in points.chunks_exact_mut(dimension) {
        let mut heights = None;
        for attempt in 0..80 {
            if attempt < 40 {
                around(peak, &root, WIDENED * 0.9f64.powi(attempt), &mut random, point);
                keep_inside(peak, priors, point);
            } else {
                priors.sample(&mut random, point);
            }
            let prior = target.log_prior(point);
            if !prior.is_finite() {
                continue;
            }
            evaluations += 1;
            match target.log_likelihood(point, &mut scratch) {
                Ok(likelihood) if likelihood.is_finite() => {
                    heights = Some((prior, likelihood));
                    break;
                }
                Err(EvaluationFailure::Fatal { reason }) => {
                    return Err(SamplerError::Evaluation { reason, point: point.to_vec(), partial: None });
                }
                _ => {}
            }
        }
        let (prior, likelihood) = heights.unwrap_or_else(|| {
            point.copy_from_slice(&peak.point);
            (peak.log_prior, peak.log_likelihood)
        });
        if prior + likelihood > height(&best) {
            best = BestPoint { point: point.to_vec(), log_prior: prior, log_likelihood: likelihood };
        }
        log_prior.push(prior);
        log_likelihood.push(likelihood);
    }
    let mut ensemble = Ensemble::new(points, log_prior, log_likelihood, streams, moves, best);
    ensemble.counts.evaluations = evaluations;
    Ok(ensemble)
}

fn around(peak: &Peak, root: &DMatrix<f64>, scale: f64, random: &mut Random, point: &mut [f64]) {
    point.copy_from_slice(&peak.point);
    for column in root.column_iter() {
        let normal: f64 = StandardNormal.sample(random);
        for (x, entry) in point.iter_mut().zip(column.iter()) {
            *x += scale * normal * entry;
        }
    }
}

/// Reflects coordinates that left the support at the edge they crossed, where that leads back inside.
fn keep_inside(peak: &Peak, priors: &PriorSet, point: &mut [f64]) {
    for (dimension, x) in point.iter_mut().enumerate() {
        let (low, high) = priors.support(dimension);
        if *x < low {
            *x = 2.0 * low - *x;
        } else if *x > high {
            *x = 2.0 * high - *x;
        }
        if *x < low || *x > high {
            *x = peak.point[dimension];
        }
    }
}
