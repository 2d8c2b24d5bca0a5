//! The work on one hypothesis, in parts that are kept one by one.

use super::Work;
use super::facts::{Facts, facts};
use super::plan::Departure;
use crate::assemble::{IntegratedPosterior, Posterior};
use crate::fit::fit_posterior;
use crate::record::Ordered;
use crate::run_directory::{Existing, RunDirectory};
use crate::run_error::RunError;
use oddwell_evidence::{
    ClosedForm, Estimate, Estimator, EvidenceError, Nested, Problem, SteppingStones, Watch,
};
use oddwell_sampler::{Control, PriorSet, StopReason, Target};
use serde::{Deserialize, Serialize};
use std::time::Instant;

/// Parts of the work on a hypothesis: its posterior, and the tasks.
pub(super) const PARTS: usize = 1 + Task::ALL.len();

/// An estimator that needs no draws of the posterior.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Task {
    Nested,
    Stepping,
    ClosedForm,
}

/// What an estimator came to, and what that took.
#[derive(Clone, Debug, Serialize, Deserialize)]
pub(crate) struct Outcome {
    pub(crate) estimate: Option<Estimate>,
    pub(crate) not_applicable: Option<String>,
    pub(crate) seconds: f64,
}

/// All parts of the work on one hypothesis.
#[derive(Clone, Debug)]
pub(crate) struct Pieces {
    /// What the draws of its posterior say; `None` where there is nothing to infer.
    pub(crate) facts: Option<Facts>,
    pub(crate) outcomes: Ordered<Outcome>,
}

impl Outcome {
    fn not(reason: &str) -> Outcome {
        Outcome { estimate: None, not_applicable: Some(reason.to_owned()), seconds: 0.0 }
    }

    pub(crate) fn of(
        result: Result<Estimate, EvidenceError>,
        clock: Instant,
    ) -> Result<Outcome, EvidenceError> {
        let seconds = clock.elapsed().as_secs_f64();
        match result {
            Ok(estimate) => Ok(Outcome { estimate: Some(estimate), not_applicable: None, seconds }),
            Err(EvidenceError::NotApplicable { reason, .. }) => {
                Ok(Outcome { estimate: None, not_applicable: Some(reason), seconds })
            }
            Err(error) => Err(error),
        }
    }
}

impl Task {
    pub(super) const ALL: [Task; 3] = [Task::Nested, Task::Stepping, Task::ClosedForm];

    pub(super) fn name(self) -> &'static str {
        match self {
            Task::Nested => "nested",
            Task::Stepping => "stepping",
            Task::ClosedForm => "closed_form",
        }
    }

    pub(super) fn outcome(
        self,
        work: &Work<'_>,
        index: usize,
        posterior: &Posterior,
    ) -> Result<Outcome, RunError> {
        let watch = &work.watch.hypotheses[index];
        let name = format!("{}.{}", posterior.hypothesis.name, self.name());
        let outcome = work.state.piece(&name, || {
            let clock = Instant::now();
            if self == Task::ClosedForm {
                let problem = problem(work, posterior, &posterior.priors);
                return Ok(Outcome::of(ClosedForm.estimate(&problem, &watch.watch), clock)?);
            }
            if posterior.dimension() == 0 {
                return Ok(Outcome::not("there is nothing to integrate over"));
            }
            // Where nothing is left, the full posterior checks the closed form.
            match integrated(posterior)? {
                Some(left) => self.run(&problem(work, &left, &left.priors), &watch.watch, clock),
                None => self.run(&problem(work, posterior, &posterior.priors), &watch.watch, clock),
            }
        })?;
        watch.one_more();
        Ok(outcome)
    }

    fn run<T: Target>(
        self,
        problem: &Problem<'_, T>,
        watch: &Watch,
        clock: Instant,
    ) -> Result<Outcome, RunError> {
        let result = match self {
            Task::Nested => Nested::default().estimate(problem, watch),
            Task::Stepping => SteppingStones::default().estimate(problem, watch),
            Task::ClosedForm => ClosedForm.estimate(problem, watch),
        };
        Ok(Outcome::of(result, clock)?)
    }
}

/// The posterior with its linear quantities integrated out, but for those of the departure; `None` where there are none, or
/// where nothing would be left.
pub(super) fn integrated(posterior: &Posterior) -> Result<Option<IntegratedPosterior<'_>>, RunError> {
    let kept = posterior.hypothesis.watched();
    Ok(IntegratedPosterior::keeping(posterior, &kept)?.filter(|left| left.dimension() > 0))
}

/// The problem of a target, without draws.
pub(super) fn problem<'a, T: Target>(work: &Work<'_>, target: &'a T, priors: &'a PriorSet) -> Problem<'a, T> {
    Problem { target, priors, seed: work.seed, peak: None, chain: None, contained: None }
}

impl Pieces {
    /// Samples the posterior into its run directory, and draws what is needed from the chain.
    pub(super) fn begin(work: &Work<'_>, index: usize, posterior: &Posterior) -> Result<Pieces, RunError> {
        let watch = &work.watch.hypotheses[index];
        if posterior.dimension() == 0 {
            watch.one_more();
            return Ok(Pieces { facts: None, outcomes: Ordered::new() });
        }
        let name = &posterior.hypothesis.name;
        let facts = work.state.piece(&format!("{name}.posterior"), || {
            let clock = Instant::now();
            let folder = work.state.run_of(name);
            let options = work.fit_options(&folder);
            let directory = RunDirectory::claim(&folder, Existing::Resume)?;
            let mut counted = 0;
            let (fitted, chain) = fit_posterior(
                work.study,
                posterior,
                work.measurements,
                &directory,
                &options,
                &mut |progress, _| {
                    let more = progress.evaluations.saturating_sub(counted);
                    counted = progress.evaluations;
                    if watch.watch.count(more).is_err() { Control::Stop } else { Control::Continue }
                },
            )?;
            if chain.outcome.stopped_by == StopReason::Caller {
                return Err(EvidenceError::Stopped.into());
            }
            let departure = Departure::of(posterior);
            facts(work, posterior, &departure, &chain, &fitted.summary, &watch.watch, clock)
        })?;
        watch.one_more();
        Ok(Pieces { facts: Some(facts), outcomes: Ordered::new() })
    }
}
