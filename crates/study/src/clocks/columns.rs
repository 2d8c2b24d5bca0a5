//! The clock contrast of every draw of a chain.

use super::{ClockContrasts, ClockScratch};
use crate::assemble::Posterior;
use oddwell_sampler::Chain;
use rayon::prelude::*;

/// One column a bin, with a number for every row of the chain: seconds a year. NaN where there is none, which is not to
/// be expected of a draw that has a likelihood.
pub(crate) fn clock_columns(
    contrasts: &ClockContrasts,
    posterior: &Posterior,
    chain: &Chain,
) -> Vec<Vec<f64>> {
    let bins = contrasts.bins.len();
    let steps = chain.kept_steps.len();
    // A walker that stays where it is keeps its clocks; so each is followed through its steps.
    let of_walkers: Vec<Vec<f64>> = (0..chain.ensembles * chain.walkers)
        .into_par_iter()
        .map(|walker| {
            let (ensemble, walker) = (walker / chain.walkers, walker % chain.walkers);
            let mut scratch = ClockScratch::default();
            let mut values = vec![0.0; posterior.map.slots()];
            let mut seconds = vec![f64::NAN; bins];
            let mut all = Vec::with_capacity(steps * bins);
            let mut before: Option<&[f64]> = None;
            for step in 0..steps {
                let row = (ensemble * steps + step) * chain.walkers + walker;
                let point = &chain.points[row * chain.dimension..(row + 1) * chain.dimension];
                if before != Some(point) {
                    posterior.map.fill(point, &mut values);
                    if contrasts.seconds_per_year(&values, &mut scratch, &mut seconds).is_err() {
                        seconds.fill(f64::NAN);
                    }
                    before = Some(point);
                }
                all.extend_from_slice(&seconds);
            }
            all
        })
        .collect();
    let column = |bin: usize| {
        let rows = (0..chain.len()).map(|row| {
            let (group, walker) = (row / chain.walkers, row % chain.walkers);
            let (ensemble, step) = (group / steps, group % steps);
            of_walkers[ensemble * chain.walkers + walker][step * bins + bin]
        });
        rows.collect()
    };
    (0..bins).map(column).collect()
}
