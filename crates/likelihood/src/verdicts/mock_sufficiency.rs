//! Whether there are enough mocks.

/// What the finite number of mocks behind a covariance costs.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct MockSufficiency {
    /// n_s.
    pub mocks: usize,
    /// n_d.
    pub rows: usize,
    /// n_θ.
    pub determined: usize,
    /// Whether the covariance can be inverted: n_s > n_d.
    pub invertible: bool,
    /// How much larger parameters' errors are than with a known covariance: √[(n_s − 2)/(n_s − n_d + n_θ − 2)]; infinite
    /// for too few mocks.
    pub error_growth: f64,
    /// By how much the width of an interval falls short that takes the inverse for unbiased and no more (`hartlap`):
    /// 1/√(1 + B(n_d − n_θ)), 1 where it does not; 0 for n_s ≤ n_d + 4.
    pub width_of_hartlap: f64,
}

impl MockSufficiency {
    /// The smallest n_s with which errors grow by no more than a factor (above 1).
    pub fn mocks_for_growth(&self, factor: f64) -> usize {
        let surplus = self.rows.saturating_sub(self.determined) as f64;
        let square = factor * factor;
        // Where one parameter a row is determined, the covariance costs nothing, but must be invertible.
        let needed = 2.0 + square * surplus / (square - 1.0);
        (needed.ceil() as usize).max(self.rows + 5)
    }
}

/// What n_s mocks mean for n_d rows that determine n_θ parameters.
///
/// Scatter of parameters: Dodelson & Schneider 2013, Phys. Rev. D 88, 063537; in the exact form of Taylor & Joachimi 2014,
/// MNRAS 442, 2728. B as in Percival et al. 2022, MNRAS 510, 3207.
pub fn mock_sufficiency(mocks: usize, rows: usize, determined: usize) -> MockSufficiency {
    let (n_s, n_d, n_theta) = (mocks as f64, rows as f64, determined as f64);
    let spare = n_s - n_d;
    let surplus = (n_d - n_theta).max(0.0);
    let growth = (n_s - 2.0) / (n_s - 2.0 - surplus);
    let invertible = mocks > rows;
    let scatter = (spare - 2.0) / ((spare - 1.0) * (spare - 4.0)) * surplus;
    MockSufficiency {
        mocks,
        rows,
        determined,
        invertible,
        error_growth: if invertible && n_s - 2.0 > surplus { growth.sqrt() } else { f64::INFINITY },
        width_of_hartlap: if spare > 4.0 { (1.0 + scatter).sqrt().recip() } else { 0.0 },
    }
}
