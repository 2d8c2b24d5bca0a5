//! The state of a run: everything that determines how it goes on, advanced in rounds.

use crate::chain::{BestPoint, Chain, MoveAcceptance, Outcome, RejectedEvaluations, StopReason};
use crate::ensemble::{Ensemble, Fatal, Lane, height};
use crate::error::SamplerError;
use crate::history::History;
use crate::moves::{Fit, Mixture, weights};
use crate::peak::Peak;
use crate::priors::PriorSet;
use crate::settings::EnsembleSettings;
use crate::start::start_ensemble;
use crate::stopping::{Verdict, full_check};
use crate::target::Target;
use nalgebra::DMatrix;
use rayon::prelude::*;
use serde::{Deserialize, Serialize};

/// The first check of the stop rule comes after this many steps.
const FIRST_CHECK: u64 = 24;

/// Everything that determines how a run goes on: what [`crate::sample_with`] hands out to be kept, and goes on from.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub struct RunState {
    pub(crate) settings: EnsembleSettings,
    pub(crate) walkers: usize,
    pub(crate) peak: Peak,
    pub(crate) ensembles: Vec<Ensemble>,
    pub(crate) history: History,
    /// What the independence move proposes from: the Laplace approximation at first, then fits to the warm-up, frozen at
    /// its end.
    pub(crate) fit: Fit,
    /// Weights of the moves by name; that of the independence move follows its quality during warm-up.
    pub(crate) weights: Vec<(String, f64)>,
    pub(crate) steps: u64,
    pub(crate) next_check: u64,
    /// Steps dropped as warm-up, once that is known.
    pub(crate) warm_up: Option<u64>,
    /// Seconds since the run began, those between its parts left out.
    pub(crate) elapsed_seconds: f64,
}

impl RunState {
    /// The ensembles at their start, around the peak.
    pub(crate) fn start<T: Target>(
        target: &T,
        priors: &PriorSet,
        settings: &EnsembleSettings,
        peak: Peak,
    ) -> Result<Self, SamplerError> {
        let walkers = settings.walkers_for(priors.dimension());
        let weights = weights(&settings.move_weights)?;
        let moves = weights.len();
        let fit = laplace_fit(&peak);
        let ensembles = (0..settings.ensembles)
            .into_par_iter()
            .map(|index| start_ensemble(target, priors, &peak, (settings.seed, index, walkers), moves))
            .collect::<Result<Vec<_>, _>>()?;
        Ok(Self {
            settings: settings.clone(),
            walkers,
            history: History::new(
                settings.ensembles,
                walkers,
                (priors.dimension(), target.completed_dimension()),
                settings.draws_at_most(),
            ),
            peak,
            ensembles,
            fit,
            weights,
            steps: 0,
            next_check: FIRST_CHECK,
            warm_up: None,
            elapsed_seconds: 0.0,
        })
    }

    /// Whether this is a state of a run with these settings; takes over the limit of evaluations.
    pub(crate) fn accept(
        &mut self,
        settings: &EnsembleSettings,
        dimension: usize,
    ) -> Result<(), SamplerError> {
        self.settings.maximum_evaluations = settings.maximum_evaluations;
        let fits = self.settings == *settings
            && self.peak.point.len() == dimension
            && self.ensembles.len() == settings.ensembles;
        if fits { Ok(()) } else { Err(SamplerError::ForeignState) }
    }

    /// Evaluations so far, from the first of the peak search.
    pub(crate) fn evaluations(&self) -> u64 {
        let sampled: u64 = self.ensembles.iter().map(|ensemble| ensemble.counts.evaluations).sum();
        sampled + self.peak.evaluations
    }

    /// Evaluations that the kept steps took, about.
    pub(crate) fn evaluations_kept(&self) -> f64 {
        let steps = self.steps - self.warm_up.unwrap_or(0);
        (steps * self.step_cost()) as f64
    }

    /// Evaluations of one step, at most.
    pub(crate) fn step_cost(&self) -> u64 {
        (self.walkers * self.ensembles.len()) as u64
    }

    /// Advances every ensemble by `count` steps, side by side.
    pub(crate) fn advance<T: Target>(
        &mut self,
        target: &T,
        mixture: &Mixture,
        lanes: &mut [Vec<Lane<T::Scratch>>],
        count: u64,
    ) -> Option<Fatal> {
        let (from, thinning) = (self.steps, self.history.thinning);
        let failures: Vec<Option<Fatal>> = self
            .ensembles
            .par_iter_mut()
            .zip(self.history.records.par_iter_mut())
            .zip(lanes.par_iter_mut())
            .map(|((ensemble, record), lanes)| {
                for step in from + 1..=from + count {
                    ensemble.step(target, mixture, lanes);
                    if let Some(fatal) = ensemble.collect(lanes) {
                        return Some(fatal);
                    }
                    if step.is_multiple_of(thinning) {
                        record.push(ensemble);
                    }
                }
                None
            })
            .collect();
        let failed = failures.into_iter().flatten().next();
        if failed.is_some() {
            self.cut_to_common_length();
        } else {
            self.history.extend_to(from, from + count);
            self.steps += count;
        }
        failed
    }

    /// After a failure in one ensemble: forgets the round, which the others may have finished.
    fn cut_to_common_length(&mut self) {
        let rows = self.history.steps() * self.walkers;
        let dimension = self.peak.point.len();
        for record in &mut self.history.records {
            record.points.truncate(rows * dimension);
            record.log_prior.truncate(rows);
            record.log_likelihood.truncate(rows);
        }
    }

    /// Ends warm-up here: what follows is independent of the draws that the proposals were fitted to, given the fit.
    pub(crate) fn forget_all(&mut self) {
        self.history.drop_first(self.history.steps());
        self.warm_up = Some(self.steps);
        for ensemble in &mut self.ensembles {
            ensemble.counts.moves.iter_mut().for_each(|counts| *counts = (0, 0));
        }
    }

    /// Ends warm-up after the first `dropped` remembered steps.
    pub(crate) fn drop_first(&mut self, dropped: usize) {
        if dropped > 0 {
            self.warm_up = Some(self.history.kept_steps[dropped - 1]);
            self.history.drop_first(dropped);
        }
    }

    /// Hands the draws over; the history is empty afterwards.
    ///
    /// # Errors
    /// A draw that could not be completed.
    pub(crate) fn finish<T: Target>(
        &mut self,
        target: &T,
        scratches: &mut [T::Scratch],
        (stopped_by, verdict): (StopReason, Option<Verdict>),
    ) -> Result<Chain, Fatal> {
        let settled = self.warm_up.is_some();
        if !settled {
            self.drop_first(self.history.steps() / 2);
        }
        self.history.complete(target, self.settings.seed, scratches)?;
        let kept = self.evaluations_kept();
        let verdict = match verdict {
            Some(verdict) if verdict.diagnostics.is_some() => verdict,
            _ => full_check(&self.history.columns(), &self.settings, kept),
        };
        let mut rejected = RejectedEvaluations::default();
        for ensemble in &self.ensembles {
            rejected.merge(&ensemble.counts.rejected);
        }
        let acceptance = self
            .weights
            .iter()
            .enumerate()
            .map(|(at, (name, _))| {
                let counts = self.ensembles.iter().map(|ensemble| ensemble.counts.moves[at]);
                let (proposed, accepted) = counts.fold((0, 0), |sum, part| (sum.0 + part.0, sum.1 + part.1));
                MoveAcceptance { name: name.clone(), proposed, accepted }
            })
            .collect();
        let (mut points, mut log_prior, mut log_likelihood) = (vec![], vec![], vec![]);
        let completed = target.completed_dimension();
        for record in &mut self.history.records {
            if completed.is_some() {
                let draws = &mut record.completed;
                points.append(&mut draws.points);
                log_prior.append(&mut draws.log_prior);
                log_likelihood.append(&mut draws.log_likelihood);
            } else {
                points.append(&mut record.points);
                log_prior.append(&mut record.log_prior);
                log_likelihood.append(&mut record.log_likelihood);
            }
        }
        let dimension = completed.unwrap_or(self.peak.point.len());
        let best = match completed {
            Some(_) => highest_row(dimension, &points, &log_prior, &log_likelihood),
            None => self.highest_visited(),
        };
        Ok(Chain {
            dimension,
            ensembles: self.ensembles.len(),
            walkers: self.walkers,
            steps: self.steps,
            warm_up: self.warm_up.unwrap_or(0),
            thinning: self.history.thinning,
            kept_steps: std::mem::take(&mut self.history.kept_steps),
            points,
            log_prior,
            log_likelihood,
            diagnostics: verdict.diagnostics.unwrap_or_default(),
            acceptance,
            evaluations: self.evaluations(),
            peak_evaluations: self.peak.evaluations,
            rejected,
            wall_seconds: self.elapsed_seconds,
            threads: rayon::current_num_threads(),
            outcome: Outcome {
                converged: settled && verdict.failing.is_empty(),
                stopped_by,
                settled,
                failing: verdict.failing,
            },
            peak: completed.is_none().then(|| self.peak.clone()),
            best,
        })
    }

    fn highest_visited(&self) -> BestPoint {
        let mut best = &self.ensembles[0].best;
        for ensemble in &self.ensembles {
            if height(&ensemble.best) > height(best) {
                best = &ensemble.best;
            }
        }
        best.clone()
    }
}

/// The highest of completed draws, of which there is at least one.
pub(crate) fn highest_row(
    dimension: usize,
    points: &[f64],
    log_prior: &[f64],
    log_likelihood: &[f64],
) -> BestPoint {
    let heights = log_prior.iter().zip(log_likelihood).map(|(prior, likelihood)| prior + likelihood);
    let row = heights.enumerate().max_by(|a, b| a.1.total_cmp(&b.1)).map_or(0, |(row, _)| row);
    BestPoint {
        point: points[row * dimension..(row + 1) * dimension].to_vec(),
        log_prior: log_prior[row],
        log_likelihood: log_likelihood[row],
    }
}

/// The Laplace approximation as a first fit; without correlations where they make it singular.
fn laplace_fit(peak: &Peak) -> Fit {
    let diagonal = DMatrix::from_diagonal(&peak.covariance.diagonal().map(|variance| variance.max(1e-300)));
    Fit::new(peak.point.clone(), peak.covariance.clone())
        .or_else(|| Fit::new(peak.point.clone(), diagonal))
        .expect("a diagonal of positive variances has a Cholesky factor")
}
