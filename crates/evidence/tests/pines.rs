//! A published Bayes factor: which density predicts the strength of radiata pine (Williams 1959; Han & Carlin 2001).

#![allow(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use oddwell_evidence::{Estimator, Nested, Problem, SteppingStones, Watch};
use oddwell_sampler::{EvaluationFailure, PriorSet, Target, build_prior};
use std::f64::consts::TAU;

/// Strength against one of the densities: α, β and 1/σ².
struct Regression {
    priors: PriorSet,
    rows: Vec<(f64, f64)>,
}

impl Regression {
    fn on(column: usize) -> Self {
        let table = include_str!("reference/pines.csv");
        let rows: Vec<Vec<f64>> = table
            .lines()
            .skip(1)
            .map(|line| line.split(',').map(|cell| cell.parse().unwrap()).collect())
            .collect();
        let mean = rows.iter().map(|row| row[column]).sum::<f64>() / rows.len() as f64;
        let priors = PriorSet::from_independent(vec![
            build_prior("normal", &[3000.0, 1000.0], None).unwrap(),
            build_prior("normal", &[185.0, 100.0], None).unwrap(),
            build_prior("gamma", &[3.0, 1.0 / (2.0 * 300.0 * 300.0)], None).unwrap(),
        ]);
        Self { priors, rows: rows.iter().map(|row| (row[0], row[column] - mean)).collect() }
    }
}

impl Target for Regression {
    type Scratch = ();
    fn dimension(&self) -> usize {
        3
    }
    fn scratch(&self) {}
    fn log_prior(&self, point: &[f64]) -> f64 {
        self.priors.log_density(point)
    }
    fn log_likelihood(&self, point: &[f64], _: &mut ()) -> Result<f64, EvaluationFailure> {
        let squares: f64 = self.rows.iter().map(|(y, x)| (y - point[0] - point[1] * x).powi(2)).sum();
        Ok(0.5 * self.rows.len() as f64 * (point[2] / TAU).ln() - 0.5 * point[2] * squares)
    }
}

#[test]
fn the_pines_favour_the_adjusted_density_by_4862() {
    let estimators: [&dyn Estimator<Regression>; 2] =
        [&Nested { live_points: 600, ..Nested::default() }, &SteppingStones::default()];
    for estimator in estimators {
        let estimate = |column: usize| {
            let target = Regression::on(column);
            let problem = Problem {
                target: &target,
                priors: &target.priors,
                seed: 1,
                peak: None,
                chain: None,
                contained: None,
            };
            estimator.estimate(&problem, &Watch::new()).unwrap()
        };
        let (plain, adjusted) = (estimate(1), estimate(2));
        // From the reference folder.
        for (found, expected) in [(&plain, -309.924328), (&adjusted, -301.435102)] {
            let off = (found.log_evidence - expected) / found.error;
            assert!(off.abs() < 3.0, "{}: {off:.1} error bars", estimator.family().name);
        }
        // The published factor, within three error bars, which are well below the difference between any two digits of it.
        let error = plain.error.hypot(adjusted.error);
        let off = adjusted.log_evidence - plain.log_evidence - 4862f64.ln();
        assert!(off.abs() < 3.0 * error && error < 0.15, "{off} {error}");
    }
}
