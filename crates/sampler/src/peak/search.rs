//! The search itself: candidates, a rough climb, a Newton polish, and the Laplace covariance.

use super::coordinates::Coordinates;
use super::evaluator::Evaluator;
use super::hessian::{fit_steps, gradient};
use super::polish::{Polished, polish};
use super::{OtherPeak, Peak};
use crate::error::SamplerError;
use crate::priors::PriorSet;
use crate::settings::Control;
use crate::target::Target;
use argmin::core::{CostFunction, Executor, Gradient};
use argmin::solver::linesearch::MoreThuenteLineSearch;
use argmin::solver::quasinewton::LBFGS;
use rand::SeedableRng;
use rand_xoshiro::Xoshiro256PlusPlus;
use std::cell::RefCell;
use std::collections::VecDeque;

/// How to look for the peak.
#[derive(Debug, Clone, PartialEq)]
pub struct PeakSettings {
    /// Seed of the prior draws among the candidates.
    pub seed: u64,
    /// Draws of the prior that are tried as starting points, besides its medians.
    pub draws: usize,
    /// Climbs at most, each from the best candidate not used yet; the search ends early once two agree.
    pub climbs: usize,
    /// Further starting points, tried first.
    pub starting_points: Vec<Vec<f64>>,
}

impl Default for PeakSettings {
    fn default() -> Self {
        Self { seed: 1, draws: 100, climbs: 5, starting_points: vec![] }
    }
}

/// Log posteriors that differ by less belong to the same peak.
const SAME_HEIGHT: f64 = 1e-3;

/// Finds the posterior's peak and its Laplace covariance.
///
/// Candidates are the given points, the prior's medians and draws of the prior. From the best of them the log posterior
/// is climbed by L-BFGS (Nocedal 1980; line search of Moré & Thuente 1994) in coordinates that are unbounded and scaled by
/// the prior, then polished by Newton steps kept inside the support, until a step promises less than 1e-6. This is
/// repeated from other candidates, first from points across a valley of the log posterior from every peak found if a scan along
/// each coordinate (16 evaluations) meets one, until two climbs agree, or `climbs` are made; the highest counts, and the others are told.
///
/// Derivatives are central differences with steps of a tenth of each conditional standard deviation (n² + n evaluations
/// for a Hessian). Directions in which the log posterior curves less than a prior of twice the spread would (flat
/// ones, or ones that rise) get that prior's variance, and [`Peak::bounded_by_prior`] says so. A dimension whose peak is
/// on an end of its support is left out of the Hessian; see [`Peak::at_edge`].
///
/// Accuracy: the log posterior of a smooth unimodal target to 1e-6; the covariance to about 1 % where the target is near
/// normal within a tenth of a standard deviation. Of several peaks, the highest is found only if a candidate leads there.
///
/// # Errors
/// [`SamplerError::NoStart`] if no candidate has a finite likelihood; [`SamplerError::Evaluation`] after a fatal failure;
/// [`SamplerError::Dimension`] if target and priors disagree.
pub fn find_peak<T: Target>(
    target: &T,
    priors: &PriorSet,
    settings: &PeakSettings,
) -> Result<Peak, SamplerError> {
    find_peak_with(target, priors, settings, &mut |_| Control::Continue)
}

/// [`find_peak`] with a callback between its parts, which is told the number of evaluations so far.
///
/// # Errors
/// As [`find_peak`]; [`SamplerError::Stopped`] if the callback says so before the first climb has ended. Later, the best
/// climb so far counts.
pub fn find_peak_with<T: Target>(
    target: &T,
    priors: &PriorSet,
    settings: &PeakSettings,
    callback: &mut dyn FnMut(u64) -> Control,
) -> Result<Peak, SamplerError> {
    if target.dimension() != priors.dimension() || target.dimension() == 0 {
        return Err(SamplerError::Dimension { target: target.dimension(), prior: priors.dimension() });
    }
    let coordinates = Coordinates::new(priors);
    let mut evaluator = Evaluator::new(target);
    let candidates = candidates(&mut evaluator, priors, settings)?;
    let mut best: Option<Polished> = None;
    let mut found: Vec<Polished> = Vec::new();
    let mut queue: VecDeque<(Vec<f64>, bool)> = candidates.into_iter().map(|point| (point, false)).collect();
    for _ in 0..settings.climbs.max(1) {
        let Some((candidate, across)) = queue.pop_front() else { break };
        if callback(evaluator.evaluations) == Control::Stop {
            if best.is_none() {
                return Err(SamplerError::Stopped);
            }
            break;
        }
        let (climbed, returned) = climb(evaluator, &coordinates, &candidate);
        evaluator = returned;
        evaluator.check()?;
        let polished = polish(&mut evaluator, priors, &coordinates, climbed);
        evaluator.check()?;
        let agrees = best.as_ref().is_some_and(|best| (best.value - polished.value).abs() < SAME_HEIGHT)
            && !is_apart(&mut evaluator, &polished, &found);
        if !agrees && is_apart(&mut evaluator, &polished, &found) {
            found.push(polished.clone());
            if let Some(point) = beyond(&mut evaluator, priors, &found) {
                queue.push_front((point, true));
            }
        }
        if best.as_ref().is_none_or(|best| polished.value > best.value) {
            best = Some(polished);
        }
        // A climb from across a valley that ends at a known peak went the wrong way, which says nothing of the other side.
        if agrees && !across {
            break;
        }
    }
    let best = best.ok_or(SamplerError::Stopped)?;
    let others = others(&mut evaluator, priors, &coordinates, &best, &found);
    let height = evaluator.height(&best.point);
    let laplace = best.covariance(&mut evaluator, priors, &coordinates);
    evaluator.check()?;
    Ok(Peak {
        point: best.point,
        log_prior: height.log_prior,
        log_likelihood: height.log_likelihood,
        log_posterior: height.log_posterior(),
        covariance: laplace.covariance,
        at_edge: best.pinned,
        bounded_by_prior: laplace.bounded_by_prior,
        polished: best.converged,
        others,
        evaluations: evaluator.evaluations,
    })
}

/// Shares of the way between two points at which a valley between them is looked for.
const BETWEEN: [f64; 3] = [0.25, 0.5, 0.75];

/// Log posterior by which a valley must lie below both of its sides: rounding and noise of the model are far below.
const VALLEY: f64 = 1.0;

/// Places along each coordinate at which another peak is looked for.
const ALONG: u32 = 16;

/// A point lower than a peak by more than this is no side of another peak that matters, unless that is very narrow.
const LOWEST_SIDE: f64 = 200.0;

/// Below the highest peak by this much of log posterior mass, another one does not matter: e⁻¹⁴ is one in a million.
const NEGLIGIBLE: f64 = 14.0;

/// Whether the straight line between two points, with their log posteriors, passes a valley: then they may belong to
/// different peaks (or to the ends of one that is bent).
fn valley<T: Target>(
    evaluator: &mut Evaluator<'_, T>,
    (one, at_one): (&[f64], f64),
    (other, at_other): (&[f64], f64),
) -> bool {
    let mut point = one.to_vec();
    BETWEEN.iter().any(|share| {
        for ((x, one), other) in point.iter_mut().zip(one).zip(other) {
            *x = one + share * (other - one);
        }
        evaluator.log_posterior(&point) < at_one.min(at_other) - VALLEY
    })
}

/// Whether a peak is another one than those found.
fn is_apart<T: Target>(evaluator: &mut Evaluator<'_, T>, peak: &Polished, found: &[Polished]) -> bool {
    let side = (peak.point.as_slice(), peak.value);
    found.iter().all(|known| valley(evaluator, side, (known.point.as_slice(), known.value)))
}

/// The highest point across a valley from every peak found, of those that differ from the last one in a single coordinate, which
/// stands at sixteen quantiles of its prior in turn.
fn beyond<T: Target>(
    evaluator: &mut Evaluator<'_, T>,
    priors: &PriorSet,
    found: &[Polished],
) -> Option<Vec<f64>> {
    let last = found.last()?;
    let mut highest: Option<(f64, Vec<f64>)> = None;
    for dimension in 0..priors.dimension() {
        let mut point = last.point.clone();
        for place in 0..ALONG {
            point[dimension] =
                priors.marginal(dimension).quantile((f64::from(place) + 0.5) / f64::from(ALONG));
            let value = evaluator.log_posterior(&point);
            let low =
                value < last.value - LOWEST_SIDE || highest.as_ref().is_some_and(|(best, _)| value <= *best);
            if low || !found.iter().all(|peak| valley(evaluator, (&point, value), (&peak.point, peak.value)))
            {
                continue;
            }
            highest = Some((value, point.clone()));
        }
    }
    highest.map(|(_, point)| point)
}

/// The peaks besides the highest that are not negligible, each with its Laplace covariance and mass.
fn others<T: Target>(
    evaluator: &mut Evaluator<'_, T>,
    priors: &PriorSet,
    coordinates: &Coordinates,
    best: &Polished,
    found: &[Polished],
) -> Vec<OtherPeak> {
    let apart = found.iter().filter(|peak| peak.value < best.value || peak.point != best.point);
    let near = apart.filter(|peak| peak.value > best.value - NEGLIGIBLE);
    near.map(|peak| OtherPeak {
        point: peak.point.clone(),
        log_posterior: peak.value,
        covariance: peak.covariance(evaluator, priors, coordinates).covariance,
    })
    .collect()
}

/// Starting points of finite posterior density, the given ones first, then from high to low.
fn candidates<T: Target>(
    evaluator: &mut Evaluator<'_, T>,
    priors: &PriorSet,
    settings: &PeakSettings,
) -> Result<Vec<Vec<f64>>, SamplerError> {
    let dimension = priors.dimension();
    let mut random = Xoshiro256PlusPlus::seed_from_u64(settings.seed);
    let mut given: Vec<Vec<f64>> =
        settings.starting_points.iter().filter(|point| point.len() == dimension).cloned().collect();
    given.retain(|point| evaluator.log_posterior(point).is_finite());
    let mut drawn: Vec<(f64, Vec<f64>)> = Vec::with_capacity(settings.draws + 1);
    let mut point: Vec<f64> = (0..dimension).map(|at| priors.median(at)).collect();
    // Where the first draws have no answer, ten times as many may still find the region that has one.
    for attempt in 0..=settings.draws.max(1) * 10 {
        if attempt > settings.draws && !drawn.is_empty() {
            break;
        }
        let value = evaluator.log_posterior(&point);
        if value.is_finite() {
            drawn.push((value, point.clone()));
        }
        priors.sample(&mut random, &mut point);
    }
    evaluator.check()?;
    drawn.sort_by(|a, b| b.0.total_cmp(&a.0));
    given.extend(drawn.into_iter().map(|(_, point)| point));
    if given.is_empty() {
        return Err(SamplerError::NoStart {
            tried: settings.draws.max(1) as u64 * 10 + 1,
            reason: evaluator.first_rejection.clone(),
        });
    }
    Ok(given)
}

/// The negative log posterior over unbounded coordinates, as argmin wants it; remembers the best point it saw.
struct Descent<'a, 'c, T: Target> {
    state: RefCell<DescentState<'a, T>>,
    coordinates: &'c Coordinates,
}

struct DescentState<'a, T: Target> {
    evaluator: Evaluator<'a, T>,
    point: Vec<f64>,
    best: (f64, Vec<f64>),
    steps: Vec<f64>,
}

impl<T: Target> DescentState<'_, T> {
    fn value(&mut self, coordinates: &Coordinates, unbounded: &[f64]) -> f64 {
        coordinates.to_point(unbounded, &mut self.point);
        let value = self.evaluator.log_posterior(&self.point);
        if value > self.best.0 {
            self.best.0 = value;
            self.best.1.clear();
            self.best.1.extend_from_slice(unbounded);
        }
        value
    }
}

impl<T: Target> CostFunction for &Descent<'_, '_, T> {
    type Param = Vec<f64>;
    type Output = f64;
    fn cost(&self, unbounded: &Vec<f64>) -> Result<f64, argmin::core::Error> {
        let mut state = self.state.borrow_mut();
        let value = state.value(self.coordinates, unbounded);
        // A line search needs a finite wall where there is no answer.
        Ok(if value.is_finite() { -value } else { 1e8 - state.best.0 })
    }
}

impl<T: Target> Gradient for &Descent<'_, '_, T> {
    type Param = Vec<f64>;
    type Gradient = Vec<f64>;
    fn gradient(&self, unbounded: &Vec<f64>) -> Result<Vec<f64>, argmin::core::Error> {
        let mut state = self.state.borrow_mut();
        let steps = state.steps.clone();
        let slope =
            gradient(&mut |u: &[f64]| state.value(self.coordinates, u).max(-1e300), unbounded, &steps);
        // A side without an answer leaves a cliff of 1e300, which says nothing about the slope before it.
        Ok(slope.iter().map(|slope| if slope.abs() < 1e250 { -slope } else { 0.0 }).collect())
    }
}

/// L-BFGS from `start`; the best point seen, whatever the solver thinks of its own success.
fn climb<'a, T: Target>(
    mut evaluator: Evaluator<'a, T>,
    coordinates: &Coordinates,
    start: &[f64],
) -> (Vec<f64>, Evaluator<'a, T>) {
    const MEMORY: usize = 12;
    const ITERATIONS: u64 = 25;
    let unbounded = coordinates.to_unbounded(start);
    let dimension = coordinates.dimension();
    let mut point = vec![0.0; dimension];
    let mut steps = vec![1e-3; dimension];
    coordinates.to_point(&unbounded, &mut point);
    let value = evaluator.log_posterior(&point);
    let mut function = |u: &[f64]| {
        coordinates.to_point(u, &mut point);
        evaluator.log_posterior(&point)
    };
    fit_steps(&mut function, &unbounded, value, &mut steps);
    let descent = Descent {
        state: RefCell::new(DescentState { evaluator, point, best: (value, unbounded.clone()), steps }),
        coordinates,
    };
    let solver = LBFGS::new(MoreThuenteLineSearch::new(), MEMORY)
        .with_tolerance_grad(1e-3)
        .and_then(|solver| solver.with_tolerance_cost(1e-2));
    if let Ok(solver) = solver {
        // An error of the solver (a line search that found nothing) still leaves the best point seen.
        let _ = Executor::new(&descent, solver)
            .configure(|state| state.param(unbounded).max_iters(ITERATIONS))
            .ctrlc(false)
            .run();
    }
    let state = descent.state.into_inner();
    let mut best = vec![0.0; dimension];
    coordinates.to_point(&state.best.1, &mut best);
    (best, state.evaluator)
}
