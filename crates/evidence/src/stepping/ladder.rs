//! The ladder of powers, chosen from a run of its own.

use super::{SteppingStones, advanced, draws, log_weights};
use crate::error::EvidenceError;
use crate::numbers::log_mean_exp;
use crate::problem::{Problem, Watch};
use crate::walk::{Cloud, Walk};
use oddwell_sampler::Target;

/// More rungs than any sensible ladder has.
const MOST_RUNGS: usize = 1000;

/// Powers from 0 to 1, and the evaluations that took.
pub(super) fn choose<T: Target>(
    settings: &SteppingStones,
    problem: &Problem<'_, T>,
    watch: &Watch,
) -> Result<(Vec<f64>, u64), EvidenceError> {
    let mut walk = Walk::new(problem, watch, 0)?;
    let mut cloud = walk.draws(problem.priors, draws(settings, problem))?;
    let mut ladder = vec![0.0];
    let mut power = 0.0;
    while power < 1.0 {
        if ladder.len() > MOST_RUNGS {
            return Err(EvidenceError::TooLong {
                estimator: super::FAMILY.name,
                evaluations: watch.evaluations(),
            });
        }
        let next = power + longest_step(&cloud, 1.0 - power, settings.spread);
        let weights = log_weights(&cloud, next - power);
        power = next;
        ladder.push(power);
        if power < 1.0 {
            cloud = advanced(&mut walk, &cloud, &weights, power, settings.sweeps)?;
        }
    }
    Ok((ladder, walk.evaluations))
}

/// The longest step, up to `most`, whose weights vary no more than `spread`; by bisection of its logarithm.
///
/// Draws of likelihood zero have no weight at any step: what they add to the spread is no reason for a shorter one.
fn longest_step(cloud: &Cloud, most: f64, spread: f64) -> f64 {
    let heights: Vec<f64> = cloud
        .heights
        .iter()
        .map(|height| height.log_likelihood)
        .filter(|height| *height > f64::NEG_INFINITY)
        .collect();
    let varies = |step: f64| {
        let weights: Vec<f64> = heights.iter().map(|height| step * height).collect();
        log_mean_exp(&weights).1
    };
    if heights.len() < 2 || varies(most) <= spread {
        return most;
    }
    let (mut low, mut high) = ((1e-300f64).ln(), most.ln());
    while high - low > 1e-3 {
        let middle = 0.5 * (low + high);
        if varies(middle.exp()) > spread { high = middle } else { low = middle }
    }
    low.exp()
}
