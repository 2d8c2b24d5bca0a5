//! Nested sampling (Skilling 2006, Bayesian Analysis 1, 833).
//!
//! The evidence is ∫ L dX over the prior mass X(λ) that lies above a likelihood λ. Live points, drawn from the prior above
//! the current bound, say by how much X shrinks as the lowest of them die.

mod insertion;
mod run;
mod shrinkage;

use crate::error::EvidenceError;
use crate::estimate::Estimate;
use crate::estimator::{Estimator, EstimatorFamily};
use crate::numbers::{kolmogorov_p_value, mean_and_variance};
use crate::problem::{Problem, Watch};
use crate::walk::Sweeps;
use oddwell_sampler::Target;
use rayon::prelude::*;

/// Registry entry.
pub(crate) const FAMILY: EstimatorFamily = EstimatorFamily {
    name: "nested",
    summary: "nested sampling: prior mass above a rising bound on the likelihood (Skilling 2006)",
    manual: "\
Z = ∫ L dX over the prior mass X above a likelihood. Live points are drawn from the prior; half of them, those of lowest
likelihood, die at once and are replaced by points from the prior above the bound that the highest of the dead sets: copies of
survivors that walk, with the sampler's own moves, until they have forgotten where they started. When the i-th of n live points
dies, ln X falls by an exponential number of mean 1/(n − i + 1).

The error bar is the larger of two: the scatter of ln Z over simulated shrinkages (Skilling 2006, §7), and the scatter between
independent runs; each divided by the square root of the number of runs.

Checked on the way: the place of every new point among the live ones is uniform if it is an independent draw from above the
bound (Fowlie, Handley & Su 2020, MNRAS 497, 5256). Where that has a probability below 1e-4, the estimate does not vote.

Ends where the best live point times the prior mass left adds less than a hundredth to Z; a mode narrower than the live points
have seen by then is missed.",
};

/// Insertion indices less probable than this take the vote away. Of ten thousand sound runs, one loses it.
pub const LEAST_INSERTION_PROBABILITY: f64 = 1e-4;

/// Live points of the first run at most: they tell the information to √(H/250), a few per cent of it.
const FIRST_LIVE_POINTS: usize = 250;

/// Nested sampling and its settings.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Nested {
    /// Live points of each run at most; a first run of a quarter of them, or 250, tells the information, and from it how
    /// many reach `error`. At least 4·dimension + 8 are used.
    pub live_points: usize,
    /// Standard error of ln Z that is wanted: √(H/live points of all runs), H the information.
    pub error: f64,
    /// Independent runs, side by side.
    pub runs: usize,
    /// How long new points walk.
    pub sweeps: Sweeps,
    /// A run ends where what is left can add less than this share to Z.
    pub remainder: f64,
    /// Evaluations after which a run gives up.
    pub maximum_evaluations: u64,
}

impl Default for Nested {
    fn default() -> Self {
        Self {
            live_points: 2500,
            error: 0.03,
            runs: 4,
            sweeps: Sweeps::Anew(12.0),
            remainder: 0.01,
            maximum_evaluations: 1_000_000_000,
        }
    }
}

impl Nested {
    /// Live points of a run over so many dimensions: even, and half of them span the space with some to spare.
    fn live(wanted: usize, dimension: usize) -> usize {
        wanted.max(4 * dimension + 8).next_multiple_of(2)
    }

    /// Live points of each run that reach the wanted error, from a first, smaller run; and what that cost.
    fn enough<T: Target>(
        &self,
        problem: &Problem<'_, T>,
        watch: &Watch,
    ) -> Result<(usize, u64), EvidenceError> {
        let dimension = problem.target.dimension();
        let least = Self::live((self.live_points / 4).min(FIRST_LIVE_POINTS), dimension);
        if least >= self.live_points {
            return Ok((least, 0));
        }
        let pilot = run::run(self, problem, watch, self.runs, least)?;
        let information = shrinkage::integrate(&pilot.dead, problem.seed, self.runs).information;
        let wanted = information / (self.error * self.error) / self.runs as f64;
        let wanted = (wanted.ceil() as usize).clamp(least, self.live_points);
        Ok((Self::live(wanted, dimension), pilot.evaluations))
    }
}

impl<T: Target> Estimator<T> for Nested {
    fn family(&self) -> &'static EstimatorFamily {
        &FAMILY
    }

    fn estimate(&self, problem: &Problem<'_, T>, watch: &Watch) -> Result<Estimate, EvidenceError> {
        if self.runs == 0 || self.live_points < 8 || !(self.error > 0.0) {
            return Err(EvidenceError::Setting {
                setting: "nested",
                rule: "at least 1 run of at least 8 live points, with an error above 0",
                value: format!("{} runs of {}, {}", self.runs, self.live_points, self.error),
            });
        }
        let (live, first) = self.enough(problem, watch)?;
        let runs: Vec<_> = (0..self.runs)
            .into_par_iter()
            .map(|index| {
                let run = run::run(self, problem, watch, index, live)?;
                let integral = shrinkage::integrate(&run.dead, problem.seed, index);
                Ok((run, integral))
            })
            .collect::<Result<_, EvidenceError>>()?;
        let count = runs.len() as f64;
        let values: Vec<f64> = runs.iter().map(|(_, integral)| integral.log_evidence).collect();
        let (mean, scatter) = mean_and_variance(&values);
        let simulated = runs.iter().map(|(_, integral)| integral.variance).sum::<f64>() / count;
        let uniforms: Vec<f64> = runs.iter().flat_map(|(run, _)| run.insertions.iter().copied()).collect();
        let insertion = kolmogorov_p_value(uniforms);
        let mut estimate = Estimate::new(
            mean,
            (scatter.max(simulated) / count).sqrt(),
            first + runs.iter().map(|(run, _)| run.evaluations).sum::<u64>(),
        );
        estimate.information =
            Some(runs.iter().map(|(_, integral)| integral.information).sum::<f64>() / count);
        estimate.insertion_p_value = Some(insertion);
        estimate.runs = values;
        if insertion < LEAST_INSERTION_PROBABILITY {
            estimate = estimate.doubted(format!(
                "the places where new points were inserted are not uniform (probability {insertion:.0e}): the draws inside \
                 the bound depend on each other; the evidence may be off by more than its error"
            ));
        }
        Ok(estimate)
    }
}
