//! Laplace's approximation, and how far it can be trusted.

use crate::error::EvidenceError;
use crate::estimate::Estimate;
use crate::estimator::{Estimator, EstimatorFamily};
use crate::level::{Height, Level};
use crate::numbers::log_mean_exp;
use crate::problem::{Problem, Watch};
use crate::walk::Walk;
use nalgebra::{Cholesky, DVector};
use oddwell_sampler::{Peak, PeakSettings, Target, find_peak};
use rand_distr::{Distribution, StandardNormal};
use std::f64::consts::TAU;

/// Registry entry.
pub(crate) const FAMILY: EstimatorFamily = EstimatorFamily {
    name: "laplace",
    summary: "the normal approximation at the posterior's peak (Laplace 1774; Tierney & Kadane 1986)",
    manual: "\
ln Z ≈ ln [prior × likelihood] at the peak + (n/2) ln 2π + ½ ln det C, C the inverse of minus the second derivatives there.

It is shown, and votes only where the posterior is nearly normal: draws of the approximation, weighted by posterior over
approximation, must count as four fifths of their number, (Σw)²/Σw². The logarithm of their mean weight is what the approximation
lacks, and its error bar.

It does not apply where the peak lies on an end of a prior, or where a direction is as flat as its prior and not normal.",
};

/// Laplace votes where its normality is at least this.
pub const LEAST_NORMALITY: f64 = 0.8;

/// Laplace's approximation (Laplace 1774; Tierney & Kadane 1986, J. Am. Stat. Assoc. 81, 82).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Laplace {
    /// Draws of the approximation that test it.
    pub draws: usize,
}

impl Default for Laplace {
    fn default() -> Self {
        Self { draws: 2000 }
    }
}

impl<T: Target> Estimator<T> for Laplace {
    fn family(&self) -> &'static EstimatorFamily {
        &FAMILY
    }

    fn estimate(&self, problem: &Problem<'_, T>, watch: &Watch) -> Result<Estimate, EvidenceError> {
        let not = |reason: String| EvidenceError::NotApplicable { estimator: FAMILY.name, reason };
        let (peak, searched) = match problem.peak.or(problem.chain.and_then(|chain| chain.peak.as_ref())) {
            Some(peak) => (peak.clone(), 0),
            None => {
                let settings = PeakSettings { seed: problem.seed, ..PeakSettings::default() };
                let peak = find_peak(problem.target, problem.priors, &settings)?;
                let evaluations = peak.evaluations;
                (peak, evaluations)
            }
        };
        watch.count(searched)?;
        if let Some(at) = peak.at_edge.first() {
            return Err(not(format!("the peak lies on an end of the prior in dimension {}", at + 1)));
        }
        if peak.bounded_by_prior {
            return Err(not("a direction is flatter than the prior, or rises away from the peak".into()));
        }
        let factor = Cholesky::new(peak.covariance.clone())
            .ok_or_else(|| not("the second derivatives at the peak are no covariance".into()))?;
        let dimension = peak.point.len() as f64;
        let half_log_determinant: f64 = factor.l_dirty().diagonal().iter().map(|entry| entry.ln()).sum();
        let log_evidence = peak.log_posterior + 0.5 * dimension * TAU.ln() + half_log_determinant;
        let mut walk = Walk::new(problem, watch, 0)?;
        let (correction, spread) = self.test(problem, &mut walk, &peak, &factor)?;
        watch.count(walk.evaluations)?;
        let normality = 1.0 / (1.0 + spread);
        let error = correction.abs() + (spread / self.draws as f64).sqrt();
        let mut estimate = Estimate::new(log_evidence, error, searched + walk.evaluations);
        estimate.normality = Some(normality);
        if !(normality >= LEAST_NORMALITY) {
            estimate = estimate.doubted(format!(
                "the posterior is not nearly normal: draws of the approximation count {normality:.2} times"
            ));
        }
        Ok(estimate)
    }
}

impl Laplace {
    /// The logarithm of the mean weight of draws of the approximation, and the squared coefficient of variation of weights.
    fn test<T: Target>(
        &self,
        problem: &Problem<'_, T>,
        walk: &mut Walk<'_, T>,
        peak: &Peak,
        factor: &Cholesky<f64, nalgebra::Dyn>,
    ) -> Result<(f64, f64), EvidenceError> {
        let lower = factor.l();
        let mut weights = Vec::with_capacity(self.draws);
        for _ in 0..self.draws {
            let normals = DVector::from_fn(peak.point.len(), |_, _| {
                let normal: f64 = StandardNormal.sample(&mut walk.random);
                normal
            });
            let shift = &lower * &normals;
            let point: Vec<f64> = peak.point.iter().zip(shift.iter()).map(|(x, dx)| x + dx).collect();
            let log_prior = problem.target.log_prior(&point);
            if !(log_prior > f64::NEG_INFINITY) {
                weights.push(f64::NEG_INFINITY);
                continue;
            }
            let log_likelihood = walk.log_likelihood(&point)?;
            let height = Height { log_prior, log_likelihood, label: 0.0 };
            let fall = Level::Tempered(1.0).log_density(&height) - peak.log_posterior;
            weights.push(fall + 0.5 * normals.norm_squared());
        }
        Ok(log_mean_exp(&weights))
    }
}
