//! Autocovariance and integrated autocorrelation time.

use super::ranks::mean;

/// Biased autocovariance Σ (xᵢ − m)(xᵢ₊ₜ − m) / n at lag `lag`, about the mean `centre`; 0 past the end.
pub fn autocovariance(values: &[f64], centre: f64, lag: usize) -> f64 {
    let count = values.len();
    if lag >= count {
        return 0.0;
    }
    let sum: f64 =
        values[..count - lag].iter().zip(&values[lag..]).map(|(a, b)| (a - centre) * (b - centre)).sum();
    sum / count as f64
}

/// An integrated autocorrelation time and how far it can be trusted.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AutocorrelationTime {
    /// τ in units of the draws' spacing: a chain of n draws is worth n/τ independent ones. At least 1 for white noise
    /// up to its estimate's error; it may fall below 1 for antithetic chains.
    pub time: f64,
    /// Lag at which the sum was cut.
    pub window: usize,
    /// Whether the window closed within the chain; if not, `time` is a lower bound.
    pub closed: bool,
}

/// Integrated autocorrelation time τ = 1 + 2 Σ ρ(t), summed to the smallest window M with M ≥ c·τ(M), c = 5
/// (Sokal 1997, "Monte Carlo methods in statistical mechanics", §3).
///
/// The autocovariances of all `series` (each of its own mean) are averaged before the sum, as for the means of several
/// ensembles. Cost: length · window. Relative error: about √(2(2M + 1)/n) (the same). A constant series gives τ = n.
pub fn integrated_autocorrelation_time<C: AsRef<[f64]>>(series: &[C]) -> AutocorrelationTime {
    let centres: Vec<f64> = series.iter().map(|values| mean(values.as_ref())).collect();
    autocorrelation_time_about(series, &centres)
}

/// The same about given means. With one mean for all series, series that have not met have a long memory, as they should;
/// about its own mean each would look settled.
pub(crate) fn autocorrelation_time_about<C: AsRef<[f64]>>(
    series: &[C],
    centres: &[f64],
) -> AutocorrelationTime {
    const WINDOW_FACTOR: f64 = 5.0;
    let length = series.iter().map(|values| values.as_ref().len()).min().unwrap_or(0);
    let at = |lag: usize| -> f64 {
        series.iter().zip(centres).map(|(values, centre)| autocovariance(values.as_ref(), *centre, lag)).sum()
    };
    let variance = at(0);
    if length == 0 || !(variance > 0.0) {
        return AutocorrelationTime { time: length as f64, window: 0, closed: false };
    }
    let mut time = 1.0;
    for window in 1..length {
        time += 2.0 * at(window) / variance;
        if window as f64 >= WINDOW_FACTOR * time {
            return AutocorrelationTime { time, window, closed: true };
        }
    }
    AutocorrelationTime { time, window: length, closed: false }
}
