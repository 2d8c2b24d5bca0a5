//! The snooker move.

use super::{Move, Others, Random};
use rand::RngExt;

/// Proposes x′ = x + γ ê [ê·(a − b)], ê the direction from another walker z to x, a and b two more; factor
/// (|x′ − z| / |x − z|)^(n−1) (ter Braak & Vrugt 2008, Stat. Comput. 18, 435, eqs. 3–5), γ between 1.2 and 2.2.
///
/// The projection needs a unit of length for every coordinate. It takes fixed widths, those of the Laplace approximation,
/// so that units of measurement do not matter; unlike the other moves it is not invariant under a mixing of coordinates.
#[derive(Debug, Clone)]
pub struct Snooker {
    power: f64,
    inverse_squares: Vec<f64>,
}

impl Snooker {
    /// Registry name.
    pub const NAME: &'static str = "snooker";

    /// The move for points whose coordinates have these typical widths, all above 0.
    pub fn new(widths: &[f64]) -> Self {
        let inverse_squares = widths.iter().map(|width| (width * width).recip()).collect();
        Self { power: widths.len() as f64 - 1.0, inverse_squares }
    }
}

impl Move for Snooker {
    fn name(&self) -> &'static str {
        Self::NAME
    }

    fn propose(&self, current: &[f64], others: Others<'_>, random: &mut Random, proposal: &mut [f64]) -> f64 {
        let (anchor, first, second) = others.any_three(random);
        let (mut length, mut projection) = (0.0, 0.0);
        let pairs = current.iter().zip(anchor).zip(first.iter().zip(second));
        for (((x, z), (a, b)), weight) in pairs.zip(&self.inverse_squares) {
            let along = (x - z) * weight;
            length += along * (x - z);
            projection += along * (a - b);
        }
        if !(length > 0.0) {
            return f64::NEG_INFINITY;
        }
        // x′ − z = (1 + shift) (x − z).
        let shift = (1.2 + random.random::<f64>()) * projection / length;
        for ((next, x), z) in proposal.iter_mut().zip(current).zip(anchor) {
            *next = x + shift * (x - z);
        }
        self.power * (1.0 + shift).abs().ln()
    }
}
