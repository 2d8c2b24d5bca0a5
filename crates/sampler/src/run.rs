//! The loop of a run: rounds, checks, and when to stop.

use crate::chain::{Chain, StopReason};
use crate::direct::draw_directly;
use crate::ensemble::{Fatal, Lane};
use crate::error::SamplerError;
use crate::moves::Mixture;
use crate::peak::{PeakSettings, find_peak_with};
use crate::priors::PriorSet;
use crate::settings::{Control, DEFAULT_MAXIMUM_EVALUATIONS, EnsembleSettings, Phase, Progress};
use crate::state::RunState;
use crate::stopping::{Verdict, first_look, full_check};
use crate::target::Target;
use crate::warm_up::{settled, still_settled};
use std::time::{Duration, Instant};

/// Time between two calls of the callback, about.
const ROUND: Duration = Duration::from_millis(40);

/// Checks come at least this factor of steps apart, so that all of them cost no more than a few times the last …
const LEAST_GROWTH: f64 = 1.15;

/// … and at most this factor, however far off the goal seems; …
const LARGEST_GROWTH: f64 = 2.0;

/// … and during warm-up this one.
const WARM_UP_GROWTH: f64 = 1.3;

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
/// Where the target has quantities integrated out, their draws are completed at the checks, and the tests and
/// `settings.watched` are about completed draws. With nothing left to sample, the draws are independent ones.
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
    sample_with(target, priors, settings, None, callback, &mut |_, _| {})
}

/// [`sample`] of a run whose state can be kept, and gone on from: the chain is the same, bit by bit, however often the run was
/// broken off.
///
/// `resumed` is a state that `keep` saw in a run of the same target, priors and settings (the limit of evaluations may
/// differ). `keep` is called after every round, some 25 times a second, with the state as it is, and whether the callback
/// just stopped the run. A run of independent draws, which has none to speak of, never calls it.
///
/// # Errors
/// As [`sample`]; and [`SamplerError::ForeignState`] for the state of another run.
pub fn sample_with<T: Target>(
    target: &T,
    priors: &PriorSet,
    settings: &EnsembleSettings,
    resumed: Option<RunState>,
    callback: &mut dyn FnMut(&Progress) -> Control,
    keep: &mut dyn FnMut(&RunState, bool),
) -> Result<Chain, SamplerError> {
    let clock = Instant::now();
    if target.completed_dimension().is_some() && priors.dimension() == 0 {
        return draw_directly(target, settings, clock, callback);
    }
    settings.check(priors.dimension(), target.completed_dimension())?;
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
    if let Some(mut state) = resumed {
        state.accept(settings, priors.dimension())?;
        return state.run(target, report, clock, callback, keep);
    }
    let peak_settings = PeakSettings { seed: settings.seed, ..PeakSettings::default() };
    let peak = find_peak_with(target, priors, &peak_settings, &mut |evaluations| {
        report.evaluations = evaluations;
        report.elapsed_seconds = clock.elapsed().as_secs_f64();
        callback(&report)
    })?;
    let mut state = RunState::start(target, priors, settings, peak)?;
    state.run(target, report, clock, callback, keep)
}

impl RunState {
    fn run<T: Target>(
        &mut self,
        target: &T,
        mut report: Progress,
        clock: Instant,
        callback: &mut dyn FnMut(&Progress) -> Control,
        keep: &mut dyn FnMut(&RunState, bool),
    ) -> Result<Chain, SamplerError> {
        let earlier = self.elapsed_seconds;
        let threads = rayon::current_num_threads();
        let lanes_each = threads.div_ceil(self.ensembles.len());
        let mut mixture = Mixture::new(&self.fit, &self.weights)?;
        let moves = self.weights.len();
        let dimension = self.peak.point.len();
        let mut lanes: Vec<Vec<Lane<T::Scratch>>> = (0..self.ensembles.len())
            .map(|_| (0..lanes_each).map(|_| Lane::new(target.scratch(), dimension, moves)).collect())
            .collect();
        let mut scratches: Vec<T::Scratch> = (0..self.ensembles.len()).map(|_| target.scratch()).collect();
        let evaluation = |fatal: Fatal, partial: Option<Chain>| SamplerError::Evaluation {
            reason: fatal.reason,
            point: fatal.point,
            partial: partial.map(Box::new),
        };
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
                let ending = (StopReason::Failure, None);
                let partial = (self.history.steps() > 0)
                    .then(|| self.finish(target, &mut scratches, ending).ok())
                    .flatten();
                return Err(evaluation(fatal, partial));
            }
            let pace = began.elapsed().as_secs_f64() / count as f64;
            round = ((ROUND.as_secs_f64() / pace) as u64).clamp(1, (2 * round).max(16));
            last_check = None;
            if self.steps >= self.next_check {
                let verdict = self
                    .check(target, &mut scratches, &mut report)
                    .map_err(|fatal| evaluation(fatal, None))?;
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
            self.elapsed_seconds = earlier + clock.elapsed().as_secs_f64();
            report.elapsed_seconds = self.elapsed_seconds;
            let stop = callback(&report) == Control::Stop;
            keep(self, stop);
            if stop {
                break StopReason::Caller;
            }
        };
        self.elapsed_seconds = earlier + clock.elapsed().as_secs_f64();
        if self.history.steps() == 0 {
            return Err(SamplerError::Stopped);
        }
        self.finish(target, &mut scratches, (stopped_by, last_check)).map_err(|fatal| evaluation(fatal, None))
    }

    /// Looks for the end of warm-up, then applies the tests; sets the step of the next check. Depends on the chain alone.
    fn check<T: Target>(
        &mut self,
        target: &T,
        scratches: &mut [T::Scratch],
        report: &mut Progress,
    ) -> Result<Option<Verdict>, Fatal> {
        if self.warm_up.is_some() {
            self.history.complete(target, self.settings.seed, scratches)?;
        }
        let mut columns = self.history.columns();
        match self.warm_up {
            Some(_) if self.proposals_went_wrong() => {
                self.refit(0);
                self.forget_all();
            }
            Some(_) => {
                let dropped = still_settled(&columns);
                if dropped > 0 {
                    self.drop_first(dropped);
                    columns = self.history.columns();
                }
            }
            None => {
                let settled = settled(&columns);
                self.refit(settled.unwrap_or(self.history.steps() / 2));
                if settled.is_some() {
                    self.forget_all();
                }
            }
        }
        let mut verdict = None;
        let mut growth = WARM_UP_GROWTH;
        if self.warm_up.is_some() && self.history.steps() >= 8 {
            let kept = self.evaluations_kept();
            let mut found = first_look(&columns, &self.settings, kept);
            // The first look errs by a few per cent, so near the goal the full tests decide.
            if found.remaining().unwrap_or(0.0) < 0.05 * kept {
                found = full_check(&columns, &self.settings, kept);
            }
            report.effective_samples = Some(found.effective_samples);
            report.worst_rhat = Some(found.worst_rhat);
            report.remaining_evaluations = found.remaining();
            let steps = found.remaining().map_or(f64::INFINITY, |more| more / self.step_cost() as f64);
            // With more than twice as much ahead as lies behind, starting anew with better proposals pays.
            if found.remaining().is_some_and(|more| more > 2.0 * kept) && self.proposals_can_be_better() {
                self.refit(0);
                self.forget_all();
            }
            growth = (1.0 + steps / self.steps as f64).clamp(LEAST_GROWTH, LARGEST_GROWTH);
            verdict = (self.history.steps() > 0).then_some(found);
        }
        self.next_check = (self.steps as f64 * growth).ceil() as u64;
        Ok(verdict)
    }
}
