//! A posterior with its conditionally linear quantities integrated out, and drawn back for the chain.

use super::posterior::{Posterior, PosteriorScratch};
use crate::resolve::rule_of;
use crate::run_error::RunError;
use nalgebra::DMatrix;
use oddwell_likelihood::{IntegratedScratch, IntegratedSet, IntegrationError, LinearPrior};
use oddwell_model::{LinearSlots, ModelError};
use oddwell_sampler::moves::Random;
use oddwell_sampler::{EvaluationFailure, JointNormal, PriorSet, PriorShape, Target};
use rand::RngExt;
use rand_distr::{Distribution, StandardNormal};

/// A posterior over the quantities that are left when those that enter linearly are integrated out exactly.
///
/// Its log likelihood is ln ∫ L(θ) p(λ) dλ over the linear quantities λ, given the others; its prior is that of the others;
/// so its evidence is that of the [`Posterior`] it was made from. λ holds the quantities that move nothing but slots for
/// which [`oddwell_model::Model::enters_linearly`], that have no bound of their own, and whose prior is normal (alone, or
/// joint with others of λ). One quantity with a flat prior between two ends, the departure's if there is a choice, is
/// integrated between its ends, exactly too; other flat ones, truncated and other priors stay to be sampled: no prior is
/// ever taken as if it had no end.
///
/// A draw is completed by drawing λ from its normal distribution given the others; it then has the log prior and log
/// likelihood of the full point.
#[derive(Debug)]
pub struct IntegratedPosterior<'a> {
    posterior: &'a Posterior,
    /// Places in θ of what is sampled, and of λ.
    sampled: Vec<usize>,
    integrated: Vec<usize>,
    /// The prior of what is sampled.
    pub priors: PriorSet,
    /// θ at λ = its origin: the prior's mean, or middle.
    origin: Vec<f64>,
    /// λ = origin + scale · x.
    scale: Vec<f64>,
    slots: LinearSlots,
    /// ∂coefficient/∂x: (slope, slope of a slot, factor).
    slopes: Vec<(usize, usize, f64)>,
    slope_count: usize,
    set: IntegratedSet,
}

/// Working memory of one thread.
#[derive(Debug)]
pub struct IntegratedPosteriorScratch {
    full: PosteriorScratch,
    theta: Vec<f64>,
    of_slots: Vec<f64>,
    slopes: Vec<f64>,
    normals: Vec<f64>,
    x: Vec<f64>,
    set: IntegratedScratch,
}

/// λ, with one flat quantity at most.
struct Choice {
    integrated: Vec<usize>,
    interval: Option<(usize, f64, f64)>,
}

impl<'a> IntegratedPosterior<'a> {
    /// Integrates out all that can be; `None` where there is nothing, where the data are not compressed (a k-shape is
    /// inferred), or where the noise is not normal.
    ///
    /// # Errors
    /// [`RunError`] where the priors of the remaining quantities can't be built.
    pub fn new(posterior: &'a Posterior) -> Result<Option<IntegratedPosterior<'a>>, RunError> {
        Self::keeping(posterior, &[])
    }

    /// The same, but the parameters of `kept` stay to be sampled, linear or not.
    ///
    /// # Errors
    /// As [`IntegratedPosterior::new`].
    pub fn keeping(
        posterior: &'a Posterior,
        kept: &[usize],
    ) -> Result<Option<IntegratedPosterior<'a>>, RunError> {
        let Some(compressed) = posterior.compressed() else { return Ok(None) };
        let Choice { integrated, interval } = choose(posterior, kept);
        if integrated.is_empty() {
            return Ok(None);
        }
        let sampled: Vec<usize> =
            (0..posterior.dimension()).filter(|parameter| !integrated.contains(parameter)).collect();
        let (origin, scale) = origin_and_scale(posterior, &integrated);
        let mut moved: Vec<usize> = posterior
            .map
            .terms()
            .iter()
            .filter(|term| integrated.contains(&term.parameter))
            .map(|term| term.slot)
            .collect();
        moved.sort_unstable();
        moved.dedup();
        let slots = posterior.model.linear_slots(&moved)?;
        let mut pattern: Vec<Vec<usize>> = Vec::with_capacity(integrated.len());
        let mut slopes = Vec::new();
        let mut start = 0;
        for (&parameter, scale) in integrated.iter().zip(&scale) {
            let terms = posterior.map.terms().iter().filter(|term| term.parameter == parameter);
            let mut parts: Vec<(usize, usize, f64)> = Vec::new();
            for term in terms {
                let Ok(at) = moved.binary_search(&term.slot) else { continue };
                let from = slots.start(at);
                let each = slots.pattern()[at].iter().enumerate();
                parts.extend(each.map(|(within, of)| (*of, from + within, term.coefficient * scale)));
            }
            let mut coefficients: Vec<usize> = parts.iter().map(|(of, ..)| *of).collect();
            coefficients.sort_unstable();
            coefficients.dedup();
            for (of, from, factor) in parts {
                if let Ok(within) = coefficients.binary_search(&of) {
                    slopes.push((start + within, from, factor));
                }
            }
            start += coefficients.len();
            pattern.push(coefficients);
        }
        let prior = LinearPrior {
            precision: precision(posterior, &integrated, &scale),
            interval: interval.map(|(at, low, high)| {
                let middle = origin[integrated[at]];
                (at, (low - middle) / scale[at], (high - middle) / scale[at])
            }),
        };
        let set = match IntegratedSet::new(compressed, &pattern, &prior) {
            Ok(set) => set,
            // Sampled as it is: the noise is not normal, or priors that span too many orders of magnitude.
            Err(IntegrationError::Noise { .. } | _) => return Ok(None),
        };
        let priors = remaining_priors(&posterior.priors, &sampled)?;
        Ok(Some(IntegratedPosterior {
            posterior,
            sampled,
            integrated,
            priors,
            origin,
            scale,
            slots,
            slopes,
            slope_count: start,
            set,
        }))
    }

    /// Places, among the free parameters, of those that are left to be sampled.
    #[must_use]
    pub fn sampled(&self) -> &[usize] {
        &self.sampled
    }

    /// Places, among the free parameters, of those that are integrated out.
    #[must_use]
    pub fn integrated(&self) -> &[usize] {
        &self.integrated
    }

    /// The full point with the most probable linear quantities, given the others.
    ///
    /// # Errors
    /// [`ModelError`] where there is no prediction.
    pub fn most_probable(
        &self,
        point: &[f64],
        scratch: &mut IntegratedPosteriorScratch,
    ) -> Result<Vec<f64>, ModelError> {
        self.integrate(point, scratch)?;
        self.set.most_probable(&mut scratch.set, &mut scratch.x);
        let mut full = scratch.theta.clone();
        self.fill_linear(&scratch.x, &mut full);
        Ok(full)
    }

    /// θ from x, the sampled quantities being there already.
    fn fill_linear(&self, x: &[f64], theta: &mut [f64]) {
        for ((parameter, scale), x) in self.integrated.iter().zip(&self.scale).zip(x) {
            theta[*parameter] = self.origin[*parameter] + scale * x;
        }
    }

    /// The log likelihood with λ integrated out; leaves in `scratch` what a draw of λ needs.
    fn integrate(&self, point: &[f64], scratch: &mut IntegratedPosteriorScratch) -> Result<f64, ModelError> {
        let IntegratedPosteriorScratch { full, theta, of_slots, slopes, set, .. } = scratch;
        theta.copy_from_slice(&self.origin);
        for (parameter, value) in self.sampled.iter().zip(point) {
            theta[*parameter] = *value;
        }
        let coefficients = self.posterior.fill_coefficients(theta, full)?;
        let (values, workspace) = coefficients.inputs;
        self.posterior.model.coefficient_slopes(values, workspace, &self.slots, of_slots);
        slopes.fill(0.0);
        for &(to, from, factor) in &self.slopes {
            slopes[to] += factor * of_slots[from];
        }
        Ok(self.set.log_likelihood(coefficients.coefficients, slopes, set))
    }
}

impl Target for IntegratedPosterior<'_> {
    type Scratch = IntegratedPosteriorScratch;

    fn dimension(&self) -> usize {
        self.sampled.len()
    }

    fn scratch(&self) -> IntegratedPosteriorScratch {
        IntegratedPosteriorScratch {
            full: self.posterior.scratch(),
            theta: self.origin.clone(),
            of_slots: vec![0.0; self.slots.len()],
            slopes: vec![0.0; self.slope_count],
            normals: vec![0.0; self.integrated.len()],
            x: vec![0.0; self.integrated.len()],
            set: self.set.scratch(),
        }
    }

    fn log_prior(&self, point: &[f64]) -> f64 {
        self.priors.log_density(point)
    }

    fn log_likelihood(
        &self,
        point: &[f64],
        scratch: &mut IntegratedPosteriorScratch,
    ) -> Result<f64, EvaluationFailure> {
        self.integrate(point, scratch).map_err(super::posterior::failure)
    }

    fn completed_dimension(&self) -> Option<usize> {
        Some(self.posterior.dimension())
    }

    fn complete(
        &self,
        point: &[f64],
        random: &mut Random,
        scratch: &mut IntegratedPosteriorScratch,
        draw: &mut [f64],
    ) -> Result<(f64, f64), EvaluationFailure> {
        self.integrate(point, scratch).map_err(super::posterior::failure)?;
        let IntegratedPosteriorScratch { full, theta, normals, x, set, .. } = scratch;
        normals.fill_with(|| StandardNormal.sample(random));
        self.set.draw(set, normals, random.random(), x);
        draw.copy_from_slice(theta);
        self.fill_linear(x, draw);
        Ok((self.posterior.log_prior(draw), self.posterior.log_likelihood(draw, full)?))
    }
}

/// Which quantities are integrated out.
fn choose(posterior: &Posterior, kept: &[usize]) -> Choice {
    let model = &posterior.model;
    let linear = |parameter: usize| {
        if kept.contains(&parameter) {
            return false;
        }
        let mut terms = posterior.map.terms().iter().filter(|term| term.parameter == parameter);
        terms.all(|term| {
            // Amplitudes of templates, which stand behind the model's quantities, are integrated out by the likelihood itself
            // where they can be.
            let name = model.layout().names().get(term.slot);
            name.is_some_and(|name| model.enters_linearly(term.slot) && rule_of(name).is_none())
        })
    };
    let priors = &posterior.priors;
    let mut integrated: Vec<usize> = Vec::new();
    let mut flat: Vec<(usize, f64, f64)> = Vec::new();
    for &parameter in priors.independent().iter().filter(|parameter| linear(**parameter)) {
        match priors.marginal(parameter).shape() {
            PriorShape::Normal { .. } => integrated.push(parameter),
            PriorShape::Flat { low, high } => flat.push((parameter, low, high)),
            PriorShape::Other => {}
        }
    }
    for block in priors.joint().iter().filter(|block| block.of().iter().all(|of| linear(*of))) {
        integrated.extend(block.of());
    }
    let watched = posterior.hypothesis.watched();
    let chosen = flat.iter().find(|(parameter, ..)| watched.contains(parameter)).or(flat.first());
    let interval = chosen.copied();
    integrated.extend(interval.map(|(parameter, ..)| parameter));
    integrated.sort_unstable();
    let place = |parameter| integrated.iter().position(|of| *of == parameter);
    let interval = interval.and_then(|(parameter, low, high)| Some((place(parameter)?, low, high)));
    Choice { integrated, interval }
}

/// θ with λ at the means of its priors (the middle of an interval), and the widths of these.
fn origin_and_scale(posterior: &Posterior, integrated: &[usize]) -> (Vec<f64>, Vec<f64>) {
    let mut origin = posterior.hypothesis.start();
    let mut scale = Vec::with_capacity(integrated.len());
    for &parameter in integrated {
        origin[parameter] = posterior.priors.mean(parameter);
        scale.push(posterior.priors.standard_deviation(parameter));
    }
    (origin, scale)
}

/// The normal priors' precision, in units of their widths; zeros where the prior is flat.
fn precision(posterior: &Posterior, integrated: &[usize], scale: &[f64]) -> DMatrix<f64> {
    let full = posterior.priors.precision(&posterior.hypothesis.start());
    DMatrix::from_fn(integrated.len(), integrated.len(), |i, j| {
        let (one, other) = (integrated[i], integrated[j]);
        let flat = matches!(posterior.priors.marginal(one).shape(), PriorShape::Flat { .. });
        if flat { 0.0 } else { full[(one, other)] * scale[i] * scale[j] }
    })
}

/// The prior of what is left; joint blocks are whole in it, or not in it at all.
fn remaining_priors(priors: &PriorSet, sampled: &[usize]) -> Result<PriorSet, RunError> {
    let place = |parameter: &usize| sampled.iter().position(|of| of == parameter);
    let own = priors.independent().iter();
    let independent =
        own.filter_map(|parameter| Some((place(parameter)?, priors.marginal(*parameter).clone()))).collect();
    let mut joint = Vec::new();
    for block in priors.joint() {
        let Some(of) = block.of().iter().map(place).collect::<Option<Vec<usize>>>() else { continue };
        let covariance: Vec<Vec<f64>> =
            block.covariance().row_iter().map(|row| row.iter().copied().collect()).collect();
        joint.push(JointNormal::new(of, block.mean().as_slice(), &covariance)?);
    }
    Ok(PriorSet::new(sampled.len(), independent, joint)?)
}
