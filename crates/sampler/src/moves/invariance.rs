//! Every move alone, and the mixture, leave a density as it is.
//!
//! Walkers that start as independent draws of the target stay just that, whatever the number of steps; so the test is exact:
//! after a few steps every coordinate must still follow its distribution function. An error in a Hastings factor shifts it.

use super::{Fit, Mixture, move_families, weights};
use crate::chain::BestPoint;
use crate::ensemble::{Ensemble, Lane, streams};
use crate::priors::{Gamma, Normal, Prior};
use crate::target::{EvaluationFailure, Target};
use nalgebra::DMatrix;

/// x from a gamma density (shape 3), y from a normal about x²/4 with a fifth of x as standard deviation: skew, curved,
/// bounded, of changing width.
struct Curved {
    gamma: Gamma,
    normal: Normal,
    dimension: usize,
}

impl Curved {
    fn new(dimension: usize) -> Self {
        Self { gamma: Gamma::new(3.0, 1.0).unwrap(), normal: Normal::new(0.0, 1.0).unwrap(), dimension }
    }

    fn standardised(x: f64, y: f64) -> f64 {
        (y - 0.25 * x * x) / (0.2 * x)
    }
}

impl Target for Curved {
    type Scratch = ();
    fn dimension(&self) -> usize {
        self.dimension
    }
    fn scratch(&self) {}
    fn log_prior(&self, point: &[f64]) -> f64 {
        self.gamma.log_density(point[0])
    }
    fn log_likelihood(&self, point: &[f64], _: &mut ()) -> Result<f64, EvaluationFailure> {
        if self.dimension == 1 {
            return Ok(0.0);
        }
        Ok(self.normal.log_density(Self::standardised(point[0], point[1])) - (0.2 * point[0]).ln())
    }
}

/// √n·D of Kolmogorov and Smirnov for numbers that should be uniform.
fn kolmogorov(mut heights: Vec<f64>) -> f64 {
    let count = heights.len() as f64;
    heights.sort_unstable_by(f64::total_cmp);
    let gap = |(rank, height): (usize, &f64)| {
        (height - rank as f64 / count).abs().max((height - (rank + 1) as f64 / count).abs())
    };
    heights.iter().enumerate().map(gap).fold(0.0, f64::max) * count.sqrt()
}

/// The largest √n·D over the coordinates, and the smallest acceptance rate of the moves.
fn departure(dimension: usize, weights: &[(String, f64)]) -> (f64, f64) {
    const REPLICAS: u64 = 4000;
    const WALKERS: usize = 8;
    const STEPS: usize = 5;
    let target = Curved::new(dimension);
    // Deliberately off in place, width and direction.
    let fit = Fit::new(
        vec![2.5; dimension],
        DMatrix::from_fn(dimension, dimension, |i, j| 4.0 * 0.5f64.powi((i != j).into())),
    )
    .unwrap();
    let mixture = Mixture::new(&fit, weights).unwrap();
    let moves = mixture.names().len();
    let mut heights = vec![vec![]; dimension];
    let mut counts = vec![(0, 0); moves];
    for replica in 0..REPLICAS {
        let (mut start, streams) = streams(100 + replica, 0, WALKERS);
        let (mut points, mut log_prior, mut log_likelihood) = (vec![], vec![], vec![]);
        for _ in 0..WALKERS {
            let x = target.gamma.sample(&mut start);
            let mut point = vec![x, 0.25 * x * x + 0.2 * x * target.normal.sample(&mut start)];
            point.truncate(dimension);
            log_prior.push(target.log_prior(&point));
            log_likelihood.push(target.log_likelihood(&point, &mut ()).unwrap());
            points.extend(point);
        }
        let best =
            BestPoint { point: vec![0.0; dimension], log_prior: f64::NEG_INFINITY, log_likelihood: 0.0 };
        let mut ensemble = Ensemble::new(points, log_prior, log_likelihood, streams, moves, best);
        let mut lanes = [Lane::new((), dimension, moves)];
        for _ in 0..STEPS {
            ensemble.step(&target, &mixture, &mut lanes);
        }
        assert!(ensemble.collect(&mut lanes).is_none());
        for (sum, part) in counts.iter_mut().zip(&ensemble.counts.moves) {
            sum.0 += part.0;
            sum.1 += part.1;
        }
        for point in ensemble.points.chunks_exact(dimension) {
            heights[0].push(target.gamma.cdf(point[0]));
            if dimension > 1 {
                heights[1].push(target.normal.cdf(Curved::standardised(point[0], point[1])));
            }
        }
    }
    let acceptance =
        counts.iter().map(|(proposed, accepted)| *accepted as f64 / *proposed as f64).fold(1.0, f64::min);
    (heights.into_iter().map(kolmogorov).fold(0.0, f64::max), acceptance)
}

/// 32,000 draws a coordinate. √n·D exceeds 2.0 with probability 2e^(−8) = 7e-4; about a dozen numbers are looked at, for
/// one fixed seed. A Hastings factor with one power too many or too few gives √n·D above 5.
#[test]
fn every_move_leaves_the_target_invariant() {
    for dimension in [1, 2] {
        for family in move_families() {
            let (departure, acceptance) = departure(dimension, &[(family.name.to_owned(), 1.0)]);
            assert!(departure < 2.0, "{} in {dimension} dimensions: {departure}", family.name);
            assert!(acceptance > 0.1, "{} in {dimension} dimensions hardly moves: {acceptance}", family.name);
        }
        let (departure, _) = departure(dimension, &weights(&[]).unwrap());
        assert!(departure < 2.0, "mixture in {dimension} dimensions: {departure}");
    }
}
