//! The stretch move.

use super::{Move, Others, Random};
use rand::RngExt;

/// Proposes x′ = y + z (x − y), y another walker, z from g(z) ∝ 1/√z on [1/a, a], a = 2; factor z^(n−1)
/// (Goodman & Weare 2010, Comm. App. Math. Comp. Sci. 5, 65, eqs. 7–10).
#[derive(Debug, Clone, Copy)]
pub struct Stretch {
    power: f64,
}

impl Stretch {
    /// Registry name.
    pub const NAME: &'static str = "stretch";

    /// The move for points of `dimension` coordinates.
    pub fn new(dimension: usize) -> Self {
        Self { power: dimension as f64 - 1.0 }
    }
}

impl Move for Stretch {
    fn name(&self) -> &'static str {
        Self::NAME
    }

    fn propose(&self, current: &[f64], others: Others<'_>, random: &mut Random, proposal: &mut [f64]) -> f64 {
        const SCALE: f64 = 2.0;
        let other = others.any(random);
        // √z is uniform between 1/√a and √a.
        let root = (1.0 + (SCALE - 1.0) * random.random::<f64>()) / SCALE.sqrt();
        let stretch = root * root;
        for ((next, x), y) in proposal.iter_mut().zip(current).zip(other) {
            *next = y + stretch * (x - y);
        }
        self.power * stretch.ln()
    }
}
