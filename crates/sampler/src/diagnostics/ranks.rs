//! Rank normalisation and splitting (Vehtari et al. 2021, eq. 14 and §3).

use super::quantiles::quantile_of_sorted;
use crate::priors::normal_quantile;

/// Values in rising order, each with its place among the draws.
pub(crate) struct Order(Vec<(f64, u32)>);

impl Order {
    /// Sorts; the values must be finite.
    pub(crate) fn new(values: &[f64]) -> Self {
        let mut order: Vec<(f64, u32)> =
            values.iter().enumerate().map(|(place, value)| (*value, place as u32)).collect();
        order.sort_unstable_by(|a, b| a.0.total_cmp(&b.0));
        Self(order)
    }

    /// The values in rising order.
    pub(crate) fn sorted(&self) -> Vec<f64> {
        self.0.iter().map(|(value, _)| *value).collect()
    }

    /// The order of the distances from `centre`: the draws on both sides of it merged, so nothing is sorted again.
    pub(crate) fn folded(&self, centre: f64) -> Self {
        let middle = self.0.partition_point(|(value, _)| *value < centre);
        let (below, above) = self.0.split_at(middle);
        let mut below = below.iter().rev().map(|(value, place)| ((value - centre).abs(), *place)).peekable();
        let mut above = above.iter().map(|(value, place)| ((value - centre).abs(), *place)).peekable();
        let mut merged = Vec::with_capacity(self.0.len());
        loop {
            let next = match (below.peek(), above.peek()) {
                (Some(low), Some(high)) if low.0 <= high.0 => below.next(),
                (_, Some(_)) => above.next(),
                _ => below.next(),
            };
            match next {
                Some(next) => merged.push(next),
                None => return Self(merged),
            }
        }
    }

    /// Normal scores of the average ranks, Φ⁻¹((r − 3/8)/(S + 1/4)) (Blom 1958), in the order of the draws.
    pub(crate) fn scores(&self, table: &ScoreTable) -> Vec<f64> {
        let mut scores = vec![0.0; self.0.len()];
        let mut from = 0;
        while from < self.0.len() {
            let value = self.0[from].0;
            let mut to = from + 1;
            while to < self.0.len() && self.0[to].0 == value {
                to += 1;
            }
            let score = table.shared(from, to);
            for (_, place) in &self.0[from..to] {
                scores[*place as usize] = score;
            }
            from = to;
        }
        scores
    }
}

/// Normal scores of all ranks among a number of draws: the same for every parameter, and dear to compute.
pub(crate) struct ScoreTable(Vec<f64>);

impl ScoreTable {
    /// Scores for `count` draws.
    pub(crate) fn new(count: usize) -> Self {
        Self((0..count).map(|place| score(place as f64 + 1.0, count)).collect())
    }

    /// Score of the average rank of the places `from..to`, counted from 0.
    fn shared(&self, from: usize, to: usize) -> f64 {
        if to == from + 1 { self.0[from] } else { score(0.5 * (from + 1 + to) as f64, self.0.len()) }
    }
}

fn score(rank: f64, count: usize) -> f64 {
    normal_quantile((rank - 0.375) / (count as f64 + 0.25))
}

/// Normal scores of values and of their distances from the median.
pub(crate) struct Scores {
    pub(crate) bulk: Vec<f64>,
    pub(crate) folded: Vec<f64>,
}

impl Scores {
    /// Both kinds of scores from one sort.
    pub(crate) fn new(order: &Order, table: &ScoreTable) -> Self {
        let centre = quantile_of_sorted(&order.sorted(), 0.5);
        Self { bulk: order.scores(table), folded: order.folded(centre).scores(table) }
    }
}

/// Chains of equal length: blocks of `width` chains each, one block after the other; within a block draw after draw, and
/// of each draw the chains side by side. Plain chains are blocks of width 1, ensembles blocks of as many as walkers.
#[derive(Debug, Clone)]
pub(crate) struct Chains {
    pub(crate) values: Vec<f64>,
    /// Draws of a chain.
    pub(crate) length: usize,
    /// Chains side by side.
    pub(crate) width: usize,
}

impl Chains {
    /// Plain chains, or `None` where there is none, their lengths differ, or a value is not finite.
    pub(crate) fn gather<C: AsRef<[f64]>>(chains: &[C]) -> Option<Self> {
        let length = chains.first()?.as_ref().len();
        let mut values = Vec::with_capacity(length * chains.len());
        for chain in chains {
            let chain = chain.as_ref();
            if chain.len() != length {
                return None;
            }
            values.extend_from_slice(chain);
        }
        values.iter().all(|value| value.is_finite()).then_some(Self { values, length, width: 1 })
    }

    /// Each chain cut in two halves; the middle draw of an odd length is dropped.
    pub(crate) fn split(&self) -> Self {
        let half = self.length / 2;
        let mut values = Vec::with_capacity(self.values.len());
        for block in self.blocks() {
            values.extend_from_slice(&block[..half * self.width]);
            values.extend_from_slice(&block[(self.length - half) * self.width..]);
        }
        Self { values, length: half, width: self.width }
    }

    /// The same chains with other values.
    pub(crate) fn with(&self, values: Vec<f64>) -> Self {
        Self { values, ..*self }
    }

    /// The blocks.
    pub(crate) fn blocks(&self) -> std::slice::ChunksExact<'_, f64> {
        self.values.chunks_exact((self.length * self.width).max(1))
    }

    /// Number of chains.
    pub(crate) fn count(&self) -> usize {
        self.values.len().checked_div(self.length).unwrap_or(0)
    }

    /// Whether all values agree to 1e-15.
    pub(crate) fn is_constant(&self) -> bool {
        let range = (f64::INFINITY, f64::NEG_INFINITY);
        let (low, high) =
            self.values.iter().fold(range, |(low, high), value| (low.min(*value), high.max(*value)));
        high - low < 1e-15
    }

    /// Mean of every chain.
    pub(crate) fn means(&self) -> Vec<f64> {
        let mut means = Vec::with_capacity(self.count());
        for block in self.blocks() {
            let mut sums = vec![0.0; self.width];
            for draw in block.chunks_exact(self.width) {
                for (sum, value) in sums.iter_mut().zip(draw) {
                    *sum += value;
                }
            }
            means.extend(sums.iter().map(|sum| sum / self.length as f64));
        }
        means
    }

    /// The chains less their means.
    pub(crate) fn centred(&self, means: &[f64]) -> Self {
        let mut values = self.values.clone();
        let blocks = values.chunks_exact_mut((self.length * self.width).max(1));
        for (block, centres) in blocks.zip(means.chunks_exact(self.width)) {
            for draw in block.chunks_exact_mut(self.width) {
                for (value, centre) in draw.iter_mut().zip(centres) {
                    *value -= centre;
                }
            }
        }
        self.with(values)
    }

    /// Mean over the chains of the biased autocovariance at a lag; of centred chains.
    pub(crate) fn autocovariance(&self, lag: usize) -> f64 {
        let shift = lag * self.width;
        let sum: f64 =
            self.blocks().map(|block| product_sum(&block[..block.len() - shift], &block[shift..])).sum();
        sum / self.values.len() as f64
    }
}

/// Σ aᵢ bᵢ in four interleaved sums, which the processor can add side by side.
pub(crate) fn product_sum(a: &[f64], b: &[f64]) -> f64 {
    let mut sums = [0.0; 4];
    let (a_chunks, b_chunks) = (a.chunks_exact(4), b.chunks_exact(4));
    let rest: f64 = a_chunks.remainder().iter().zip(b_chunks.remainder()).map(|(x, y)| x * y).sum();
    for (x, y) in a_chunks.zip(b_chunks) {
        for lane in 0..4 {
            sums[lane] += x[lane] * y[lane];
        }
    }
    sums.iter().sum::<f64>() + rest
}

/// Mean of a slice.
pub(crate) fn mean(values: &[f64]) -> f64 {
    values.iter().sum::<f64>() / values.len() as f64
}

/// Sum of squares about the mean.
pub(crate) fn squares_about(values: &[f64], mean: f64) -> f64 {
    values.iter().map(|value| (value - mean) * (value - mean)).sum()
}
