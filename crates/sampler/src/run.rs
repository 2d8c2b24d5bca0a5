//! A run: its state, advanced in rounds, and the loop that decides when to stop.

use crate::chain::{Chain, MoveAcceptance, Outcome, RejectedEvaluations, StopReason};
use crate::ensemble::{Ensemble, Fatal, Lane, height};
use crate::error::SamplerError;
use crate::history::History;
use crate::moves::{Fit, Independence, Mixture, Quality, quality, weights};
use crate::peak::{Peak, PeakSettings, find_peak_with};
use crate::priors::PriorSet;
use crate::settings::{Control, DEFAULT_MAXIMUM_EVALUATIONS, EnsembleSettings, Phase, Progress};
use crate::start::start_ensemble;
use crate::stopping::{Verdict, first_look, full_check};
use crate::target::Target;
use crate::warm_up::{settled, still_settled};
use nalgebra::DMatrix;
use rayon::prelude::*;
use serde::{Deserialize, Serialize};
use std::time::{Duration, Instant};

/// Time between two calls of the callback, about.
const ROUND: Duration = Duration::from_millis(40);

/// The first check of the stop rule comes after this many steps.
const FIRST_CHECK: u64 = 24;

/// Checks come at least this factor of steps apart, so that all of them cost no more than a few times the last …
const LEAST_GROWTH: f64 = 1.15;

/// … and at most this factor, however far off the goal seems.
const LARGEST_GROWTH: f64 = 1.6;

/// The share of independent proposals in the mixture that their quality deserves.
///
/// A walker stuck where proposals are too rare waits for the other moves, whose memory is about 4·dimension steps of their
/// own. If it hardly ever stays longer than that, independent proposals may do nearly everything; if it does, half of the
/// steps cost either kind of move at most a factor of two; if hardly any proposal is accepted, they only cost evaluations.
fn deserved_share(quality: Quality, dimension: usize) -> f64 {
    if quality.acceptance < 0.02 {
        0.05
    } else if quality.longest_stay > 4.0 * dimension as f64 {
        0.5
    } else {
        0.9
    }
}

/// Everything that determines how a run goes on.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub(crate) struct RunState {
    settings: EnsembleSettings,
    walkers: usize,
    peak: Peak,
    ensembles: Vec<Ensemble>,
    history: History,
    /// What the independence move proposes from: the Laplace approximation at first, then fits to the warm-up, frozen at
    /// its end.
    fit: Fit,
    /// Weights of the moves by name; that of the independence move follows its acceptance during warm-up.
    weights: Vec<(String, f64)>,
    steps: u64,
    next_check: u64,
    /// Steps dropped as warm-up, once that is known.
    warm_up: Option<u64>,
}

/// Samples the posterior of `target`.
///
/// Finds the peak, starts `settings.ensembles` ensembles around it, and advances them side by side on rayon's current
/// thread pool until every test passes, `maximum_evaluations` are used up, or `callback` (called about 25 times a second)
/// returns [`Control::Stop`]. The chain depends on target, priors and settings alone, not on the number of threads nor on
/// timing.
///
/// Warm-up ends where the ensembles' means show neither drift nor memory of the start; see [`Chain::warm_up`]. The tests
/// are made at lengths that grow geometrically. `priors` must be the prior of `target`: it gives scales, bounds and
/// starting points, while the density that is sampled is `target`'s alone.
///
/// # Errors
/// [`SamplerError::Setting`], such as for 1 ensemble or 7 walkers; [`SamplerError::Dimension`]; [`SamplerError::NoStart`];
/// [`SamplerError::Evaluation`] after a fatal failure, with the draws until then; [`SamplerError::Stopped`] if the
/// callback stops the run before the first draw.
pub fn sample<T: Target>(
    target: &T,
    priors: &PriorSet,
    settings: &EnsembleSettings,
    callback: &mut dyn FnMut(&Progress) -> Control,
) -> Result<Chain, SamplerError> {
    let clock = Instant::now();
    check_settings(settings, priors.dimension())?;
    let mut report = Progress {
        phase: Phase::Peak,
        evaluations: 0,
        maximum_evaluations: settings.maximum_evaluations.unwrap_or(DEFAULT_MAXIMUM_EVALUATIONS),
        steps: 0,
        elapsed_seconds: 0.0,
        effective_samples: None,
        wanted_samples: settings.effective_samples,
        worst_rhat: None,
        remaining_evaluations: None,
    };
    let peak_settings = PeakSettings { seed: settings.seed, ..PeakSettings::default() };
    let peak = find_peak_with(target, priors, &peak_settings, &mut |evaluations| {
        report.evaluations = evaluations;
        report.elapsed_seconds = clock.elapsed().as_secs_f64();
        callback(&report)
    })?;
    let mut state = RunState::start(target, priors, settings, peak)?;
    state.run(target, report, clock, callback)
}

impl RunState {
    fn start<T: Target>(
        target: &T,
        priors: &PriorSet,
        settings: &EnsembleSettings,
        peak: Peak,
    ) -> Result<Self, SamplerError> {
        let walkers = settings.walkers.unwrap_or_else(|| default_walkers(priors.dimension()));
        let weights = weights(&settings.move_weights)?;
        let moves = weights.len();
        let fit = laplace_fit(&peak);
        let ensembles = (0..settings.ensembles)
            .into_par_iter()
            .map(|index| start_ensemble(target, priors, &peak, (settings.seed, index, walkers), moves))
            .collect::<Result<Vec<_>, _>>()?;
        let maximum_draws =
            settings.maximum_draws.unwrap_or((16.0 * settings.effective_samples).min(1e9) as usize);
        let maximum_draws =
            if settings.maximum_draws.is_none() { maximum_draws.max(1 << 16) } else { maximum_draws };
        Ok(Self {
            settings: settings.clone(),
            walkers,
            history: History::new(settings.ensembles, walkers, priors.dimension(), maximum_draws),
            peak,
            ensembles,
            fit,
            weights,
            steps: 0,
            next_check: FIRST_CHECK,
            warm_up: None,
        })
    }

    /// Evaluations so far, from the first of the peak search.
    fn evaluations(&self) -> u64 {
        let sampled: u64 = self.ensembles.iter().map(|ensemble| ensemble.counts.evaluations).sum();
        sampled + self.peak.evaluations
    }

    /// Evaluations that the kept steps took, about.
    fn evaluations_kept(&self) -> f64 {
        let steps = self.steps - self.warm_up.unwrap_or(0);
        (steps * self.step_cost()) as f64
    }

    /// Evaluations of one step, at most.
    fn step_cost(&self) -> u64 {
        (self.walkers * self.ensembles.len()) as u64
    }

    /// Advances every ensemble by `count` steps, side by side.
    fn advance<T: Target>(
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

    fn run<T: Target>(
        &mut self,
        target: &T,
        mut report: Progress,
        clock: Instant,
        callback: &mut dyn FnMut(&Progress) -> Control,
    ) -> Result<Chain, SamplerError> {
        let threads = rayon::current_num_threads();
        let lanes_each = threads.div_ceil(self.ensembles.len());
        let mut mixture = Mixture::new(&self.fit, &self.weights)?;
        let moves = self.weights.len();
        let dimension = self.peak.point.len();
        let mut lanes: Vec<Vec<Lane<T::Scratch>>> = (0..self.ensembles.len())
            .map(|_| (0..lanes_each).map(|_| Lane::new(target.scratch(), dimension, moves)).collect())
            .collect();
        let mut round = 1;
        let mut last_check = None;
        let stopped_by = loop {
            let affordable = report.maximum_evaluations.saturating_sub(self.evaluations()) / self.step_cost();
            if affordable == 0 {
                break StopReason::EvaluationLimit;
            }
            let count = round.min(self.next_check - self.steps).min(affordable);
            let began = Instant::now();
            if let Some(fatal) = self.advance(target, &mixture, &mut lanes, count) {
                let Fatal { reason, point } = fatal;
                let partial = (self.history.steps() > 0)
                    .then(|| Box::new(self.finish(StopReason::Failure, None, clock)));
                return Err(SamplerError::Evaluation { reason, point, partial });
            }
            let pace = began.elapsed().as_secs_f64() / count as f64;
            round = ((ROUND.as_secs_f64() / pace) as u64).clamp(1, (2 * round).max(16));
            last_check = None;
            if self.steps >= self.next_check {
                let verdict = self.check(&mut report);
                mixture = Mixture::new(&self.fit, &self.weights)?;
                let done = verdict.as_ref().is_some_and(|verdict| verdict.failing.is_empty());
                last_check = verdict;
                if done {
                    break StopReason::Converged;
                }
            }
            report.phase = if self.warm_up.is_some() { Phase::Sampling } else { Phase::WarmUp };
            report.evaluations = self.evaluations();
            report.steps = self.steps;
            report.elapsed_seconds = clock.elapsed().as_secs_f64();
            if callback(&report) == Control::Stop {
                break StopReason::Caller;
            }
        };
        if self.history.steps() == 0 {
            return Err(SamplerError::Stopped);
        }
        Ok(self.finish(stopped_by, last_check, clock))
    }

    /// Looks for the end of warm-up, then applies the tests; sets the step of the next check. Depends on the chain alone.
    fn check(&mut self, report: &mut Progress) -> Option<Verdict> {
        let mut growth = LARGEST_GROWTH.sqrt();
        match self.warm_up {
            Some(_) if self.proposals_went_wrong() => {
                self.refit(0);
                self.forget_all();
            }
            Some(_) => {
                let dropped = still_settled(&self.history);
                self.drop_first(dropped);
            }
            None => {
                let settled = settled(&self.history);
                self.refit(settled.unwrap_or(self.history.steps() / 2));
                if settled.is_some() {
                    self.forget_all();
                }
            }
        }
        let mut verdict = None;
        if self.warm_up.is_some() && self.history.steps() >= 8 {
            let kept = self.evaluations_kept();
            let mut found = first_look(&self.history, &self.settings, kept);
            // The first look errs by a few per cent, so near the goal the full tests decide.
            if found.remaining().unwrap_or(0.0) < 0.05 * kept {
                found = full_check(&self.history, &self.settings, kept);
            }
            report.effective_samples = Some(found.effective_samples);
            report.worst_rhat = Some(found.worst_rhat);
            report.remaining_evaluations = found.remaining();
            let steps = found.remaining().map_or(f64::INFINITY, |more| more / self.step_cost() as f64);
            growth = (1.0 + steps / self.steps as f64).clamp(LEAST_GROWTH, LARGEST_GROWTH);
            verdict = Some(found);
        }
        self.next_check = (self.steps as f64 * growth).ceil() as u64;
        verdict
    }

    /// Fits the independence move to the draws after the first `dropped` steps, and gives it the share that its quality
    /// there deserves, unless the settings fix the weights.
    fn refit(&mut self, dropped: usize) {
        let Some(place) = self.weights.iter().position(|(name, _)| name == Independence::NAME) else {
            return;
        };
        if let Some(fit) =
            Fit::to_draws(self.fit.dimension(), self.history.draws(dropped).map(|(point, _)| point))
        {
            self.fit = fit;
        }
        if self.settings.move_weights.is_empty() {
            let others: f64 = self
                .weights
                .iter()
                .enumerate()
                .filter(|(at, _)| *at != place)
                .map(|(_, (_, weight))| weight)
                .sum();
            let share = deserved_share(quality(&self.fit, self.history.draws(dropped)), self.fit.dimension());
            self.weights[place].1 = others * share / (1.0 - share);
        }
    }

    /// Whether the frozen proposals deserve a smaller share than they have, now that the chain has seen more: then the
    /// weights that they imply vary too much, and walkers get stuck where proposals are too rare.
    fn proposals_went_wrong(&self) -> bool {
        let Some(place) = self.weights.iter().position(|(name, _)| name == Independence::NAME) else {
            return false;
        };
        if !self.settings.move_weights.is_empty() || self.history.steps() == 0 {
            return false;
        }
        let total: f64 = self.weights.iter().map(|(_, weight)| weight).sum();
        let share = self.weights[place].1 / total;
        deserved_share(quality(&self.fit, self.history.draws(0)), self.fit.dimension()) < share - 1e-9
    }

    /// Ends warm-up here: what follows is independent of the draws that the proposals were fitted to, given the fit.
    fn forget_all(&mut self) {
        self.history.drop_first(self.history.steps());
        self.warm_up = Some(self.steps);
        for ensemble in &mut self.ensembles {
            ensemble.counts.moves.iter_mut().for_each(|counts| *counts = (0, 0));
        }
    }

    fn drop_first(&mut self, dropped: usize) {
        if dropped > 0 {
            self.warm_up = Some(self.history.kept_steps[dropped - 1]);
            self.history.drop_first(dropped);
        }
    }

    fn finish(&mut self, stopped_by: StopReason, verdict: Option<Verdict>, clock: Instant) -> Chain {
        let settled = self.warm_up.is_some();
        let wall_seconds = clock.elapsed().as_secs_f64();
        if !settled {
            self.drop_first(self.history.steps() / 2);
        }
        let kept = self.evaluations_kept();
        let verdict = match verdict {
            Some(verdict) if verdict.diagnostics.is_some() => verdict,
            _ => full_check(&self.history, &self.settings, kept),
        };
        let mut rejected = RejectedEvaluations::default();
        let mut best = self.ensembles[0].best.clone();
        for ensemble in &self.ensembles {
            rejected.merge(&ensemble.counts.rejected);
            if height(&ensemble.best) > height(&best) {
                best.clone_from(&ensemble.best);
            }
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
        for record in &mut self.history.records {
            points.append(&mut record.points);
            log_prior.append(&mut record.log_prior);
            log_likelihood.append(&mut record.log_likelihood);
        }
        Chain {
            dimension: self.peak.point.len(),
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
            wall_seconds,
            threads: rayon::current_num_threads(),
            outcome: Outcome {
                converged: stopped_by == StopReason::Converged,
                stopped_by,
                settled,
                failing: verdict.failing,
            },
            peak: Some(self.peak.clone()),
            best,
        }
    }
}

/// The Laplace approximation as a first fit; without correlations where they make it singular.
fn laplace_fit(peak: &Peak) -> Fit {
    let diagonal = DMatrix::from_diagonal(&peak.covariance.diagonal().map(|variance| variance.max(1e-300)));
    Fit::new(peak.point.clone(), peak.covariance.clone())
        .or_else(|| Fit::new(peak.point.clone(), diagonal))
        .expect("a diagonal of positive variances has a Cholesky factor")
}

/// Walkers of an ensemble over `dimension` coordinates: the halves span the space with a few to spare.
pub(crate) fn default_walkers(dimension: usize) -> usize {
    (2 * dimension + 8).next_multiple_of(4).max(16)
}

fn check_settings(settings: &EnsembleSettings, dimension: usize) -> Result<(), SamplerError> {
    let wrong = |setting, rule: String, value: String, way_out| {
        Err(SamplerError::Setting { setting, rule, value, way_out })
    };
    if settings.ensembles < 2 {
        let way_out = "R̂ compares ensembles; leave it out for 4";
        return wrong("ensembles", "at least 2".to_owned(), settings.ensembles.to_string(), way_out);
    }
    let least = (2 * dimension + 2).max(6);
    if let Some(walkers) = settings.walkers.filter(|walkers| *walkers < least || !walkers.is_multiple_of(2)) {
        let way_out = "leave it out to have it chosen from the dimension";
        return wrong("walkers", format!("even and at least {least}"), walkers.to_string(), way_out);
    }
    if let Some(watched) = settings.watched.iter().find(|watched| **watched >= dimension) {
        let way_out = "parameters are counted from 0";
        return wrong("watched", format!("below {dimension}"), watched.to_string(), way_out);
    }
    if !(settings.effective_samples > 0.0 && settings.effective_samples.is_finite()) {
        let way_out = "a few thousand suffice for intervals";
        let value = settings.effective_samples.to_string();
        return wrong("effective_samples", "finite and above 0".to_owned(), value, way_out);
    }
    if !(settings.maximum_rhat > 1.0) {
        let value = settings.maximum_rhat.to_string();
        return wrong("maximum_rhat", "above 1".to_owned(), value, "1.01 is what the literature advises");
    }
    Ok(())
}
