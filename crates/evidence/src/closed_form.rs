//! The evidence in closed form, where the log likelihood is a quadratic and the priors are normal or flat.

use crate::error::EvidenceError;
use crate::estimate::Estimate;
use crate::estimator::{Estimator, EstimatorFamily};
use crate::problem::{Problem, Watch};
use crate::walk::Walk;
use nalgebra::{Cholesky, DMatrix, DVector};
use oddwell_sampler::{PriorSet, PriorShape, Target};
use statrs::function::erf::erfc;
use std::f64::consts::{SQRT_2, TAU};

/// Registry entry.
pub(crate) const FAMILY: EstimatorFamily = EstimatorFamily {
    name: "closed_form",
    summary: "linear algebra, where every quantity is linear, the noise normal, and the priors normal or flat",
    manual: "\
Where the prediction is linear in everything inferred and the noise is normal (`gaussian`, `hartlap`), the log likelihood is a
quadratic. With normal priors the evidence is then that of a normal distribution of the data; a flat prior on one quantity adds the
share of the posterior between its ends.

The quadratic is found by differences, and checked on draws of the prior, where it must hold to 1e-4 + 1e-9 of the largest
change of the log likelihood; the largest deviation is the error bar. Otherwise it does not apply.

Several flat priors apply only where the posterior lies at least six standard deviations inside all of them.",
};

/// The closed form.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct ClosedForm;

/// Draws of the prior on which the quadratic is checked.
const CHECKS: usize = 64;

impl<T: Target> Estimator<T> for ClosedForm {
    fn family(&self) -> &'static EstimatorFamily {
        &FAMILY
    }

    fn estimate(&self, problem: &Problem<'_, T>, watch: &Watch) -> Result<Estimate, EvidenceError> {
        let dimension = problem.target.dimension();
        if dimension == 0 {
            return nothing_inferred(problem, watch);
        }
        let scales = scales(problem.priors)?;
        let mut walk = Walk::new(problem, watch, 0)?;
        let centre: Vec<f64> = (0..dimension).map(|at| problem.priors.median(at)).collect();
        let quadratic = Quadratic::through(&mut walk, &centre, &scales)?;
        let deviation = quadratic.check(&mut walk, problem)?;
        watch.count(walk.evaluations)?;
        let log_evidence = quadratic.integral(problem)?;
        Ok(Estimate::new(log_evidence, deviation.max(1e-9), walk.evaluations))
    }
}

fn not(reason: impl Into<String>) -> EvidenceError {
    EvidenceError::NotApplicable { estimator: FAMILY.name, reason: reason.into() }
}

/// With nothing to integrate over, the evidence is the likelihood.
fn nothing_inferred<T: Target>(problem: &Problem<'_, T>, watch: &Watch) -> Result<Estimate, EvidenceError> {
    let value = problem.target.log_likelihood(&[], &mut problem.target.scratch());
    watch.count(1)?;
    match value {
        Ok(value) if value.is_finite() => Ok(Estimate::new(value, 1e-9, 1)),
        Ok(_) => Err(EvidenceError::NoLikelihood { tried: 1 }),
        Err(failure) => Err(EvidenceError::Evaluation { reason: failure.to_string(), point: vec![] }),
    }
}

/// Widths of the priors, all of which must be normal or flat.
fn scales(priors: &PriorSet) -> Result<Vec<f64>, EvidenceError> {
    (0..priors.dimension())
        .map(|at| match priors.marginal(at).shape() {
            PriorShape::Normal { sd, .. } => Ok(sd),
            PriorShape::Flat { low, high } => Ok(0.25 * (high - low)),
            PriorShape::Other => {
                Err(not(format!("the prior of dimension {} is neither normal nor flat", at + 1)))
            }
        })
        .collect()
}

/// f + gᵀu + ½ uᵀHu with u = (x − centre)/scales.
struct Quadratic {
    centre: Vec<f64>,
    scales: Vec<f64>,
    value: f64,
    gradient: DVector<f64>,
    hessian: DMatrix<f64>,
}

impl Quadratic {
    /// Second differences over a whole scale: exact for a quadratic, and far above rounding.
    fn through<T: Target>(
        walk: &mut Walk<'_, T>,
        centre: &[f64],
        scales: &[f64],
    ) -> Result<Self, EvidenceError> {
        let n = centre.len();
        let mut at = |shifts: &[(usize, f64)]| -> Result<f64, EvidenceError> {
            let mut point = centre.to_vec();
            for &(place, shift) in shifts {
                point[place] += shift * scales[place];
            }
            let value = walk.log_likelihood(&point)?;
            if value.is_finite() { Ok(value) } else { Err(not("the likelihood is zero somewhere")) }
        };
        let value = at(&[])?;
        let (mut up, mut down) = (vec![0.0; n], vec![0.0; n]);
        for i in 0..n {
            up[i] = at(&[(i, 1.0)])?;
            down[i] = at(&[(i, -1.0)])?;
        }
        let gradient = DVector::from_fn(n, |i, _| 0.5 * (up[i] - down[i]));
        let mut hessian = DMatrix::zeros(n, n);
        for i in 0..n {
            hessian[(i, i)] = up[i] + down[i] - 2.0 * value;
            for j in 0..i {
                let mixed = at(&[(i, 1.0), (j, 1.0)])? - up[i] - up[j] + value;
                hessian[(i, j)] = mixed;
                hessian[(j, i)] = mixed;
            }
        }
        Ok(Self { centre: centre.to_vec(), scales: scales.to_vec(), value, gradient, hessian })
    }

    /// The largest deviation of the log likelihood from the quadratic over draws of the prior.
    fn check<T: Target>(
        &self,
        walk: &mut Walk<'_, T>,
        problem: &Problem<'_, T>,
    ) -> Result<f64, EvidenceError> {
        let cloud = walk.draws(problem.priors, CHECKS)?;
        let (mut deviation, mut change) = (0.0f64, 0.0f64);
        for (point, height) in cloud.points.chunks_exact(self.centre.len()).zip(&cloud.heights) {
            let u = DVector::from_fn(point.len(), |i, _| (point[i] - self.centre[i]) / self.scales[i]);
            let expected = self.gradient.dot(&u) + 0.5 * (&self.hessian * &u).dot(&u);
            let found = height.log_likelihood - self.value;
            deviation = deviation.max((found - expected).abs());
            change = change.max(found.abs());
        }
        let tolerated = 1e-4 + 1e-9 * change;
        if deviation <= tolerated {
            Ok(deviation)
        } else {
            Err(not(format!("the log likelihood is no quadratic: it deviates from one by {deviation:.1e}")))
        }
    }

    /// ln ∫ π L: with P = Λ − H (Λ the prior's precision), ln[π L](centre) + (n/2) ln 2π − ½ ln det P + ½ gᵀP⁻¹g, and the
    /// logarithm of the share of the posterior within the flat priors.
    fn integral<T: Target>(&self, problem: &Problem<'_, T>) -> Result<f64, EvidenceError> {
        let n = self.centre.len();
        let scale = DMatrix::from_diagonal(&DVector::from_row_slice(&self.scales));
        let prior = &scale * problem.priors.precision(&self.centre) * &scale;
        let factor = Cholesky::new(prior - &self.hessian)
            .ok_or_else(|| not("a flat prior is not narrowed by the data"))?;
        let half_log_determinant: f64 = factor.l_dirty().diagonal().iter().map(|entry| entry.ln()).sum();
        let mean = factor.solve(&self.gradient);
        let log_scales: f64 = self.scales.iter().map(|scale| scale.ln()).sum();
        let whole =
            self.value + problem.target.log_prior(&self.centre) + log_scales + 0.5 * n as f64 * TAU.ln()
                - half_log_determinant
                + 0.5 * self.gradient.dot(&mean);
        Ok(whole + self.log_share_inside(problem.priors, &mean, &factor.inverse())?)
    }

    fn log_share_inside(
        &self,
        priors: &PriorSet,
        mean: &DVector<f64>,
        covariance: &DMatrix<f64>,
    ) -> Result<f64, EvidenceError> {
        /// Standard deviations from an end beyond which it cuts less than 2e-9 off.
        const FAR: f64 = 6.0;
        let cuts: Vec<(f64, f64)> = (0..mean.len())
            .filter_map(|at| {
                let PriorShape::Flat { low, high } = priors.marginal(at).shape() else { return None };
                let sd = covariance[(at, at)].sqrt();
                let end = |x: f64| ((x - self.centre[at]) / self.scales[at] - mean[at]) / sd;
                Some((end(low), end(high)))
            })
            .collect();
        match cuts[..] {
            [(low, high)] => {
                // From the nearer tail, so that no digits are lost.
                let share = if low > 0.0 {
                    0.5 * (erfc(low / SQRT_2) - erfc(high / SQRT_2))
                } else {
                    0.5 * (erfc(-high / SQRT_2) - erfc(-low / SQRT_2))
                };
                Ok(share.ln())
            }
            _ if cuts.iter().all(|(low, high)| *low < -FAR && *high > FAR) => Ok(0.0),
            _ => Err(not("several flat priors, of which one cuts the posterior off")),
        }
    }
}
