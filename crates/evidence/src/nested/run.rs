//! One run: from the prior up, half of the live points at a time.

use super::Nested;
use super::insertion::Insertions;
use super::shrinkage::Dead;
use crate::error::EvidenceError;
use crate::level::Level;
use crate::numbers::{log_add, log_sum_exp};
use crate::problem::{Problem, Watch};
use crate::walk::{Cloud, Walk};
use oddwell_sampler::Target;
use rand::RngExt;

/// What a run leaves.
#[derive(Debug)]
pub(super) struct Run {
    /// Points in the order in which they died, lowest likelihood first, the last live ones included.
    pub(super) dead: Vec<Dead>,
    /// Where new points were inserted, as numbers that should be uniform.
    pub(super) insertions: Vec<f64>,
    pub(super) evaluations: u64,
}

/// Runs with so many live points, an even number, until they can add no more than the remainder.
pub(super) fn run<T: Target>(
    settings: &Nested,
    problem: &Problem<'_, T>,
    watch: &Watch,
    index: usize,
    live: usize,
) -> Result<Run, EvidenceError> {
    let mut walk = Walk::new(problem, watch, index)?;
    let mut cloud = walk.draws(problem.priors, live)?;
    let mut dead: Vec<Dead> = Vec::new();
    let mut insertions = Insertions::default();
    let (mut log_mass, mut log_evidence) = (0.0, f64::NEG_INFINITY);
    loop {
        cloud = sorted(&cloud);
        if left(&cloud) + log_mass < log_evidence + settings.remainder.ln() {
            break;
        }
        if walk.evaluations > settings.maximum_evaluations {
            let evaluations = watch.evaluations();
            return Err(EvidenceError::TooLong { estimator: super::FAMILY.name, evaluations });
        }
        let dying = live / 2;
        for (place, height) in cloud.heights[..dying].iter().enumerate() {
            let alive = live - place;
            let step = -(-1.0 / alive as f64).exp_m1();
            log_evidence = log_add(log_evidence, height.log_likelihood + log_mass + step.ln());
            log_mass -= 1.0 / alive as f64;
            dead.push(Dead { log_likelihood: height.log_likelihood, alive });
        }
        let bound = cloud.heights[dying - 1];
        let mut survivors = cloud.select(&(dying..live).collect::<Vec<_>>());
        let copied: Vec<usize> = (0..dying).map(|_| walk.random.random_range(0..live - dying)).collect();
        let mut movers = survivors.select(&copied);
        walk.spread(&mut movers, &survivors.points, Level::Above(bound), settings.sweeps)?;
        insertions.add(&survivors.heights, &movers.heights, &mut walk.random);
        survivors.points.extend(movers.points);
        survivors.heights.extend(movers.heights);
        cloud = survivors;
    }
    dead.extend(
        cloud
            .heights
            .iter()
            .enumerate()
            .map(|(place, height)| Dead { log_likelihood: height.log_likelihood, alive: live - place }),
    );
    Ok(Run { dead, insertions: insertions.uniforms, evaluations: walk.evaluations })
}

fn sorted(cloud: &Cloud) -> Cloud {
    let mut order: Vec<usize> = (0..cloud.heights.len()).collect();
    order.sort_by(|a, b| cloud.heights[*a].order(&cloud.heights[*b]));
    cloud.select(&order)
}

/// What the live points can still add, over the prior mass left: twice their mean likelihood, or a tenth of the highest,
/// whichever is more.
fn left(cloud: &Cloud) -> f64 {
    let heights: Vec<f64> = cloud.heights.iter().map(|height| height.log_likelihood).collect();
    let mean = log_sum_exp(&heights) - (heights.len() as f64).ln();
    let highest = heights.last().copied().unwrap_or(f64::NEG_INFINITY);
    (mean + 2f64.ln()).max(highest - 10f64.ln())
}
