//! Potential scale reduction R̂.

use super::ranks::{Chains, Order, ScoreTable, Scores, mean, squares_about};

/// Rank-normalised split R̂: the larger of that of the rank-normalised draws (location) and that of their rank-normalised
/// distances from the median (scale) (Vehtari et al. 2021, eqs. 4 and §3).
///
/// `chains`: one slice a chain, equal lengths of at least 4, at least one chain (its halves are then compared).
/// NaN where that does not hold, where a value is not finite, and for constant draws.
pub fn rank_normalised_split_rhat<C: AsRef<[f64]>>(chains: &[C]) -> f64 {
    let Some(gathered) = Chains::gather(chains).filter(|gathered| gathered.length >= 4) else {
        return f64::NAN;
    };
    rank_normalised(&gathered.split())
}

/// R̂ of split chains, without ranks: cheap, for a first look.
pub fn split_rhat<C: AsRef<[f64]>>(chains: &[C]) -> f64 {
    match Chains::gather(chains).filter(|gathered| gathered.length >= 4) {
        Some(gathered) => classic(&gathered.split()),
        None => f64::NAN,
    }
}

/// The larger of bulk and folded R̂ of chains that are split already.
fn rank_normalised(split: &Chains) -> f64 {
    let table = ScoreTable::new(split.values.len());
    let scores = Scores::new(&Order::new(&split.values), &table);
    larger(classic(&split.with(scores.bulk)), classic(&split.with(scores.folded)))
}

/// The larger of two; NaN if one is, which `f64::max` would hide.
pub(crate) fn larger(a: f64, b: f64) -> f64 {
    if a.is_nan() || b.is_nan() { f64::NAN } else { a.max(b) }
}

/// √((B/W + N − 1)/N), B = N · variance of the chain means, W = mean of the chain variances (Gelman & Rubin 1992).
pub(crate) fn classic(chains: &Chains) -> f64 {
    let length = chains.length as f64;
    let means = chains.means();
    let within = chains.centred(&means).autocovariance(0) * length / (length - 1.0);
    let between = length * squares_about(&means, mean(&means)) / (means.len() as f64 - 1.0);
    ((between / within + length - 1.0) / length).sqrt()
}
