//! Where the walkers start: around the peak, or the peaks, inside the prior's support.

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
    let places = places(peak);
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
    for (walker, point) in points.chunks_exact_mut(dimension).enumerate() {
        let place = chosen(&places, index * walkers + walker);
        let mut heights = None;
        for attempt in 0..80 {
            if attempt < 40 {
                around(place, WIDENED * 0.9f64.powi(attempt), &mut random, point);
                keep_inside(&place.point, priors, point);
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

/// A place to start around.
struct StartingPlace {
    point: Vec<f64>,
    root: DMatrix<f64>,
    /// Share of the walkers, those of the places before it included.
    up_to: f64,
}

/// The peaks, each with a share of the walkers: at least a fifth of an equal one, else as its Laplace mass is.
fn places(peak: &Peak) -> Vec<StartingPlace> {
    let highest = (&peak.point, peak.log_posterior, &peak.covariance);
    let others = peak.others.iter().map(|other| (&other.point, other.log_posterior, &other.covariance));
    let all: Vec<_> = std::iter::once(highest).chain(others).collect();
    let log_mass = |log_posterior: f64, covariance: &DMatrix<f64>| {
        let determinant = covariance.determinant();
        log_posterior + if determinant > 0.0 { 0.5 * determinant.ln() } else { 0.0 }
    };
    let masses: Vec<f64> = all.iter().map(|(_, height, covariance)| log_mass(*height, covariance)).collect();
    let largest = masses.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let least = 0.2 / all.len() as f64;
    let total: f64 = masses.iter().map(|mass| (mass - largest).exp()).sum();
    let shares: Vec<f64> = masses.iter().map(|mass| ((mass - largest).exp() / total).max(least)).collect();
    let total: f64 = shares.iter().sum();
    let mut up_to = 0.0;
    let place = |((point, _, covariance), share): ((&Vec<f64>, f64, &DMatrix<f64>), f64)| {
        up_to += share / total;
        StartingPlace { point: point.clone(), root: laplace_root(covariance), up_to }
    };
    all.into_iter().zip(shares).map(place).collect()
}

/// The place of a walker: walkers fill the shares evenly (by the golden ratio), so that every ensemble has its part of each.
fn chosen(places: &[StartingPlace], walker: usize) -> &StartingPlace {
    const GOLDEN: f64 = 0.618_033_988_749_895;
    let position = (0.5 + GOLDEN * walker as f64).fract();
    places.iter().find(|place| position < place.up_to).unwrap_or(&places[places.len() - 1])
}

fn around(place: &StartingPlace, scale: f64, random: &mut Random, point: &mut [f64]) {
    point.copy_from_slice(&place.point);
    for column in place.root.column_iter() {
        let normal: f64 = StandardNormal.sample(random);
        for (x, entry) in point.iter_mut().zip(column.iter()) {
            *x += scale * normal * entry;
        }
    }
}

/// Reflects coordinates that left the support at the edge they crossed, where that leads back inside.
fn keep_inside(peak: &[f64], priors: &PriorSet, point: &mut [f64]) {
    for (dimension, x) in point.iter_mut().enumerate() {
        let (low, high) = priors.support(dimension);
        if *x < low {
            *x = 2.0 * low - *x;
        } else if *x > high {
            *x = 2.0 * high - *x;
        }
        if *x < low || *x > high {
            *x = peak[dimension];
        }
    }
}
