//! Where the chain has forgotten its start, told from the chain itself.

use crate::diagnostics::integrated_autocorrelation_time;
use crate::history::Columns;
use rayon::prelude::*;

/// Integrated autocorrelation times that must lie behind the end of warm-up.
const TIMES_BEFORE: f64 = 2.0;

/// Integrated autocorrelation times that must follow it, so that the time itself is known (to about a half).
const TIMES_AFTER: f64 = 10.0;

/// Standard errors by which the first and the last part of what is kept may differ. With some twenty quantities looked
/// at, a settled chain fails one look in a thousand, and is then looked at again.
const DRIFT: f64 = 4.0;

/// Shares of the history that are tried as warm-up.
const SHARES: [f64; 5] = [0.1, 0.2, 0.3, 0.4, 0.5];

/// The number of remembered steps to drop, or `None` if the chain has not settled yet.
///
/// Looked at are the means over each ensemble, step by step, of every parameter and of the log posterior. Of the shares
/// 10 %, 20 % … 50 % of the history, the first counts after which, for every quantity,
/// 1. at least [`TIMES_BEFORE`] integrated autocorrelation times lie before and [`TIMES_AFTER`] after it, and
/// 2. the means of the first quarter and of the last half of the rest agree within [`DRIFT`] standard errors
///    (Geweke 1992, with the standard errors from the autocorrelation time).
pub(crate) fn settled(columns: &Columns) -> Option<usize> {
    let series = series(columns);
    SHARES
        .iter()
        .map(|share| (share * columns.shape.steps as f64).ceil() as usize)
        .find(|dropped| series.par_iter().all(|quantity| is_settled(quantity, *dropped)))
}

/// The number of steps to drop from a history whose warm-up was dropped before: zero unless a drift shows.
pub(crate) fn still_settled(columns: &Columns) -> usize {
    let series = series(columns);
    let drifts = |dropped: usize| series.par_iter().any(|quantity| drift(quantity, dropped).0 > DRIFT);
    let candidates = SHARES.iter().map(|share| (share * columns.shape.steps as f64).ceil() as usize);
    std::iter::once(0).chain(candidates).find(|dropped| !drifts(*dropped)).unwrap_or(0)
}

/// Means over each ensemble of every parameter and of the log posterior: one vector of series a quantity.
fn series(columns: &Columns) -> Vec<Vec<Vec<f64>>> {
    let quantities: Vec<&Vec<f64>> = columns.parameters.iter().chain([&columns.log_posterior]).collect();
    let means =
        |values: &&Vec<f64>| columns.shape.ensemble_means(values).blocks().map(<[f64]>::to_vec).collect();
    quantities.par_iter().map(means).collect()
}

fn is_settled(series: &[Vec<f64>], dropped: usize) -> bool {
    let (drift, time) = drift(series, dropped);
    let kept = series.first().map_or(0, Vec::len).saturating_sub(dropped) as f64;
    drift < DRIFT && dropped as f64 >= TIMES_BEFORE * time && kept >= TIMES_AFTER * time
}

/// Difference between the first quarter and the last half, in standard errors, and the autocorrelation time; infinite
/// where the window of the time did not close.
fn drift(series: &[Vec<f64>], dropped: usize) -> (f64, f64) {
    let kept: Vec<&[f64]> = series.iter().map(|values| &values[dropped.min(values.len())..]).collect();
    let length = kept.first().map_or(0, |values| values.len());
    if length < 8 {
        return (f64::INFINITY, f64::INFINITY);
    }
    let time = integrated_autocorrelation_time(&kept);
    if !time.closed {
        return (f64::INFINITY, f64::INFINITY);
    }
    let mean = |part: &dyn Fn(&[f64]) -> std::ops::Range<usize>| {
        let means = kept.iter().map(|values| {
            let range = part(values);
            values[range.clone()].iter().sum::<f64>() / range.len() as f64
        });
        means.sum::<f64>() / kept.len() as f64
    };
    let (quarter, half) = (length / 4, length / 2);
    let difference = mean(&|_| 0..quarter) - mean(&|values| values.len() - half..values.len());
    let variance = kept
        .iter()
        .map(|values| {
            let centre = values.iter().sum::<f64>() / length as f64;
            values.iter().map(|value| (value - centre) * (value - centre)).sum::<f64>() / length as f64
        })
        .sum::<f64>()
        / kept.len() as f64;
    let per_step = variance * time.time.max(1.0) / kept.len() as f64;
    let error = (per_step / quarter as f64 + per_step / half as f64).sqrt();
    (difference.abs() / error, time.time.max(1.0))
}
