//! From likelihoods of dead points to the evidence, with the prior mass that each of them leaves known only in law.

use crate::numbers::{log_sum_exp, mean_and_variance};
use crate::walk::stream;
use rand::RngExt;

/// A point that died.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Dead {
    pub(super) log_likelihood: f64,
    /// Live points when it died, itself included.
    pub(super) alive: usize,
}

/// The evidence of one run.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Integral {
    /// Mean of ln Z over simulated shrinkages.
    pub(super) log_evidence: f64,
    /// Variance of the same.
    pub(super) variance: f64,
    /// H = ∫ P ln(P/π), nats, with expected shrinkages.
    pub(super) information: f64,
}

/// Simulated shrinkages: their standard deviation is known to 1/√(2·100), 7 %.
const SIMULATIONS: usize = 100;

/// Streams of the simulations are this far from those of the runs.
const BEYOND_RUNS: usize = 1000;

/// ln Z = ln Σ Lᵢ (Xᵢ₋₁ − Xᵢ), ln Xᵢ = ln Xᵢ₋₁ − eᵢ/nᵢ, e standard exponential: the largest of n uniform numbers is e^(−e/n)
/// (Skilling 2006, §7). Mean and variance over many sets of e.
pub(super) fn integrate(dead: &[Dead], seed: u64, run: usize) -> Integral {
    let mut random = stream(seed, BEYOND_RUNS + run);
    let highest = dead.iter().map(|point| point.log_likelihood).fold(f64::NEG_INFINITY, f64::max);
    let likelihoods: Vec<f64> = dead.iter().map(|point| (point.log_likelihood - highest).exp()).collect();
    let mut values = Vec::with_capacity(SIMULATIONS);
    for _ in 0..SIMULATIONS {
        let (mut mass, mut sum) = (1.0, 0.0);
        for (point, likelihood) in dead.iter().zip(&likelihoods) {
            let exponential = -(1.0 - random.random::<f64>()).ln();
            let next = mass * (-exponential / point.alive as f64).exp();
            sum += likelihood * (mass - next);
            mass = next;
        }
        values.push(highest + sum.ln());
    }
    let (log_evidence, variance) = mean_and_variance(&values);
    Integral { log_evidence, variance, information: information(dead) }
}

fn information(dead: &[Dead]) -> f64 {
    let mut log_mass = 0.0;
    let mut terms = Vec::with_capacity(dead.len());
    for point in dead {
        let step = -(-1.0 / point.alive as f64).exp_m1();
        terms.push(point.log_likelihood + log_mass + step.ln());
        log_mass -= 1.0 / point.alive as f64;
    }
    let log_evidence = log_sum_exp(&terms);
    let mut sum = 0.0;
    for (term, point) in terms.iter().zip(dead) {
        let share = (term - log_evidence).exp();
        if share > 0.0 {
            sum += share * (point.log_likelihood - log_evidence);
        }
    }
    // Rounding can leave −1e-16 for a flat likelihood.
    sum.max(0.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A flat likelihood: Z is the likelihood, whatever the shrinkages, up to the mass left beyond the last point, and the
    /// data give no information.
    #[test]
    fn a_flat_likelihood_integrates_to_itself() {
        let dead: Vec<Dead> = (0..100)
            .flat_map(|_| [100; 50])
            .map(|alive| Dead { log_likelihood: -3.0, alive })
            .chain((0..100).map(|place| Dead { log_likelihood: -3.0, alive: 100 - place }))
            .collect();
        let integral = integrate(&dead, 1, 0);
        assert!((integral.log_evidence + 3.0).abs() < 1e-9 && integral.variance < 1e-12);
        assert!(integral.information < 1e-9);
    }

    /// L = 1/X down to X = e⁻ᴰ, so that Z = D. A shift of ln X at u = −ln X moves Z by what lies above, D − u, less the 1 that the
    /// step there loses: Var ln Z = (1/n) ∫ (D − u − 1)² du/D² = [(D − 1)³ + 1]/(3 D² n).
    #[test]
    fn the_simulated_scatter_is_that_of_theory() {
        let (live, depth) = (200, 8.0);
        let steps = (depth * f64::from(live)) as usize;
        let dead: Vec<Dead> = (1..=steps)
            .map(|i| Dead { log_likelihood: i as f64 / f64::from(live), alive: live as usize })
            .collect();
        let integral = integrate(&dead, 1, 0);
        let expected = ((depth - 1.0).powi(3) + 1.0) / (3.0 * depth * depth * f64::from(live));
        // A variance from 100 simulations is known to √(2/100); three of those.
        assert!((integral.variance / expected - 1.0).abs() < 0.42, "{} {expected}", integral.variance);
        // The mean over 100 simulations, three standard errors, and half the variance that a logarithm loses.
        assert!((integral.log_evidence - depth.ln()).abs() < 0.3 * expected.sqrt() + 0.5 * expected);
    }
}
