//! Where the chain has forgotten its start, told from the chain itself.

use crate::diagnostics::autocorrelation_time_about;
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
///
/// Variance and autocorrelation time are those of the last two thirds of the rest, about one mean for all ensembles: a
/// drift would widen its own error if the first part were in them, and ensembles that have not met would each look settled.
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
    let length = series.first().map_or(0, Vec::len).saturating_sub(dropped);
    if length < 8 {
        return (f64::INFINITY, f64::INFINITY);
    }
    let part = |from: usize, to: usize| -> Vec<&[f64]> {
        series.iter().map(|values| &values[dropped + from..dropped + to]).collect()
    };
    let late = part(length / 3, length);
    let centre = grand_mean(&late);
    let time = autocorrelation_time_about(&late, &vec![centre; late.len()]);
    if !time.closed {
        return (f64::INFINITY, f64::INFINITY);
    }
    let squares =
        late.iter().flat_map(|values| values.iter()).map(|value| (value - centre) * (value - centre));
    let variance = squares.sum::<f64>() / (late.len() * late[0].len()) as f64;
    let (quarter, half) = (length / 4, length / 2);
    let difference = grand_mean(&part(0, quarter)) - grand_mean(&part(length - half, length));
    let per_step = variance * time.time.max(1.0) / series.len() as f64;
    let error = (per_step / quarter as f64 + per_step / half as f64).sqrt();
    (difference.abs() / error, time.time.max(1.0))
}

/// Mean over all series, which are equally long.
fn grand_mean(series: &[&[f64]]) -> f64 {
    let sums = series.iter().map(|values| values.iter().sum::<f64>() / values.len() as f64);
    sums.sum::<f64>() / series.len() as f64
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::diagnostics::Shape;
    use crate::moves::Random;
    use rand::SeedableRng;
    use rand_distr::{Distribution, StandardNormal};

    /// Four ensembles of eight walkers: autoregressive of memory `memory` and unit variance about `start`·exp(−t/`decay`).
    fn columns(steps: usize, memory: f64, start: f64, decay: f64) -> Columns {
        let shape = Shape { ensembles: 4, walkers: 8, steps };
        let mut random = Random::seed_from_u64(7);
        let mut normal = || -> f64 { StandardNormal.sample(&mut random) };
        let mut made = || {
            let mut values = Vec::with_capacity(shape.rows());
            for _ in 0..shape.ensembles {
                let mut walkers: Vec<f64> = (0..shape.walkers).map(|_| normal()).collect();
                for step in 0..steps {
                    for walker in &mut walkers {
                        *walker = memory * *walker + (1.0 - memory * memory).sqrt() * normal();
                    }
                    let offset = start * (-(step as f64) / decay).exp();
                    values.extend(walkers.iter().map(|walker| walker + offset));
                }
            }
            values
        };
        Columns { shape, parameters: vec![made(), made()], log_posterior: made() }
    }

    #[test]
    fn a_stationary_chain_settles_at_once() {
        // The autocorrelation time of memory 0.6 is 4 steps.
        assert_eq!(settled(&columns(200, 0.6, 0.0, 1.0)), Some(20));
        assert_eq!(still_settled(&columns(200, 0.6, 0.0, 1.0)), 0);
    }

    /// An offset of twenty standard deviations that decays over 100 steps: after d steps the first quarter of the rest is off
    /// by more than its error until d is several decay times.
    #[test]
    fn a_start_far_away_has_to_be_forgotten() {
        assert_eq!(settled(&columns(150, 0.6, 20.0, 100.0)), None);
        let long = columns(2000, 0.6, 20.0, 100.0);
        let dropped = settled(&long).unwrap();
        assert!((400..=1000).contains(&dropped), "{dropped}");
        assert!((400..=1000).contains(&still_settled(&long)), "{}", still_settled(&long));
    }

    #[test]
    fn a_chain_shorter_than_its_memory_has_not_settled() {
        // The autocorrelation time of memory 0.99 is 199 steps.
        assert_eq!(settled(&columns(300, 0.99, 0.0, 1.0)), None);
        assert!(settled(&columns(20_000, 0.99, 0.0, 1.0)).is_some());
    }
}
