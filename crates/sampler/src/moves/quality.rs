//! What independent proposals are worth, from the weights that they imply.

use super::Fit;

/// How proposals from a fit fare at the draws of a chain.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Quality {
    /// Mean acceptance.
    pub(crate) acceptance: f64,
    /// Proposals until a walker moves, expected at the worst place but for one draw in a thousand.
    pub(crate) longest_stay: f64,
}

/// Draws that are looked at, at most.
const LOOKED_AT: usize = 8192;

/// The quality of `fit` for draws x of the target with known log density (up to a constant).
///
/// With weights w = target/proposal, a proposal is accepted at x with probability a(x) = ⟨min(1, w(x′)/w(x))⟩ over proposals x′.
/// A mean over proposals is a mean over draws weighted by 1/w; so a(xᵢ) = Σⱼ min(1/wⱼ, 1/wᵢ) / Σⱼ 1/wⱼ, without a single
/// evaluation (Liu 1996, Stat. Comput. 6, 113, §2). It sees nothing of places that no draw has reached.
pub(crate) fn quality<'a>(fit: &Fit, draws: impl ExactSizeIterator<Item = (&'a [f64], f64)>) -> Quality {
    let stride = draws.len().div_ceil(LOOKED_AT).max(1);
    let mut inverse: Vec<f64> =
        draws.step_by(stride).map(|(point, log_target)| fit.log_proposal(point) - log_target).collect();
    inverse.sort_unstable_by(f64::total_cmp);
    let Some(largest) = inverse.last().copied().filter(|largest| largest.is_finite()) else {
        return Quality { acceptance: 0.0, longest_stay: f64::INFINITY };
    };
    for value in &mut inverse {
        *value = (*value - largest).exp();
    }
    let (total, count) = (inverse.iter().sum::<f64>(), inverse.len());
    // Rising 1/w: the smaller ones count as they are, the larger ones as much as this one.
    let mut below = 0.0;
    let mut acceptances = Vec::with_capacity(count);
    for (place, value) in inverse.iter().enumerate() {
        acceptances.push((below + value * (count - place) as f64) / total);
        below += value;
    }
    Quality {
        acceptance: acceptances.iter().sum::<f64>() / count as f64,
        longest_stay: acceptances[count / 1000].recip(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::moves::{Independence, Move, Others, Random};
    use nalgebra::DMatrix;
    use rand::{RngExt, SeedableRng};
    use rand_distr::{Distribution, StandardNormal};

    /// Against proposals actually made: 20,000 draws of a normal of width 1, a fit of width 1.5 at 0.5. Both means have a
    /// Monte Carlo error of 0.003; four of them are allowed.
    #[test]
    fn the_implied_acceptance_is_the_actual_one() {
        let fit = Fit::new(vec![0.5, 0.5], DMatrix::identity(2, 2) * 2.25).unwrap();
        let tried = Independence::new(fit.clone());
        let mut random = Random::seed_from_u64(5);
        let log_target = |x: &[f64]| -0.5 * (x[0] * x[0] + x[1] * x[1]);
        let draws: Vec<[f64; 2]> =
            (0..20_000).map(|_| std::array::from_fn(|_| StandardNormal.sample(&mut random))).collect();
        let mut accepted = 0.0;
        let mut proposal = [0.0; 2];
        for draw in &draws {
            let factor = tried.propose(draw, Others::new(&[0.0, 0.0], 2), &mut random, &mut proposal);
            let rate = (factor + log_target(&proposal) - log_target(draw)).exp().min(1.0);
            accepted += f64::from(u8::from(random.random::<f64>() < rate)) / draws.len() as f64;
        }
        let found = quality(&fit, draws.iter().map(|draw| (draw.as_slice(), log_target(draw))));
        assert!((found.acceptance - accepted).abs() < 0.012, "{found:?}, actual {accepted}");
    }

    /// A fit far too narrow leaves walkers in the tails for long: at 3σ a normal of width ½ is e^(−13.5) of the target.
    #[test]
    fn a_narrow_fit_is_seen() {
        let draws: Vec<[f64; 1]> = (0..4001).map(|k| [-3.0 + 6.0 * f64::from(k) / 4000.0]).collect();
        let weighted = draws.iter().map(|draw| (draw.as_slice(), -0.5 * draw[0] * draw[0]));
        let wide = quality(&Fit::new(vec![0.0], DMatrix::identity(1, 1)).unwrap(), weighted.clone());
        let narrow = quality(&Fit::new(vec![0.0], DMatrix::identity(1, 1) * 0.01).unwrap(), weighted);
        assert!(wide.longest_stay < 2.0, "{wide:?}");
        assert!(narrow.longest_stay > 100.0, "{narrow:?}");
    }
}
