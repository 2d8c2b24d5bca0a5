//! Where the walkers went: an ensemble's middle and spread along its steps.

use super::ChainTable;
use oddwell_sampler::diagnostics::quantile;

/// Stretches of steps that a trace is cut into.
const STRETCHES: usize = 60;

/// The trace of one quantity.
#[derive(Clone, Debug, PartialEq)]
pub struct Trace {
    /// Its name.
    pub name: String,
    /// By ensemble.
    pub ensembles: Vec<Vec<TraceBand>>,
}

/// What the walkers of an ensemble did during some steps.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TraceBand {
    /// The middle of the stretch, in steps.
    pub step: f64,
    /// The 16 % quantile of its draws.
    pub low: f64,
    /// The median.
    pub middle: f64,
    /// The 84 % quantile.
    pub high: f64,
}

pub(super) fn traces(chain: &ChainTable) -> Vec<Trace> {
    let mut ensembles = chain.ensemble.clone();
    ensembles.dedup();
    ensembles.sort_unstable();
    ensembles.dedup();
    let stretches: Vec<Vec<(f64, Vec<usize>)>> =
        ensembles.iter().map(|&ensemble| cut(chain, ensemble)).collect();
    let of = |(name, column): (&String, &Vec<f64>)| Trace {
        name: name.clone(),
        ensembles: stretches
            .iter()
            .map(|stretches| stretches.iter().map(|(step, rows)| band(*step, rows, column)).collect())
            .collect(),
    };
    chain.names.iter().zip(&chain.columns).map(of).collect()
}

/// Stretches of an ensemble's steps: the middle, and the rows that fall into it.
fn cut(chain: &ChainTable, ensemble: u64) -> Vec<(f64, Vec<usize>)> {
    let rows: Vec<usize> = (0..chain.len()).filter(|&row| chain.ensemble[row] == ensemble).collect();
    let first = rows.iter().map(|&row| chain.step[row]).min().unwrap_or(0);
    let last = rows.iter().map(|&row| chain.step[row]).max().unwrap_or(0);
    let count = STRETCHES.min((last - first + 1) as usize);
    let width = (last - first + 1) as f64 / count as f64;
    let mut stretches: Vec<(f64, Vec<usize>)> =
        (0..count).map(|index| (first as f64 + width * (index as f64 + 0.5), Vec::new())).collect();
    for row in rows {
        let index = ((chain.step[row] - first) as f64 / width) as usize;
        stretches[index.min(count - 1)].1.push(row);
    }
    stretches.retain(|(_, rows)| !rows.is_empty());
    stretches
}

fn band(step: f64, rows: &[usize], column: &[f64]) -> TraceBand {
    let values: Vec<f64> = rows.iter().map(|&row| column[row]).collect();
    TraceBand {
        step,
        low: quantile(&values, 0.16),
        middle: quantile(&values, 0.5),
        high: quantile(&values, 0.84),
    }
}
