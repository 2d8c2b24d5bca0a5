//! The density of some parameters given draws of the others.

use super::quadratic::{LogQuadratic, Widened};
use super::{FAMILY, LEAST_DRAWS};
use crate::error::EvidenceError;
use crate::estimate::Estimate;
use crate::numbers::log_mean_exp;
use crate::problem::{Contained, Problem, Watch};
use crate::walk::Walk;
use gauss_quad::GaussLegendre;
use nalgebra::{Cholesky, DMatrix, DVector};
use oddwell_sampler::{Chain, PriorShape, SharedPrior, Target};
use serde::{Deserialize, Serialize};
use std::num::NonZeroUsize;

/// Nodes of the quadrature over one parameter: a normal density over ± 8 standard deviations to 1e-9.
const NODES: NonZeroUsize = NonZeroUsize::MIN.saturating_add(39);

/// Half the range of that quadrature, in standard deviations of the normal approximation.
const RANGE: f64 = 8.0;

/// Pairs of opposite draws that correct the normal approximation over several parameters.
const PAIRS: usize = 16;

/// Posterior over prior density at a point.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Ratio {
    /// Its logarithm: that of the evidence of the contained hypothesis over the containing one's.
    pub log_ratio: f64,
    /// Standard error of the logarithm.
    pub error: f64,
    /// Draws that carry it: (Σr)²/Σr², for as many draws as the chain is worth.
    pub draws: f64,
    /// Likelihood evaluations that it took.
    pub evaluations: u64,
}

impl Ratio {
    /// The evidence of the hypothesis that contains another, from that of the other and its error.
    pub fn estimate(&self, log_evidence: f64, error: f64) -> Estimate {
        let estimate =
            Estimate::new(log_evidence - self.log_ratio, self.error.hypot(error), self.evaluations);
        if self.draws >= LEAST_DRAWS {
            estimate
        } else {
            estimate.doubted(format!(
                "the point where the hypotheses meet lies so far out that the ratio rests on {:.0} draws",
                self.draws
            ))
        }
    }
}

/// For draws φ of all other parameters: the likelihood as a function of the chosen ones, τ.
#[derive(Debug, Clone)]
pub struct ConditionalDensities {
    priors: Vec<SharedPrior>,
    /// ln [L(point, φ)/∫ L(τ, φ) π(τ) dτ] of each draw.
    log_ratios: Vec<f64>,
    /// ln L(τ, φ) as a quadratic in τ, of each draw.
    quadratics: Vec<LogQuadratic>,
    /// How many independent draws they are worth.
    worth: f64,
    evaluations: u64,
}

/// Computes them for the parameters of `contained`, from `draws` draws out of the problem's chain.
///
/// # Errors
/// [`EvidenceError::NotApplicable`] without a chain, where the point lies outside the prior, or where a joint prior ties the
/// parameters to others; what stops an evaluation.
pub fn conditional_densities<T: Target>(
    problem: &Problem<'_, T>,
    contained: &Contained,
    draws: usize,
    watch: &Watch,
) -> Result<ConditionalDensities, EvidenceError> {
    let not =
        |reason: &str| EvidenceError::NotApplicable { estimator: FAMILY.name, reason: reason.to_owned() };
    let chain = problem.chain.ok_or_else(|| not("the posterior was not sampled"))?;
    let parameters = &contained.parameters;
    if problem.priors.joint().iter().any(|block| block.of().iter().any(|at| parameters.contains(at))) {
        return Err(not("a joint prior ties the departure to other quantities"));
    }
    let priors: Vec<SharedPrior> = parameters.iter().map(|at| problem.priors.marginal(*at).clone()).collect();
    let inside = priors.iter().zip(&contained.values).all(|(prior, x)| prior.log_density(*x).is_finite());
    if !inside {
        return Err(not("the prior has no density at the point where the hypotheses meet"));
    }
    let mut walk = Walk::new(problem, watch, 0)?;
    let stencil = Stencil::new(chain, parameters);
    let step = (chain.len() / draws.max(1)).max(1);
    let rule = GaussLegendre::new(NODES);
    let mut made =
        ConditionalDensities { priors, log_ratios: vec![], quadratics: vec![], worth: 0.0, evaluations: 0 };
    let normals = normals(parameters.len());
    // From the middle of every stretch, so that neither ends nor walkers are favoured.
    for row in (step / 2..chain.len()).step_by(step) {
        let Some(draw) = chain.draw(row) else { break };
        let before = walk.evaluations;
        let mut slice = Slice { walk: &mut walk, point: draw.point.to_vec(), parameters };
        let quadratic = stencil.quadratic(&mut slice)?;
        let log_integral = match (&made.priors[..], quadratic.as_ref()) {
            ([prior], Some(quadratic)) => one_dimension(&mut slice, prior, quadratic, &rule)?,
            (priors, Some(quadratic)) => several(&mut slice, priors, quadratic, &normals)?,
            (_, None) => None,
        };
        let (Some(log_integral), Some(quadratic)) = (log_integral, quadratic) else {
            return Err(not("the likelihood given the other quantities has no integral that was found"));
        };
        let at_point = slice.log_likelihood(&contained.values)?;
        made.log_ratios.push(at_point - log_integral);
        made.quadratics.push(quadratic);
        watch.count(walk.evaluations - before)?;
    }
    made.evaluations = walk.evaluations;
    let effective =
        chain.diagnostics.iter().map(|diagnostics| diagnostics.ess_mean).fold(f64::INFINITY, f64::min);
    made.worth = (made.log_ratios.len() as f64).min(effective).max(1.0);
    Ok(made)
}

impl ConditionalDensities {
    /// Posterior over prior density at the point.
    pub fn ratio(&self) -> Ratio {
        let (log_ratio, spread) = log_mean_exp(&self.log_ratios);
        Ratio {
            log_ratio,
            error: (spread / self.worth).sqrt(),
            draws: self.worth / (1.0 + spread),
            evaluations: self.evaluations,
        }
    }

    /// ln [Z(factor)/Z of the contained hypothesis], the prior of the chosen parameters widened by `factor` about its median
    /// (about its end, where it has one and only one). No evaluations: the likelihood is the quadratic of each draw.
    pub fn log_odds_at(&self, factor: f64) -> f64 {
        let widened: Vec<Widened<'_>> = self.priors.iter().map(|prior| Widened::new(prior, factor)).collect();
        let as_used: Vec<Widened<'_>> = self.priors.iter().map(|prior| Widened::new(prior, 1.0)).collect();
        let changes: Vec<f64> = self
            .quadratics
            .iter()
            .map(|quadratic| quadratic.log_integral(&widened) - quadratic.log_integral(&as_used))
            .collect();
        log_mean_exp(&changes).0 - self.ratio().log_ratio
    }
}

/// The likelihood as a function of the chosen parameters, the others fixed.
struct Slice<'s, 'a, T: Target> {
    walk: &'s mut Walk<'a, T>,
    point: Vec<f64>,
    parameters: &'s [usize],
}

impl<T: Target> Slice<'_, '_, T> {
    fn log_likelihood(&mut self, values: &[f64]) -> Result<f64, EvidenceError> {
        for (at, value) in self.parameters.iter().zip(values) {
            self.point[*at] = *value;
        }
        self.walk.log_likelihood(&self.point)
    }
}

/// Where the quadratic is taken: the posterior's mean, over steps of its standard deviation.
struct Stencil {
    centre: Vec<f64>,
    steps: Vec<f64>,
}

impl Stencil {
    fn new(chain: &Chain, parameters: &[usize]) -> Self {
        let of = |at: &usize| &chain.diagnostics[*at];
        Self {
            centre: parameters.iter().map(|at| of(at).mean).collect(),
            steps: parameters.iter().map(|at| of(at).sd).collect(),
        }
    }

    /// ln L by second differences; `None` where it is not finite.
    fn quadratic<T: Target>(
        &self,
        slice: &mut Slice<'_, '_, T>,
    ) -> Result<Option<LogQuadratic>, EvidenceError> {
        let n = self.centre.len();
        let mut at = |shifts: &[(usize, f64)]| {
            let mut values = self.centre.clone();
            for &(place, shift) in shifts {
                values[place] += shift * self.steps[place];
            }
            slice.log_likelihood(&values)
        };
        let value = at(&[])?;
        let mut gradient = DVector::zeros(n);
        let mut precision = DMatrix::zeros(n, n);
        let mut ups = vec![0.0; n];
        for i in 0..n {
            let (up, down) = (at(&[(i, 1.0)])?, at(&[(i, -1.0)])?);
            gradient[i] = (up - down) / (2.0 * self.steps[i]);
            precision[(i, i)] = (2.0 * value - up - down) / (self.steps[i] * self.steps[i]);
            ups[i] = up;
            for j in 0..i {
                let both = at(&[(i, 1.0), (j, 1.0)])?;
                let mixed = -(both - up - ups[j] + value) / (self.steps[i] * self.steps[j]);
                precision[(i, j)] = mixed;
                precision[(j, i)] = mixed;
            }
        }
        let finite = value.is_finite() && gradient.iter().chain(&precision).all(|entry| entry.is_finite());
        let centre = DVector::from_row_slice(&self.centre);
        Ok(finite.then_some(LogQuadratic { value, gradient, precision, centre }))
    }
}

/// ln ∫ L π over one parameter, by Gauss–Legendre quadrature of the likelihood itself around the normal approximation.
fn one_dimension<T: Target>(
    slice: &mut Slice<'_, '_, T>,
    prior: &SharedPrior,
    quadratic: &LogQuadratic,
    rule: &GaussLegendre,
) -> Result<Option<f64>, EvidenceError> {
    let spread = prior.spread();
    let precision = quadratic.precision[(0, 0)].max(0.0);
    let (low, high) = prior.support();
    let (mean, sd) = match prior.shape() {
        PriorShape::Normal { mean, sd } => {
            let total = precision + sd.powi(-2);
            let pull = precision * quadratic.centre[0] + quadratic.gradient[0] + mean * sd.powi(-2);
            (pull / total, total.sqrt().recip())
        }
        // Of any other prior, only its ends cut the likelihood's own range down.
        _ if precision * spread * spread > 1e-2 => {
            (quadratic.centre[0] + quadratic.gradient[0] / precision, precision.sqrt().recip())
        }
        _ => (prior.median(), spread.max(1e-300)),
    };
    let (from, to) = ((mean - RANGE * sd).max(low), (mean + RANGE * sd).min(high));
    let (from, to) =
        if from < to { (from, to) } else { (low.max(mean - 1e3 * sd), high.min(mean + 1e3 * sd)) };
    if !(from < to) {
        return Ok(None);
    }
    let (middle, half) = (0.5 * (from + to), 0.5 * (to - from));
    let mut terms = Vec::with_capacity(NODES.get());
    for (node, weight) in rule.as_node_weight_pairs() {
        let x = middle + half * node;
        let log_likelihood = slice.log_likelihood(&[x])?;
        terms.push(log_likelihood + prior.log_density(x) + (weight * half).ln());
    }
    let sum = crate::numbers::log_sum_exp(&terms);
    Ok(sum.is_finite().then_some(sum))
}

/// Pairs of opposite points with standard normal coordinates: a fixed set, evenly spread (Kronecker's sequence).
fn normals(dimension: usize) -> Vec<DVector<f64>> {
    let normal = oddwell_sampler::build_prior("normal", &[0.0, 1.0], None);
    let Ok(normal) = normal else { return vec![] };
    // The root of x^(d+1) = x + 1 gives the steps of lowest discrepancy that are known (Roberts 2018).
    let root = (0..60).fold(1.5f64, |x, _| (1.0 + x).powf(1.0 / (dimension as f64 + 1.0)));
    (1..=PAIRS)
        .flat_map(|index| {
            let point = DVector::from_fn(dimension, |at, _| {
                let step = root.powi(-(at as i32 + 1));
                normal.quantile((0.5 + index as f64 * step).fract().clamp(1e-9, 1.0 - 1e-9))
            });
            [-&point, point]
        })
        .collect()
}

/// ln ∫ L π over several parameters: the normal approximation to L π, corrected by the mean weight of a set of its draws.
fn several<T: Target>(
    slice: &mut Slice<'_, '_, T>,
    priors: &[SharedPrior],
    quadratic: &LogQuadratic,
    normals: &[DVector<f64>],
) -> Result<Option<f64>, EvidenceError> {
    let n = priors.len();
    // Of a prior that is not normal, the normal one of equal median and spread stands in for the proposals.
    let prior_precision = DVector::from_fn(n, |i, _| priors[i].spread().powi(-2));
    let mut precision = quadratic.precision.clone();
    let mut pull = &quadratic.precision * &quadratic.centre + &quadratic.gradient;
    for i in 0..n {
        precision[(i, i)] += prior_precision[i];
        pull[i] += prior_precision[i] * priors[i].median();
    }
    let Some(factor) = Cholesky::new(precision) else { return Ok(None) };
    let mean = factor.solve(&pull);
    let upper = factor.l().transpose();
    let half_log_determinant: f64 = factor.l_dirty().diagonal().iter().map(|entry| entry.ln()).sum();
    let mut weights = Vec::with_capacity(normals.len());
    for normal in normals {
        // Covariance (L Lᵀ)⁻¹: x = mean + L⁻ᵀ z.
        let Some(shift) = upper.solve_upper_triangular(normal) else { return Ok(None) };
        let x = &mean + shift;
        let log_prior: f64 = priors.iter().zip(x.iter()).map(|(prior, x)| prior.log_density(*x)).sum();
        let log_density =
            if log_prior.is_finite() { log_prior + slice.log_likelihood(x.as_slice())? } else { log_prior };
        weights.push(log_density + 0.5 * normal.norm_squared());
    }
    let (mean_weight, _) = log_mean_exp(&weights);
    let sum = mean_weight + 0.5 * n as f64 * std::f64::consts::TAU.ln() - half_log_determinant;
    Ok(sum.is_finite().then_some(sum))
}
