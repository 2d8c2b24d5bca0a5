//! Tempered stepping stones (Xie, Lewis, Fan, Kuo & Chen 2011, Syst. Biol. 60, 150).

mod ladder;

use crate::error::EvidenceError;
use crate::estimate::Estimate;
use crate::estimator::{Estimator, EstimatorFamily};
use crate::level::Level;
use crate::numbers::{log_mean_exp, log_sum_exp, mean_and_variance};
use crate::problem::{Problem, Watch};
use crate::walk::{Cloud, Sweeps, Walk};
use oddwell_sampler::Target;
use rand::RngExt;
use rayon::prelude::*;

/// Registry entry.
pub(crate) const FAMILY: EstimatorFamily = EstimatorFamily {
    name: "stepping",
    summary: "stepping stones from prior to posterior, by rising powers of the likelihood (Xie et al. 2011)",
    manual: "\
Z = Π r over a ladder of powers 0 = β₀ < β₁ < … < β_K = 1, r = the mean of L^(β_k − β_(k−1)) over draws of prior × L^β_(k−1).
A first run chooses the ladder: every step so long that the weights of its draws have a squared coefficient of variation of ¼.
Then independent runs climb it, each with draws of its own, which are resampled by their weights at every rung and walk, with
the sampler's own moves, until they have forgotten where they started. The mean of Z over runs counts: it is unbiased.

The error bar is the larger of two: the scatter between runs, and the scatter within runs that the weights imply.

Where it ends: a mode that no draw of the prior leads to is missed, as by any method that starts from the prior.",
};

/// Stepping stones and their settings.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SteppingStones {
    /// Draws at every rung of each run; at least 4·dimension + 8 are used.
    pub draws: usize,
    /// Independent runs, side by side.
    pub runs: usize,
    /// How long draws walk at every rung.
    pub sweeps: Sweeps,
    /// Squared coefficient of variation of the weights that sets how far the rungs lie apart.
    pub spread: f64,
}

impl Default for SteppingStones {
    fn default() -> Self {
        Self { draws: 400, runs: 8, sweeps: Sweeps::Anew(6.0), spread: 0.25 }
    }
}

impl<T: Target> Estimator<T> for SteppingStones {
    fn family(&self) -> &'static EstimatorFamily {
        &FAMILY
    }

    fn estimate(&self, problem: &Problem<'_, T>, watch: &Watch) -> Result<Estimate, EvidenceError> {
        if self.runs < 2 || self.draws < 8 || !(self.spread > 0.0) {
            return Err(EvidenceError::Setting {
                setting: "stepping",
                rule: "at least 2 runs of at least 8 draws, with a spread above 0",
                value: format!("{} runs of {}, {}", self.runs, self.draws, self.spread),
            });
        }
        let (ladder, first) = ladder::choose(self, problem, watch)?;
        let runs: Vec<Climb> = (0..self.runs)
            .into_par_iter()
            .map(|index| climb(self, problem, watch, &ladder, index + 1))
            .collect::<Result<_, EvidenceError>>()?;
        let count = runs.len() as f64;
        let values: Vec<f64> = runs.iter().map(|run| run.log_evidence).collect();
        let log_evidence = log_sum_exp(&values) - count.ln();
        let within = runs.iter().map(|run| run.variance).sum::<f64>() / count;
        let between = mean_and_variance(&values).1;
        let evaluations = first + runs.iter().map(|run| run.evaluations).sum::<u64>();
        let mut estimate = Estimate::new(log_evidence, (within.max(between) / count).sqrt(), evaluations);
        estimate.runs = values;
        estimate.ladder = ladder;
        Ok(estimate)
    }
}

struct Climb {
    log_evidence: f64,
    variance: f64,
    evaluations: u64,
}

/// How many draws a rung has.
fn draws<T: Target>(settings: &SteppingStones, problem: &Problem<'_, T>) -> usize {
    settings.draws.max(4 * problem.target.dimension() + 8) / 2 * 2
}

/// One run up a given ladder.
fn climb<T: Target>(
    settings: &SteppingStones,
    problem: &Problem<'_, T>,
    watch: &Watch,
    ladder: &[f64],
    index: usize,
) -> Result<Climb, EvidenceError> {
    let mut walk = Walk::new(problem, watch, index)?;
    let count = draws(settings, problem);
    let mut cloud = walk.draws(problem.priors, count)?;
    let (mut log_evidence, mut variance) = (0.0, 0.0);
    for step in ladder.windows(2) {
        let log_weights = log_weights(&cloud, step[1] - step[0]);
        let (ratio, spread) = log_mean_exp(&log_weights);
        log_evidence += ratio;
        variance += spread / count as f64;
        if step[1] < 1.0 {
            cloud = advanced(&mut walk, &cloud, &log_weights, step[1], settings.sweeps)?;
        }
    }
    Ok(Climb { log_evidence, variance, evaluations: walk.evaluations })
}

fn log_weights(cloud: &Cloud, step: f64) -> Vec<f64> {
    cloud.heights.iter().map(|height| step * height.log_likelihood).collect()
}

/// Draws at the next power: resampled by weight, then spread, one half while the other stands still.
fn advanced<T: Target>(
    walk: &mut Walk<'_, T>,
    cloud: &Cloud,
    log_weights: &[f64],
    power: f64,
    sweeps: Sweeps,
) -> Result<Cloud, EvidenceError> {
    let mut chosen = resampled(walk, log_weights);
    // Copies of a draw stand side by side; even and odd places keep the halves alike.
    let (mut first, mut second) = (vec![], vec![]);
    for (place, from) in chosen.drain(..).enumerate() {
        if place % 2 == 0 { first.push(from) } else { second.push(from) }
    }
    let (mut first, mut second) = (cloud.select(&first), cloud.select(&second));
    walk.spread(&mut first, &second.points, Level::Tempered(power), sweeps)?;
    walk.spread(&mut second, &first.points, Level::Tempered(power), sweeps)?;
    first.points.append(&mut second.points);
    first.heights.append(&mut second.heights);
    Ok(first)
}

/// Systematic resampling (Kitagawa 1996, J. Comput. Graph. Stat. 5, 1): every draw as often as its weight says, to within one.
fn resampled<T: Target>(walk: &mut Walk<'_, T>, log_weights: &[f64]) -> Vec<usize> {
    let total = log_sum_exp(log_weights);
    let count = log_weights.len();
    let mut chosen = Vec::with_capacity(count);
    let (mut next, mut sum) = (walk.random.random::<f64>(), 0.0);
    let mut last = 0;
    for (place, weight) in log_weights.iter().enumerate() {
        let share = count as f64 * (weight - total).exp();
        sum += share;
        if share > 0.0 {
            last = place;
        }
        while next < sum && chosen.len() < count {
            chosen.push(place);
            next += 1.0;
        }
    }
    // Rounding can leave the sum a little below the count.
    chosen.resize(count, last);
    chosen
}
