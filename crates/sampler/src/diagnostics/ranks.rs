//! Rank normalisation and splitting (Vehtari et al. 2021, eqs. 14 and §3).

use crate::priors::normal_quantile;

/// Replaces values by normal scores of their average ranks: Φ⁻¹((r − 3/8)/(S + 1/4)) (Blom 1958).
pub(crate) fn rank_normalise(values: &[f64]) -> Vec<f64> {
    let count = values.len();
    let mut order: Vec<u32> = (0..count as u32).collect();
    order.sort_unstable_by(|a, b| values[*a as usize].total_cmp(&values[*b as usize]));
    let mut scores = vec![0.0; count];
    let mut from = 0;
    while from < count {
        let value = values[order[from] as usize];
        let mut to = from + 1;
        while to < count && values[order[to] as usize] == value {
            to += 1;
        }
        // Ranks from + 1 … to share their average.
        let rank = 0.5 * (from + 1 + to) as f64;
        let score = normal_quantile((rank - 0.375) / (count as f64 + 0.25));
        for index in &order[from..to] {
            scores[*index as usize] = score;
        }
        from = to;
    }
    scores
}

/// Chains of equal length in one buffer, one after the other.
#[derive(Debug, Clone)]
pub(crate) struct Chains {
    /// All values, chain by chain.
    pub(crate) values: Vec<f64>,
    /// Length of one chain.
    pub(crate) length: usize,
}

impl Chains {
    /// The chains, or `None` where there is none, their lengths differ, or a value is not finite.
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
        values.iter().all(|value| value.is_finite()).then_some(Self { values, length })
    }

    /// Each chain cut in two halves; the middle draw of an odd length is dropped.
    pub(crate) fn split(&self) -> Self {
        let half = self.length / 2;
        let mut values = Vec::with_capacity(self.values.len());
        for chain in self.iter() {
            values.extend_from_slice(&chain[..half]);
            values.extend_from_slice(&chain[self.length - half..]);
        }
        Self { values, length: half }
    }

    /// The same chains with other values.
    pub(crate) fn with(&self, values: Vec<f64>) -> Self {
        Self { values, length: self.length }
    }

    /// The chains as slices.
    pub(crate) fn iter(&self) -> std::slice::ChunksExact<'_, f64> {
        self.values.chunks_exact(self.length.max(1))
    }

    /// Number of chains.
    pub(crate) fn count(&self) -> usize {
        if self.length == 0 { 0 } else { self.values.len() / self.length }
    }
}

/// Mean of a slice.
pub(crate) fn mean(values: &[f64]) -> f64 {
    values.iter().sum::<f64>() / values.len() as f64
}

/// Sum of squares about the mean.
pub(crate) fn squares_about(values: &[f64], mean: f64) -> f64 {
    values.iter().map(|value| (value - mean) * (value - mean)).sum()
}
