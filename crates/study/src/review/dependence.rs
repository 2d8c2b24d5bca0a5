//! What depends on what: correlations of all inferred quantities, ranked, and joint densities of the strongest.

use super::ChainTable;
use crate::assemble::Posterior;
use crate::record::Summary;
use oddwell_sampler::diagnostics::{JointDensity, joint_density};

/// Pairs in the ranking.
const RANKED: usize = 10;
/// Joint densities of the strongest pairs of all, and of the strongest that the departure is part of.
const PICTURED: (usize, usize) = (4, 4);

/// Correlations of the inferred quantities.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Dependence {
    /// The inferred quantities, in the study's order.
    pub names: Vec<String>,
    /// Pearson correlations, a row a quantity; null where a quantity does not spread.
    pub correlations: Vec<Vec<Option<f64>>>,
    /// The strongest pairs, the strongest first.
    pub ranked: Vec<RankedPair>,
    /// The strongest pairs of which the departure is a part.
    pub of_departure: Vec<RankedPair>,
    /// Joint densities of the first of both lists.
    pub pictures: Vec<JointPicture>,
}

/// A pair of quantities.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RankedPair {
    /// Index of the first in [`Dependence::names`].
    pub first: usize,
    /// Index of the second; the departure's, where it is one of the two.
    pub second: usize,
    /// Their correlation.
    pub correlation: f64,
}

/// The joint density of a pair.
#[derive(Clone, Debug, PartialEq)]
pub struct JointPicture {
    /// Whose.
    pub pair: RankedPair,
    /// The density.
    pub density: JointDensity,
}

pub(super) fn dependence(summary: &Summary, chain: &ChainTable, posterior: Option<&Posterior>) -> Dependence {
    let inferred: Vec<(&String, &Vec<f64>)> =
        chain.names.iter().zip(&chain.columns).filter(|(name, _)| !name.starts_with("derived.")).collect();
    let names: Vec<String> = inferred.iter().map(|(name, _)| (*name).clone()).collect();
    let columns: Vec<Option<Vec<f64>>> = inferred.iter().map(|(_, column)| standardised(column)).collect();
    let product = |one: &[f64], other: &[f64]| one.iter().zip(other).map(|(x, y)| x * y).sum::<f64>();
    let mut correlations = vec![vec![None; names.len()]; names.len()];
    let mut pairs = Vec::new();
    let departure = |index: usize| summary.departure_parameters.contains(&names[index]);
    for i in 0..names.len() {
        for j in 0..=i {
            let found = columns[i].as_ref().zip(columns[j].as_ref()).map(|(one, other)| product(one, other));
            let found = found.map(|value| if i == j { 1.0 } else { value.clamp(-1.0, 1.0) });
            correlations[i][j] = found;
            correlations[j][i] = found;
            if let Some(correlation) = found.filter(|_| i != j) {
                let (first, second) = if departure(j) && !departure(i) { (i, j) } else { (j, i) };
                pairs.push(RankedPair { first, second, correlation });
            }
        }
    }
    pairs.sort_by(|one, other| other.correlation.abs().total_cmp(&one.correlation.abs()));
    let of_departure: Vec<RankedPair> = pairs
        .iter()
        .filter(|pair| departure(pair.first) || departure(pair.second))
        .take(RANKED)
        .copied()
        .collect();
    let ranked: Vec<RankedPair> = pairs.into_iter().take(RANKED).collect();
    let mut chosen: Vec<RankedPair> = ranked.iter().take(PICTURED.0).copied().collect();
    for pair in of_departure.iter().take(PICTURED.1) {
        if !chosen.contains(pair) {
            chosen.push(*pair);
        }
    }
    let support = |name: &str| {
        let index = posterior.and_then(|posterior| posterior.hypothesis.free_index(name));
        let everywhere = (f64::NEG_INFINITY, f64::INFINITY);
        posterior.zip(index).map_or(everywhere, |(posterior, index)| posterior.priors.support(index))
    };
    let picture = |pair: RankedPair| {
        let (first, second) = (inferred[pair.first], inferred[pair.second]);
        let effective = [first.0, second.0]
            .into_iter()
            .filter_map(|name| summary.parameters.get(name)?.ess)
            .fold(chain.len() as f64, f64::min);
        let supports = (support(first.0), support(second.0));
        let density = joint_density((first.1, second.1), effective, supports)?;
        Some(JointPicture { pair, density })
    };
    let pictures = chosen.into_iter().filter_map(picture).collect();
    Dependence { names, correlations, ranked, of_departure, pictures }
}

/// The column less its mean, divided so that its square sums to 1; none where it does not spread.
fn standardised(column: &[f64]) -> Option<Vec<f64>> {
    let mean = column.iter().sum::<f64>() / column.len() as f64;
    let norm = column.iter().map(|value| (value - mean).powi(2)).sum::<f64>().sqrt();
    (norm > 0.0 && norm.is_finite()).then(|| column.iter().map(|value| (value - mean) / norm).collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_in_step_correlate_fully() {
        let one = standardised(&[1.0, 2.0, 4.0]).expect("it spreads");
        let other = standardised(&[-2.0, -4.0, -8.0]).expect("it spreads");
        let correlation: f64 = one.iter().zip(&other).map(|(x, y)| x * y).sum();
        assert!((correlation + 1.0).abs() < 1e-15, "{correlation}");
        assert_eq!(standardised(&[3.0, 3.0]), None);
    }
}
