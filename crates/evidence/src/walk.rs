//! Clouds of points, and walks that spread them over a level.

use crate::error::EvidenceError;
use crate::level::{Height, Level};
use crate::problem::{Problem, Watch};
use nalgebra::DMatrix;
use oddwell_sampler::moves::{Fit, Independence, Mixture, Others, Random, weights};
use oddwell_sampler::{EvaluationFailure, PriorSet, Target};
use rand::{RngExt, SeedableRng};

/// Points and their heights.
#[derive(Debug, Clone, Default)]
pub(crate) struct Cloud {
    /// Coordinates, a point after the other.
    pub(crate) points: Vec<f64>,
    pub(crate) heights: Vec<Height>,
}

impl Cloud {
    /// The points at these places, in this order.
    pub(crate) fn select(&self, places: &[usize]) -> Self {
        let dimension = self.points.len() / self.heights.len().max(1);
        let mut selected = Self::default();
        for &place in places {
            selected.points.extend_from_slice(&self.points[place * dimension..(place + 1) * dimension]);
            selected.heights.push(self.heights[place]);
        }
        selected
    }
}

/// How long points walk before they count as draws of their level.
///
/// A sweep proposes one move for every point. Points have moved anew once when each has accepted, on average, one independent
/// proposal or 2·dimension other ones.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Sweeps {
    /// Until points have moved anew so often, and no longer correlate with where they started: neither coordinates, in the root
    /// of their mean squared correlation less its noise 1/n, nor the log likelihood, by more than 0.05 (for the latter, plus two
    /// of its standard errors 1/√n). In any case no more than twice as often, because points in separate modes stay correlated
    /// for ever.
    Anew(f64),
    /// So many, whatever they achieve. For tests, and to see what too few of them do.
    Exactly(usize),
}

const FORGOTTEN: f64 = 0.05;
const MOST_SWEEPS: usize = 2000;

/// Random numbers, moves and working memory of one run.
pub(crate) struct Walk<'a, T: Target> {
    target: &'a T,
    watch: &'a Watch,
    scratch: T::Scratch,
    pub(crate) random: Random,
    proposal: Vec<f64>,
    fit: Fit,
    /// Share of independent proposals.
    share: f64,
    /// Proposed and accepted independent proposals at the last level.
    independent: (u64, u64),
    pub(crate) evaluations: u64,
}

/// The random stream of one of several runs from the same seed, 2¹⁹² numbers apart from the next.
pub(crate) fn stream(seed: u64, run: usize) -> Random {
    let mut random = Random::seed_from_u64(seed);
    for _ in 0..run {
        random.long_jump();
    }
    random
}

impl<'a, T: Target> Walk<'a, T> {
    pub(crate) fn new(problem: &Problem<'a, T>, watch: &'a Watch, run: usize) -> Result<Self, EvidenceError> {
        let dimension = problem.target.dimension();
        if dimension == 0 {
            return Err(EvidenceError::Setting { setting: "dimension", rule: "above 0", value: "0".into() });
        }
        let priors = problem.priors;
        let location: Vec<f64> = (0..dimension).map(|at| priors.median(at)).collect();
        let variances = DMatrix::from_fn(dimension, dimension, |i, j| {
            if i == j { priors.spread(i) * priors.spread(i) } else { 0.0 }
        });
        let fit = Fit::new(location, variances).ok_or(EvidenceError::Setting {
            setting: "prior",
            rule: "of finite width in every dimension",
            value: "a width that is 0 or not finite".into(),
        })?;
        Ok(Self {
            target: problem.target,
            watch,
            scratch: problem.target.scratch(),
            random: stream(problem.seed, run),
            proposal: vec![0.0; dimension],
            fit,
            share: 0.5,
            independent: (0, 0),
            evaluations: 0,
        })
    }

    /// Log likelihood; −∞ where the model has no answer.
    pub(crate) fn log_likelihood(&mut self, point: &[f64]) -> Result<f64, EvidenceError> {
        self.evaluations += 1;
        match self.target.log_likelihood(point, &mut self.scratch) {
            Ok(value) if value == f64::INFINITY || value.is_nan() => Ok(f64::NEG_INFINITY),
            Ok(value) => Ok(value),
            Err(EvaluationFailure::Rejected { .. }) => Ok(f64::NEG_INFINITY),
            Err(EvaluationFailure::Fatal { reason }) => {
                Err(EvidenceError::Evaluation { reason, point: point.to_vec() })
            }
        }
    }

    /// Independent draws of the prior.
    pub(crate) fn draws(&mut self, priors: &PriorSet, count: usize) -> Result<Cloud, EvidenceError> {
        let mut cloud = Cloud::default();
        let mut point = vec![0.0; self.proposal.len()];
        for _ in 0..count {
            priors.sample(&mut self.random, &mut point);
            let log_likelihood = self.log_likelihood(&point)?;
            cloud.heights.push(Height {
                log_prior: self.target.log_prior(&point),
                log_likelihood,
                label: self.random.random(),
            });
            cloud.points.extend_from_slice(&point);
        }
        self.watch.count(count as u64)?;
        if cloud.heights.iter().all(|height| height.log_likelihood == f64::NEG_INFINITY) {
            return Err(EvidenceError::NoLikelihood { tried: count });
        }
        Ok(cloud)
    }

    /// Spreads the points over the level: moves that propose from `others`, which follow the same level and stand still.
    pub(crate) fn spread(
        &mut self,
        cloud: &mut Cloud,
        others: &[f64],
        level: Level,
        sweeps: Sweeps,
    ) -> Result<(), EvidenceError> {
        let dimension = self.proposal.len();
        let mixture = self.mixture(others)?;
        let independent = mixture.names().iter().position(|name| *name == Independence::NAME);
        let others = Others::new(others, dimension);
        let started = cloud.clone();
        let count = cloud.heights.len() as f64;
        let (mut anew, mut next_look) = (0.0, 4);
        for sweep in 1..=MOST_SWEEPS {
            let before = self.evaluations;
            for (point, height) in cloud.points.chunks_exact_mut(dimension).zip(&mut cloud.heights) {
                let (which, chosen) = mixture.pick(&mut self.random);
                let alone = Some(which) == independent;
                let factor = chosen.propose(point, others, &mut self.random, &mut self.proposal);
                let accepted = self.accepts(factor, height, level)?;
                self.independent.0 += u64::from(alone);
                if let Some(higher) = accepted {
                    point.copy_from_slice(&self.proposal);
                    *height = higher;
                    self.independent.1 += u64::from(alone);
                    anew += if alone { 1.0 } else { 0.5 / dimension as f64 } / count;
                }
            }
            self.watch.count(self.evaluations - before)?;
            match sweeps {
                Sweeps::Exactly(wanted) if sweep >= wanted => break,
                Sweeps::Anew(wanted) if anew >= 2.0 * wanted => break,
                Sweeps::Anew(wanted) if anew >= wanted && sweep >= next_look => {
                    if forgotten(&started, cloud, dimension) {
                        break;
                    }
                    next_look = sweep + sweep.div_ceil(4);
                }
                _ => {}
            }
        }
        Ok(())
    }

    /// The height of the proposal, if it is accepted.
    fn accepts(&mut self, factor: f64, from: &Height, level: Level) -> Result<Option<Height>, EvidenceError> {
        let log_prior = self.target.log_prior(&self.proposal);
        if !(log_prior > f64::NEG_INFINITY) || factor == f64::NEG_INFINITY {
            return Ok(None);
        }
        let threshold = (1.0 - self.random.random::<f64>()).ln() - factor;
        if level.is_bound() && log_prior - from.log_prior < threshold {
            return Ok(None);
        }
        let proposal = std::mem::take(&mut self.proposal);
        let log_likelihood = self.log_likelihood(&proposal);
        self.proposal = proposal;
        let height = Height { log_prior, log_likelihood: log_likelihood?, label: self.random.random() };
        let rise = level.log_density(&height) - level.log_density(from);
        Ok((rise >= threshold).then_some(height))
    }

    /// The sampler's moves, with independent proposals fitted to the points that stand still, and a share of them as their
    /// acceptance at the last level deserves.
    fn mixture(&mut self, others: &[f64]) -> Result<Mixture, EvidenceError> {
        if let Some(fit) = fitted(others, self.proposal.len()) {
            self.fit = fit;
        }
        let (proposed, accepted) = std::mem::take(&mut self.independent);
        if proposed > 0 {
            let rate = accepted as f64 / proposed as f64;
            self.share = if rate > 0.1 {
                0.8
            } else if rate > 0.03 {
                0.5
            } else {
                0.15
            };
        }
        let mut weights = weights(&[])?;
        let rest: f64 =
            weights.iter().filter(|(name, _)| name != Independence::NAME).map(|(_, weight)| weight).sum();
        for (name, weight) in &mut weights {
            if name == Independence::NAME {
                *weight = rest * self.share / (1.0 - self.share);
            }
        }
        Ok(Mixture::new(&self.fit, &weights)?)
    }
}

/// Mean and covariance of the points; `None` where they do not span the space.
fn fitted(points: &[f64], dimension: usize) -> Option<Fit> {
    let count = points.len() / dimension;
    if count < 2 * dimension + 2 {
        return None;
    }
    let matrix = DMatrix::from_row_slice(count, dimension, points);
    let mean = matrix.row_mean();
    let mut centred = matrix;
    for mut row in centred.row_iter_mut() {
        row -= &mean;
    }
    let covariance = centred.tr_mul(&centred) / count as f64;
    Fit::new(mean.iter().copied().collect(), covariance)
}

/// Whether where points are no longer tells where they started.
fn forgotten(started: &Cloud, now: &Cloud, dimension: usize) -> bool {
    let count = now.heights.len() as f64;
    let coordinate = |at: usize| {
        let column = |cloud: &Cloud| -> Vec<f64> {
            cloud.points.iter().skip(at).step_by(dimension).copied().collect()
        };
        pearson(&column(started), &column(now)).powi(2)
    };
    let heights = |cloud: &Cloud| -> Vec<f64> {
        cloud.heights.iter().map(|height| height.log_likelihood.max(-1e300)).collect()
    };
    let squares = (0..dimension).map(coordinate).sum::<f64>() / dimension as f64;
    squares - 1.0 / count < FORGOTTEN * FORGOTTEN
        && pearson(&heights(started), &heights(now)) < FORGOTTEN + 2.0 / count.sqrt()
}

fn pearson(x: &[f64], y: &[f64]) -> f64 {
    let count = x.len() as f64;
    let (mean_x, mean_y) = (x.iter().sum::<f64>() / count, y.iter().sum::<f64>() / count);
    let (mut xx, mut yy, mut xy) = (0.0, 0.0, 0.0);
    for (x, y) in x.iter().zip(y) {
        let (dx, dy) = (x - mean_x, y - mean_y);
        xx += dx * dx;
        yy += dy * dy;
        xy += dx * dy;
    }
    if xx > 0.0 && yy > 0.0 { xy / (xx * yy).sqrt() } else { 0.0 }
}
