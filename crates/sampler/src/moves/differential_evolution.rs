//! The differential evolution move.

use super::{Move, Others, Random};
use rand::RngExt;

/// Proposes x′ = x + γ (a − b), a and b two other walkers; factor 1 (ter Braak 2006, Stat. Comput. 16, 239, eq. 2).
///
/// γ is 2.38/√(2n) times a number between 0.8 and 1.2, and close to 1 every tenth time, which jumps between modes
/// (the same, §2). That spread of γ replaces the paper's small additive noise: it keeps the move affine-invariant, and
/// the other moves of a mixture see to it that every point can be reached.
#[derive(Debug, Clone, Copy)]
pub struct DifferentialEvolution {
    scale: f64,
}

impl DifferentialEvolution {
    /// Registry name.
    pub const NAME: &'static str = "differential_evolution";

    /// The move for points of `dimension` coordinates.
    pub fn new(dimension: usize) -> Self {
        Self { scale: 2.38 / (2.0 * dimension as f64).sqrt() }
    }
}

impl Move for DifferentialEvolution {
    fn name(&self) -> &'static str {
        Self::NAME
    }

    fn propose(&self, current: &[f64], others: Others<'_>, random: &mut Random, proposal: &mut [f64]) -> f64 {
        const JUMPS: f64 = 0.1;
        let (first, second) = others.any_two(random);
        // Symmetric under exchange of the two walkers, so the way back is as likely as the way there.
        let uniform: f64 = random.random();
        let scale = if uniform < JUMPS {
            0.99 + 0.02 * (uniform / JUMPS)
        } else {
            self.scale * (0.8 + 0.4 * (uniform - JUMPS) / (1.0 - JUMPS))
        };
        for (((next, x), a), b) in proposal.iter_mut().zip(current).zip(first).zip(second) {
            *next = x + scale * (a - b);
        }
        0.0
    }
}
