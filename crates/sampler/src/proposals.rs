//! The independence move's proposals in a run: fitted during warm-up, weighted by their quality, watched afterwards.

use crate::diagnostics::Shape;
use crate::moves::{Fit, Independence, Quality, quality};
use crate::state::RunState;

/// Ratio of acceptances from which a new fit is worth its price.
const BETTER: f64 = 1.2;

/// The share of independent proposals in the mixture that their quality deserves.
///
/// A walker stuck where proposals are too rare waits for the other moves, whose memory is about 4·dimension steps of their
/// own. If it hardly ever stays longer than that, independent proposals may do nearly everything; if it does, half of the
/// steps cost either kind of move at most a factor of two; if hardly any proposal is accepted, they only cost evaluations.
fn deserved_share(quality: Quality, dimension: usize) -> f64 {
    if quality.acceptance < 0.02 {
        0.05
    } else if quality.longest_stay > 4.0 * dimension as f64 {
        0.5
    } else {
        0.9
    }
}

impl RunState {
    /// Where the independence move stands among the weights, if it takes part.
    fn independence(&self) -> Option<usize> {
        self.weights.iter().position(|(name, _)| name == Independence::NAME)
    }

    /// A fit to the draws after the first `dropped` steps.
    fn fitted(&self, dropped: usize) -> Option<Fit> {
        let draws = self.history.draws(dropped);
        let shape = Shape { steps: self.history.steps() - dropped, ..self.history.shape() };
        let heights: Vec<f64> = draws.clone().map(|(_, log_posterior)| log_posterior).collect();
        let (effective, _) = shape.ensemble_route(&heights);
        Fit::to_draws(self.fit.dimension(), draws.map(|(point, _)| point), effective)
    }

    /// Fits the independence move to the draws after the first `dropped` steps, and gives it the share that its quality
    /// there deserves, unless the settings fix the weights.
    pub(crate) fn refit(&mut self, dropped: usize) {
        let Some(place) = self.independence() else {
            return;
        };
        if let Some(fit) = self.fitted(dropped) {
            self.fit = fit;
        }
        if self.settings.move_weights.is_empty() {
            let total: f64 = self.weights.iter().map(|(_, weight)| weight).sum();
            let others = total - self.weights[place].1;
            let share = deserved_share(quality(&self.fit, self.history.draws(dropped)), self.fit.dimension());
            self.weights[place].1 = others * share / (1.0 - share);
        }
    }

    /// Whether the frozen proposals deserve a smaller share than they have, now that the chain has seen more: then the
    /// weights that they imply vary too much, and walkers get stuck where proposals are too rare.
    pub(crate) fn proposals_went_wrong(&self) -> bool {
        let Some(place) = self.independence().filter(|_| self.settings.move_weights.is_empty()) else {
            return false;
        };
        if self.history.steps() == 0 {
            return false;
        }
        let total: f64 = self.weights.iter().map(|(_, weight)| weight).sum();
        let share = self.weights[place].1 / total;
        deserved_share(quality(&self.fit, self.history.draws(0)), self.fit.dimension()) < share - 1e-9
    }

    /// Whether proposals fitted to what the chain has seen by now would be accepted notably more often.
    pub(crate) fn proposals_can_be_better(&self) -> bool {
        if self.independence().is_none() || self.history.steps() < 8 {
            return false;
        }
        let acceptance = |fit: &Fit| quality(fit, self.history.draws(0)).acceptance;
        self.fitted(0).is_some_and(|fit| acceptance(&fit) > BETTER * acceptance(&self.fit))
    }
}
