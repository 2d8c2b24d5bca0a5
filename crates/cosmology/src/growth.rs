//! Linear growth of matter: from the growth equation with any strength of gravity G(a), or from a growth index.

use std::sync::LazyLock;

use ode_solvers::dop_shared::IntegrationError;
use ode_solvers::{Dop853, OutputType, System, Vector3};

use crate::background::Background;
use crate::errors::CosmologyError;
use crate::quadrature::{GaussLegendre, gauss_legendre};

/// Scale factor at which the growth equation starts, with D = D′ = a.
pub const STARTING_SCALE_FACTOR: f64 = 1e-3;

/// Tolerance of each step, relative, of D/a. The steps' errors add up to less than 1e-11 of D and f.
const STEP_TOLERANCE: f64 = 1e-12;

/// Longest step in ln a: of a G that changes within a tenth of it, a longer one could see nothing at all.
const LONGEST_STEP: f64 = 0.3;

/// Points of the growth index's integral.
static INDEX_RULE: LazyLock<GaussLegendre> = LazyLock::new(|| gauss_legendre(64));

/// Growth relative to today's in general relativity.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GrowthState {
    /// D(a)/D_GR(1): the amplitude of the matter field over today's in general relativity.
    pub growth: f64,
    /// f = d ln D/d ln a.
    pub rate: f64,
    /// f′ = df/d ln a.
    pub rate_slope: f64,
}

/// Growth with D = D′ = a at a = 10⁻³.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RawGrowth {
    /// D(a).
    pub growth: f64,
    /// f = d ln D/d ln a.
    pub rate: f64,
    /// f′ = df/d ln a.
    pub rate_slope: f64,
}

/// The growth equation for (g, g′, ln a) with g = D/a.
///
/// ln a is carried along as a third unknown of slope 1, and the solver's own independent variable is never read: in
/// `ode_solvers` 0.6.2 the node of the twelfth stage of `Dop853` is 0 where it must be 1 (the sum of that stage's
/// coefficients), so with equations that read the independent variable the method falls to first order and ends in a
/// false report of stiffness. Autonomous equations don't use the nodes, and get the full order.
struct Equation<'a> {
    background: &'a Background,
    gravity: &'a dyn Fn(f64) -> f64,
}

impl Equation<'_> {
    /// (2 + d ln E/d ln a, 1.5 Ωm(a) G(a)): friction and pull.
    fn terms(&self, log_a: f64) -> (f64, f64) {
        let (a, slope, matter_fraction) = self.background.growth_terms(log_a);
        // e^(ln a) may come out a last digit above 1, where G need not be defined.
        (2.0 + slope, 1.5 * matter_fraction * (self.gravity)(a.min(1.0)))
    }
}

impl System<f64, Vector3<f64>> for Equation<'_> {
    fn system(&self, _: f64, state: &Vector3<f64>, slope: &mut Vector3<f64>) {
        let (friction, pull) = self.terms(state[2]);
        slope[0] = state[1];
        slope[1] = (pull - 1.0 - friction) * state[0] - (2.0 + friction) * state[1];
        slope[2] = 1.0;
    }
}

/// Solves D″ + (2 + d ln E/d ln a) D′ = (3/2) Ωm(a) G(a) D from a = 10⁻³, where D = D′ = a, and returns D, f and f′ at
/// each of `scale_factors` (in any order, each in [10⁻³, 1]), in their order.
///
/// `gravity` is G(a): how much more strongly matter is pulled than in general relativity (where it is 1).
/// f′ comes from the equation, f′ = (3/2) Ωm G − f² − (2 + d ln E/d ln a) f, not from a difference.
///
/// The unknown is g = D/a, which stays of order one and is constant as long as matter dominates, so that the relative
/// tolerance of the Runge-Kutta method (Dormand & Prince, order 8(5,3), crate `ode_solvers`) means the same at all
/// times. The integration runs once through the sorted scale factors, stopping at each: the interpolation between
/// steps is of order 7 only. D and f are good to 1e-10.
///
/// # Errors
/// A scale factor outside [10⁻³, 1]; E² ≤ 0 on the way from a = 10⁻³ to today; G that is not finite, or so rough that
/// steps shrink to nothing, or so negative (−1 from early on) that D falls to 0.
pub fn growth_history(
    background: &Background,
    gravity: &dyn Fn(f64) -> f64,
    scale_factors: &[f64],
) -> Result<Vec<RawGrowth>, CosmologyError> {
    check_scale_factors(scale_factors)?;
    background.check_past(STARTING_SCALE_FACTOR)?;
    let mut order: Vec<usize> = (0..scale_factors.len()).collect();
    order.sort_by(|&i, &j| scale_factors[i].total_cmp(&scale_factors[j]));
    let equation = Equation { background, gravity };
    let mut log_a = STARTING_SCALE_FACTOR.ln();
    let mut state = Vector3::new(1.0, 0.0, log_a);
    let mut step = LONGEST_STEP;
    let mut history = vec![RawGrowth { growth: 0.0, rate: 0.0, rate_slope: 0.0 }; scale_factors.len()];
    for index in order {
        let a = scale_factors[index];
        let target = a.ln();
        if target > log_a {
            state = advance(&equation, log_a, target, state, &mut step)?;
            log_a = target;
            state[2] = target;
        }
        let (friction, pull) = equation.terms(target);
        let rate = 1.0 + state[1] / state[0];
        let growth = a * state[0];
        let rate_slope = pull - rate * rate - friction * rate;
        if !(growth.is_finite() && rate.is_finite() && rate_slope.is_finite()) {
            return Err(CosmologyError::Growth {
                scale_factor: a,
                reason: "it is not a finite number".into(),
            });
        }
        history[index] = RawGrowth { growth, rate, rate_slope };
    }
    Ok(history)
}

/// Integrates from ln a = `from` to `to`, starting with the step `step`, which is left at the longest that was taken.
fn advance(
    equation: &Equation<'_>,
    from: f64,
    to: f64,
    state: Vector3<f64>,
    step: &mut f64,
) -> Result<Vector3<f64>, CosmologyError> {
    let system = Equation { background: equation.background, gravity: equation.gravity };
    // The solver's own defaults, but for the first and the longest step.
    let (safety, damping, shrink, grow, most_steps, stiffness_after) = (0.9, 0.0, 0.333, 6.0, 100_000, 1000);
    let mut solver = Dop853::from_param(
        system,
        from,
        to,
        to - from,
        state,
        STEP_TOLERANCE,
        STEP_TOLERANCE,
        safety,
        damping,
        shrink,
        grow,
        LONGEST_STEP,
        step.min(to - from),
        most_steps,
        stiffness_after,
        OutputType::Sparse,
    );
    let fail = |x: f64, reason: &str| CosmologyError::Growth { scale_factor: x.exp(), reason: reason.into() };
    solver.integrate().map_err(|error| match error {
        IntegrationError::MaxNumStepReached { x, .. } => fail(x, "too many steps"),
        IntegrationError::StepSizeUnderflow { x } => fail(x, "the steps shrank to nothing"),
        IntegrationError::StiffnessDetected { x } => fail(x, "the equation became stiff"),
    })?;
    if let Some(index) = solver.y_out().iter().position(|state| state[0] <= 0.0) {
        return Err(fail(solver.x_out()[index], "the amplitude of matter fell to 0"));
    }
    *step = solver.x_out().windows(2).map(|pair| pair[1] - pair[0]).fold(0.0, f64::max);
    solver.y_out().last().copied().ok_or_else(|| fail(to, "no step was taken"))
}

pub(crate) fn check_scale_factors(scale_factors: &[f64]) -> Result<(), CosmologyError> {
    for &a in scale_factors {
        if !(STARTING_SCALE_FACTOR..=1.0).contains(&a) {
            return Err(CosmologyError::OutOfRange {
                name: "scale factor",
                value: a,
                rule: "at least 0.001 and at most 1",
                way_out: "give a redshift between 0 and 999",
            });
        }
    }
    Ok(())
}

/// As [`growth_history`], with D divided by today's in general relativity (G = 1) from the same start: what
/// multiplies a field whose σ8 is today's in general relativity.
pub fn growth_states(
    background: &Background,
    gravity: &dyn Fn(f64) -> f64,
    scale_factors: &[f64],
) -> Result<Vec<GrowthState>, CosmologyError> {
    let today = growth_history(background, &|_| 1.0, &[1.0])?[0].growth;
    Ok(growth_history(background, gravity, scale_factors)?
        .into_iter()
        .map(|raw| GrowthState { growth: raw.growth / today, rate: raw.rate, rate_slope: raw.rate_slope })
        .collect())
}

/// Growth by index (Linder 2005, Phys. Rev. D 72, 043529): f = Ωm(a)^γ, f′ = γ f d ln Ωm/d ln a,
/// D = exp(−∫ₐ¹ f d ln a), so D(1) = 1. `gamma` is finite; scale factors in [10⁻³, 1], in any order.
pub fn growth_from_index(
    background: &Background,
    gamma: f64,
    scale_factors: &[f64],
) -> Result<Vec<GrowthState>, CosmologyError> {
    if !gamma.is_finite() {
        return Err(CosmologyError::OutOfRange {
            name: "growth_index",
            value: gamma,
            rule: "finite",
            way_out: "give 0.55 for general relativity",
        });
    }
    check_scale_factors(scale_factors)?;
    background.check_past(STARTING_SCALE_FACTOR)?;
    let rate_at = |a: f64| background.matter_fraction(a).powf(gamma);
    Ok(scale_factors
        .iter()
        .map(|&a| {
            let half = -0.5 * a.ln();
            let sum: f64 = (INDEX_RULE.nodes.iter().zip(&INDEX_RULE.weights))
                .map(|(node, weight)| weight * rate_at((-half * (1.0 + node)).exp()))
                .sum();
            let rate = rate_at(a);
            GrowthState {
                growth: (-half * sum).exp(),
                rate,
                rate_slope: gamma * rate * background.matter_fraction_slope(a),
            }
        })
        .collect())
}
