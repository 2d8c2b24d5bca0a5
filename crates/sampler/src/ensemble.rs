//! One ensemble of walkers: its state, and one step of it.

use crate::chain::{BestPoint, RejectedEvaluations};
use crate::moves::{Mixture, Others, Random};
use crate::target::{EvaluationFailure, Target};
use rand::{RngExt, SeedableRng};
use rayon::prelude::*;
use serde::{Deserialize, Serialize};

/// Everything that determines how an ensemble goes on. Walkers 0 … W/2 − 1 are one half, the rest the other.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub(crate) struct Ensemble {
    pub(crate) dimension: usize,
    /// Coordinates, `dimension` a walker.
    pub(crate) points: Vec<f64>,
    pub(crate) log_prior: Vec<f64>,
    pub(crate) log_likelihood: Vec<f64>,
    /// One stream a walker.
    streams: Vec<Random>,
    pub(crate) counts: Counts,
    pub(crate) best: BestPoint,
}

/// What an ensemble has cost and how its moves fared.
#[derive(Debug, Clone, Default, Serialize, Deserialize)]
pub(crate) struct Counts {
    pub(crate) evaluations: u64,
    /// (proposed, accepted) of each move of the mixture.
    pub(crate) moves: Vec<(u64, u64)>,
    pub(crate) rejected: RejectedEvaluations,
}

/// An evaluation that failed for good, and where.
#[derive(Debug, Clone)]
pub(crate) struct Fatal {
    pub(crate) reason: String,
    pub(crate) point: Vec<f64>,
}

/// Working memory of one lane: a share of a half's walkers that one thread advances.
pub(crate) struct Lane<S> {
    scratch: S,
    proposal: Vec<f64>,
    counts: Counts,
    best: BestPoint,
    fatal: Option<Fatal>,
}

impl<S> Lane<S> {
    /// A lane for a mixture of `moves` moves.
    pub(crate) fn new(scratch: S, dimension: usize, moves: usize) -> Self {
        Self {
            scratch,
            proposal: vec![0.0; dimension],
            counts: Counts { moves: vec![(0, 0); moves], ..Counts::default() },
            best: BestPoint {
                point: vec![0.0; dimension],
                log_prior: f64::NEG_INFINITY,
                log_likelihood: f64::NEG_INFINITY,
            },
            fatal: None,
        }
    }
}

/// Streams of the walkers of one ensemble, and one more for its start: 2¹²⁸ numbers apart from each other, 2¹⁹² from
/// those of the next ensemble, all from one seed.
pub(crate) fn streams(seed: u64, ensemble: usize, walkers: usize) -> (Random, Vec<Random>) {
    let mut stream = Random::seed_from_u64(seed);
    for _ in 0..ensemble {
        stream.long_jump();
    }
    let start = stream.clone();
    let walkers = (0..walkers)
        .map(|_| {
            stream.jump();
            stream.clone()
        })
        .collect();
    (start, walkers)
}

/// Part of one half: the walkers that a lane advances.
struct Share<'a> {
    points: &'a mut [f64],
    log_prior: &'a mut [f64],
    log_likelihood: &'a mut [f64],
    streams: &'a mut [Random],
}

impl Ensemble {
    /// An ensemble at its start.
    pub(crate) fn new(
        points: Vec<f64>,
        log_prior: Vec<f64>,
        log_likelihood: Vec<f64>,
        streams: Vec<Random>,
        moves: usize,
        best: BestPoint,
    ) -> Self {
        let dimension = points.len() / log_prior.len();
        let counts = Counts { moves: vec![(0, 0); moves], ..Counts::default() };
        Self { dimension, points, log_prior, log_likelihood, streams, counts, best }
    }

    /// Number of walkers.
    pub(crate) fn walkers(&self) -> usize {
        self.log_prior.len()
    }

    /// Moves every walker once: first the one half against the other, then the reverse. One lane works without rayon and
    /// without allocating; more lanes share the walkers of a half between threads. The result does not depend on them.
    pub(crate) fn step<T: Target>(&mut self, target: &T, mixture: &Mixture, lanes: &mut [Lane<T::Scratch>]) {
        let half = self.walkers() / 2;
        let dimension = self.dimension;
        for moving in 0..2 {
            let (low, high) = self.points.split_at_mut(half * dimension);
            let (points, others) = if moving == 0 { (low, high) } else { (high, low) };
            let others = Others::new(others, dimension);
            let range = moving * half..(moving + 1) * half;
            let log_prior = &mut self.log_prior[range.clone()];
            let log_likelihood = &mut self.log_likelihood[range.clone()];
            let streams = &mut self.streams[range];
            if let [lane] = lanes {
                let mut share = Share { points, log_prior, log_likelihood, streams };
                share.advance(target, mixture, others, lane);
            } else {
                let size = half.div_ceil(lanes.len());
                points
                    .par_chunks_mut(size * dimension)
                    .zip(log_prior.par_chunks_mut(size))
                    .zip(log_likelihood.par_chunks_mut(size))
                    .zip(streams.par_chunks_mut(size))
                    .zip(lanes.par_iter_mut())
                    .for_each(|((((points, log_prior), log_likelihood), streams), lane)| {
                        let mut share = Share { points, log_prior, log_likelihood, streams };
                        share.advance(target, mixture, others, lane);
                    });
            }
        }
    }

    /// Takes over what the lanes counted, and a fatal failure if one had it.
    pub(crate) fn collect<S>(&mut self, lanes: &mut [Lane<S>]) -> Option<Fatal> {
        let mut fatal = None;
        for lane in lanes {
            self.counts.evaluations += std::mem::take(&mut lane.counts.evaluations);
            for (sum, part) in self.counts.moves.iter_mut().zip(&mut lane.counts.moves) {
                sum.0 += part.0;
                sum.1 += part.1;
                *part = (0, 0);
            }
            self.counts.rejected.merge(&std::mem::take(&mut lane.counts.rejected));
            if height(&lane.best) > height(&self.best) {
                self.best.clone_from(&lane.best);
            }
            fatal = fatal.or_else(|| lane.fatal.take());
        }
        fatal
    }
}

impl Share<'_> {
    fn advance<T: Target>(
        &mut self,
        target: &T,
        mixture: &Mixture,
        others: Others<'_>,
        lane: &mut Lane<T::Scratch>,
    ) {
        let dimension = lane.proposal.len();
        for walker in 0..self.log_prior.len() {
            if lane.fatal.is_some() {
                return;
            }
            let current = &mut self.points[walker * dimension..(walker + 1) * dimension];
            let random = &mut self.streams[walker];
            let (kind, chosen) = mixture.pick(random);
            let factor = chosen.propose(current, others, random, &mut lane.proposal);
            // Drawn whatever happens next, so that a walker's stream does not depend on how a point was refused.
            let uniform: f64 = random.random();
            lane.counts.moves[kind].0 += 1;
            if factor == f64::NEG_INFINITY {
                continue;
            }
            let log_prior = target.log_prior(&lane.proposal);
            if !log_prior.is_finite() {
                continue;
            }
            let Some(log_likelihood) = lane.evaluate(target) else {
                continue;
            };
            let gain = log_prior + log_likelihood - (self.log_prior[walker] + self.log_likelihood[walker]);
            if uniform < (factor + gain).exp() {
                current.copy_from_slice(&lane.proposal);
                self.log_prior[walker] = log_prior;
                self.log_likelihood[walker] = log_likelihood;
                lane.counts.moves[kind].1 += 1;
                if log_prior + log_likelihood > height(&lane.best) {
                    lane.best.point.copy_from_slice(&lane.proposal);
                    lane.best.log_prior = log_prior;
                    lane.best.log_likelihood = log_likelihood;
                }
            }
        }
    }
}

impl<S> Lane<S> {
    /// The likelihood of the proposal, counted; `None` where there is none.
    fn evaluate<T: Target<Scratch = S>>(&mut self, target: &T) -> Option<f64> {
        self.counts.evaluations += 1;
        match target.log_likelihood(&self.proposal, &mut self.scratch) {
            Ok(log_likelihood) if log_likelihood < f64::INFINITY => Some(log_likelihood),
            Ok(value) => {
                self.counts.rejected.add(&format!("the log likelihood is {value}"));
                None
            }
            Err(EvaluationFailure::Rejected { reason }) => {
                self.counts.rejected.add(&reason);
                None
            }
            Err(EvaluationFailure::Fatal { reason }) => {
                self.fatal = Some(Fatal { reason, point: self.proposal.clone() });
                None
            }
        }
    }
}

/// Log posterior of a best point.
pub(crate) fn height(best: &BestPoint) -> f64 {
    best.log_prior + best.log_likelihood
}
