//! Linear growth at fixed redshifts, fast: for likelihoods that ask again and again, and for many wavenumbers at once.

use std::array::from_fn;

use crate::background::Background;
use crate::errors::CosmologyError;
use crate::growth::{GrowthState, STARTING_SCALE_FACTOR, check_scale_factors, growth_states};
use crate::quadrature::{GaussLegendre, gauss_legendre};

/// Steps from a = 10⁻³ to today, equal in ln a: 0.036 each.
const STEPS: usize = 192;

/// Values of Q u that one step looks at: the new one and nine before it. Their differences up to the ninth enter.
const MEMORY: usize = 10;

/// Grid points of the polynomial in Q u that reads u and u′ off between the steps.
const STENCIL: usize = 10;

/// Where the ninth differences, summed over all steps and relative to u, come to more than this, the steps don't
/// resolve G or the background, and the adaptive method takes over.
const UNRESOLVED: f64 = 1e-8;

/// Rounds of fixed-point iteration for the first points, and the change at which they must have stopped.
const ROUNDS: usize = 24;
const SETTLED: f64 = 1e-13;

/// The growth equation at redshifts that stay the same while background and gravity move.
///
/// With D = u/(a √E) the equation D″ + (2 + d ln E/d ln a) D′ = (3/2) Ωm G D has no first derivative,
///
/// ```text
/// u″ = Q u,   Q = (3/2) Ωm(a) G + p²/4 + p′/2,   p = 2 + d ln E/d ln a,
/// ```
///
/// and the implicit multistep method of Cowell (Hairer, Nørsett & Wanner 1993, Solving Ordinary Differential Equations
/// I, §III.10) takes one value of Q a step; since the equation is linear the implicit part is a division. The first
/// points come from the integral equation by fixed-point iteration. All scale factors, and the weights that read u and
/// u′ off at the redshifts, are known beforehand. D and f agree with [`growth_states`] to 1e-8 (most often 1e-10); where
/// G or the background changes within a step (seen by the size of the ninth differences), [`growth_states`] itself
/// answers.
///
/// `lanes` are independent strengths of gravity (one for each wavenumber, say) that share the background's terms.
#[derive(Clone, Debug)]
pub struct GrowthSolver {
    scale_factors: Vec<f64>,
    log_grid: Vec<f64>,
    grid: Vec<f64>,
    step: f64,
    readings: Vec<Place>,
    /// Weights of Q u, newest first.
    cowell: [f64; MEMORY],
    /// Binomials with sign: the ninth difference.
    difference: [f64; MEMORY],
    /// Size of the first difference left out.
    left_out: f64,
    /// Double integrals of the polynomials through the first points: by upper end, then by point.
    start: [[f64; MEMORY]; MEMORY],
}

/// How u and u′ are read off at a redshift between grid points n and n + 1, a share t of the way from one to the next:
/// u is the chord between the two values less what its curvature Q u, a polynomial through several points, takes from
/// it. At the last steps those points lie on one side; a polynomial through u itself would lose three digits of u′ there.
#[derive(Clone, Debug)]
struct Place {
    before: usize,
    share: f64,
    /// First grid point of the polynomial.
    first: usize,
    /// Weights of Q u for u and for u′ times the step.
    value: [f64; STENCIL],
    slope: [f64; STENCIL],
}

impl Place {
    fn new(steps: f64, rule: &GaussLegendre) -> Place {
        let before = (steps.floor().max(0.0) as usize).min(STEPS - 1);
        let share = steps - before as f64;
        let first = before.saturating_sub(STENCIL / 2 - 1).min(STEPS + 1 - STENCIL);
        let from = (before - first) as f64;
        let (single, double) = integrals::<STENCIL>(from, share, rule);
        let (_, whole) = integrals::<STENCIL>(from, 1.0, rule);
        Place {
            before,
            share,
            first,
            value: from_fn(|j| double[j] - share * whole[j]),
            slope: from_fn(|j| single[j] - whole[j]),
        }
    }

    /// u and u′ times the step, of one lane.
    fn read<const L: usize>(&self, values: &[[f64; L]], forces: &[[f64; L]], lane: usize) -> (f64, f64) {
        let (before, after) = (values[self.before][lane], values[self.before + 1][lane]);
        let stencil = &forces[self.first..self.first + STENCIL];
        let sum = |weights: &[f64; STENCIL]| -> f64 {
            weights.iter().zip(stencil).map(|(weight, force)| weight * force[lane]).sum()
        };
        (before + self.share * (after - before) + sum(&self.value), after - before + sum(&self.slope))
    }
}

/// ∫ℓⱼ(x + t) dt and ∫(length − t) ℓⱼ(x + t) dt from 0 to `length`, for the polynomials ℓⱼ that are 1 at j and 0 at the
/// other integers below N. `rule` is exact for them.
fn integrals<const N: usize>(from: f64, length: f64, rule: &GaussLegendre) -> ([f64; N], [f64; N]) {
    let (mut single, mut double) = ([0.0; N], [0.0; N]);
    let rule = rule.on(0.0, length);
    for (t, weight) in rule.nodes.iter().zip(&rule.weights) {
        for j in 0..N {
            let others = (0..N).filter(|&i| i != j);
            let value: f64 = others.map(|i| (from + t - i as f64) / (j as f64 - i as f64)).product();
            single[j] += weight * value;
            double[j] += weight * (length - t) * value;
        }
    }
    (single, double)
}

/// Reusable storage of a [`GrowthSolver`].
#[derive(Clone, Debug, Default)]
pub struct GrowthScratch {
    /// (3/2) Ωm(a), and the rest of Q, by step.
    terms: Vec<(f64, f64)>,
    /// u′/u at the start.
    start_slope: f64,
    /// G by step, then by lane.
    gravity: Vec<f64>,
    raw: Vec<Reading>,
}

/// u/u(start) and u′/u(start) at a redshift, and the error that the differences tell of (of all redshifts together).
#[derive(Clone, Copy, Debug, Default)]
struct Reading {
    value: f64,
    slope: f64,
    error: f64,
}

/// Coefficients of (t/ln(1−t))², and from them the weights of the values themselves.
fn cowell_weights() -> ([f64; MEMORY], f64) {
    let series: [f64; MEMORY + 1] = from_fn(|j| 1.0 / (j + 1) as f64);
    let mut inverse = [0.0; MEMORY + 1];
    inverse[0] = 1.0;
    for j in 1..=MEMORY {
        inverse[j] = -(0..j).map(|i| inverse[i] * series[j - i]).sum::<f64>();
    }
    let square: [f64; MEMORY + 1] = from_fn(|j| (0..=j).map(|i| inverse[i] * inverse[j - i]).sum());
    let weights = from_fn(|i| {
        let sum: f64 = (i..MEMORY).map(|j| square[j] * binomial(j, i)).sum();
        if i % 2 == 0 { sum } else { -sum }
    });
    (weights, square[MEMORY].abs())
}

fn binomial(n: usize, k: usize) -> f64 {
    (0..k).map(|i| (n - i) as f64 / (i + 1) as f64).product()
}

impl GrowthSolver {
    /// Prepares the steps for these scale factors, each in [10⁻³, 1], in any order.
    ///
    /// # Errors
    /// A scale factor outside that range.
    pub fn new(scale_factors: &[f64]) -> Result<Self, CosmologyError> {
        check_scale_factors(scale_factors)?;
        let first = STARTING_SCALE_FACTOR.ln();
        let step = -first / STEPS as f64;
        let log_grid: Vec<f64> = (0..=STEPS).map(|n| step * (n as f64 - STEPS as f64)).collect();
        let mut grid: Vec<f64> = log_grid.iter().map(|x| x.exp()).collect();
        grid[STEPS] = 1.0;
        // Exact for the polynomials of the first points and of the readings.
        let rule = gauss_legendre(MEMORY.max(STENCIL));
        let places = scale_factors.iter().map(|a| (a.ln() - first) / step);
        let readings = places.map(|place| Place::new(place, &rule)).collect();
        let (cowell, left_out) = cowell_weights();
        let difference =
            from_fn(|i| if i % 2 == 0 { binomial(MEMORY - 1, i) } else { -binomial(MEMORY - 1, i) });
        let start = from_fn(|end| integrals::<MEMORY>(0.0, end as f64, &rule).1);
        let scale_factors = scale_factors.to_vec();
        Ok(Self { scale_factors, log_grid, grid, step, readings, cowell, difference, left_out, start })
    }

    /// The scale factors it was made for.
    pub fn scale_factors(&self) -> &[f64] {
        &self.scale_factors
    }

    /// Growth in general relativity, one state a scale factor, D divided by today's.
    ///
    /// # Errors
    /// E² ≤ 0 on the way from a = 10⁻³ to today, and whatever [`growth_states`] finds where it has to answer.
    pub fn general_relativity(
        &self,
        background: &Background,
        scratch: &mut GrowthScratch,
        out: &mut Vec<GrowthState>,
    ) -> Result<(), CosmologyError> {
        self.fill_terms(background, scratch)?;
        self.run::<1>(scratch, |_, _| [1.0]);
        out.clear();
        if !scratch.raw.iter().all(Reading::is_good) {
            out.extend(growth_states(background, &|_| 1.0, &self.scale_factors)?);
            return Ok(());
        }
        let nodes = self.scale_factors.len();
        let today = self.growth(background, 1.0, &scratch.raw[nodes]);
        for (&a, reading) in self.scale_factors.iter().zip(&scratch.raw) {
            out.push(self.state(background, a, 1.0, today, reading));
        }
        Ok(())
    }

    /// Growth under `lanes` strengths of gravity: `gravity(a, g)` writes G at scale factor a into `g`, one a lane. The
    /// states come by scale factor, then by lane; D is divided by today's in general relativity.
    ///
    /// # Errors
    /// As [`GrowthSolver::general_relativity`], and as [`growth_states`] for a G that is not finite or so negative that
    /// D falls to 0.
    pub fn states(
        &self,
        background: &Background,
        lanes: usize,
        gravity: &mut dyn FnMut(f64, &mut [f64]),
        scratch: &mut GrowthScratch,
        out: &mut Vec<GrowthState>,
    ) -> Result<(), CosmologyError> {
        const WIDTH: usize = 8;
        self.fill_terms(background, scratch)?;
        let nodes = self.scale_factors.len();
        self.run::<1>(scratch, |_, _| [1.0]);
        let today_is_good = scratch.raw[nodes].is_good();
        let today = self.growth(background, 1.0, &scratch.raw[nodes]);
        let padded = lanes.next_multiple_of(WIDTH);
        scratch.gravity.clear();
        scratch.gravity.resize((STEPS + 1 + nodes) * padded, 1.0);
        let places = self.grid.iter().chain(&self.scale_factors);
        for (&a, row) in places.zip(scratch.gravity.chunks_exact_mut(padded)) {
            gravity(a, &mut row[..lanes]);
        }
        out.clear();
        out.resize(nodes * lanes, GrowthState { growth: 0.0, rate: 0.0, rate_slope: 0.0 });
        for first in (0..lanes).step_by(WIDTH) {
            if lanes == 1 {
                self.run::<1>(scratch, |gravity, step| [gravity[step * padded]]);
            } else {
                self.run::<WIDTH>(scratch, |gravity, step| from_fn(|i| gravity[step * padded + first + i]));
            }
            let width = if lanes == 1 { 1 } else { WIDTH };
            for lane in first..(first + width).min(lanes) {
                let readings = |node: usize| &scratch.raw[node * width + lane - first];
                let good = today_is_good && (0..=nodes).all(|node| readings(node).is_good());
                if good {
                    for (node, &a) in self.scale_factors.iter().enumerate() {
                        let strength = scratch.gravity[(STEPS + 1 + node) * padded + lane];
                        out[node * lanes + lane] = self.state(background, a, strength, today, readings(node));
                    }
                } else {
                    let all = std::cell::RefCell::new((&mut *gravity, vec![0.0; lanes]));
                    let one = |a: f64| {
                        let (gravity, values) = &mut *all.borrow_mut();
                        gravity(a, values);
                        values[lane]
                    };
                    let states = growth_states(background, &one, &self.scale_factors)?;
                    for (node, state) in states.into_iter().enumerate() {
                        out[node * lanes + lane] = state;
                    }
                }
            }
        }
        Ok(())
    }

    fn fill_terms(&self, background: &Background, scratch: &mut GrowthScratch) -> Result<(), CosmologyError> {
        background.check_past(STARTING_SCALE_FACTOR)?;
        scratch.terms.clear();
        let grid = self.log_grid.iter().zip(&self.grid);
        scratch.terms.extend(grid.map(|(&log_a, &a)| {
            let (slope, curvature, matter_fraction) = background.normal_form(a, log_a);
            let friction = 2.0 + slope;
            (1.5 * matter_fraction, 0.25 * friction * friction + 0.5 * curvature)
        }));
        // D = D′ and u = D a √E: u′/u = 2 + ½ d ln E/d ln a.
        scratch.start_slope = 2.0 + 0.5 * background.expansion_slope(self.grid[0]);
        Ok(())
    }

    /// D(a) for D = a at the start, from u over its value there: D = a₀ u/u₀ · (a₀ √E₀)/(a √E).
    fn growth(&self, background: &Background, a: f64, reading: &Reading) -> f64 {
        let start = self.grid[0];
        let ratio = (background.expansion(start) / background.expansion(a)).sqrt();
        start * reading.value * start / a * ratio
    }

    fn state(
        &self,
        background: &Background,
        a: f64,
        gravity: f64,
        today: f64,
        reading: &Reading,
    ) -> GrowthState {
        let slope = background.expansion_slope(a);
        let rate = reading.slope / reading.value - 1.0 - 0.5 * slope;
        let pull = 1.5 * background.matter_fraction(a) * gravity;
        GrowthState {
            growth: self.growth(background, a, reading) / today,
            rate,
            rate_slope: pull - rate * rate - (2.0 + slope) * rate,
        }
    }

    /// Integrates L lanes at once; `strength(gravity, step)` are their G. Leaves the readings of each scale factor and of
    /// today in `scratch.raw`, by place, then by lane.
    fn run<const L: usize>(&self, scratch: &mut GrowthScratch, strength: impl Fn(&[f64], usize) -> [f64; L]) {
        let GrowthScratch { terms, start_slope, gravity, raw } = scratch;
        let square = self.step * self.step;
        let pull = |step: usize| -> [f64; L] {
            let (matter, rest) = terms[step];
            strength(gravity, step).map(|strength| square * (matter * strength + rest))
        };
        // u over its first value, and Q u times the step's square.
        let mut values = [[1.0; L]; STEPS + 1];
        let mut forces = [[0.0; L]; STEPS + 1];
        let settled = self.first_points(*start_slope, pull, &mut values, &mut forces);
        let mut error = [if settled { 0.0 } else { f64::INFINITY }; L];
        // u(n) − u(n−1), carried along: second differences added to u itself would lose digits.
        let mut change: [f64; L] = from_fn(|i| values[MEMORY - 1][i] - values[MEMORY - 2][i]);
        for step in MEMORY..=STEPS {
            let pull = pull(step);
            let mut known = [0.0; L];
            for (weight, force) in self.cowell[1..].iter().zip(forces[..step].iter().rev()) {
                for i in 0..L {
                    known[i] += weight * force[i];
                }
            }
            for i in 0..L {
                let ahead = values[step - 1][i] + change[i] + known[i];
                let now = ahead / (1.0 - self.cowell[0] * pull[i]);
                let force = pull[i] * now;
                change[i] += known[i] + self.cowell[0] * force;
                values[step][i] = now;
                forces[step][i] = force;
            }
            let mut last = [0.0; L];
            for (weight, force) in self.difference.iter().zip(forces[..=step].iter().rev()) {
                for i in 0..L {
                    last[i] += weight * force[i];
                }
            }
            for i in 0..L {
                // A u that falls to 0 or is no number is no growth: the error is then no small number.
                let now = values[step][i];
                error[i] += if now > 0.0 { (last[i] / now).abs() } else { f64::INFINITY };
            }
        }
        let error = error.map(|sum| self.left_out * sum);
        raw.clear();
        for place in &self.readings {
            raw.extend((0..L).map(|lane| {
                let (value, slope) = place.read(&values, &forces, lane);
                Reading { value, slope: slope / self.step, error: error[lane] }
            }));
        }
        raw.extend((0..L).map(|i| Reading { value: values[STEPS][i], slope: 0.0, error: error[i] }));
    }

    /// The first points, from u(x) = 1 + u′x + ∫₀ˣ (x − t) Q u dt with the polynomial through them under the integral,
    /// by iteration: each round shrinks the error by half the square of their range times Q, 0.05 in general relativity.
    /// Tells whether it settled.
    fn first_points<const L: usize>(
        &self,
        slope: f64,
        pull: impl Fn(usize) -> [f64; L],
        values: &mut [[f64; L]],
        forces: &mut [[f64; L]],
    ) -> bool {
        let slope = slope * self.step;
        let pulls: [[f64; L]; MEMORY] = from_fn(pull);
        let mut moved = f64::INFINITY;
        for (place, values) in values[..MEMORY].iter_mut().enumerate() {
            *values = [1.0 + slope * place as f64; L];
        }
        for _ in 0..ROUNDS {
            for place in 0..MEMORY {
                forces[place] = from_fn(|i| pulls[place][i] * values[place][i]);
            }
            if moved < SETTLED {
                return true;
            }
            moved = 0.0;
            for (place, weights) in self.start.iter().enumerate() {
                for i in 0..L {
                    let sum: f64 =
                        weights.iter().zip(&*forces).map(|(weight, force)| weight * force[i]).sum();
                    let now = 1.0 + slope * place as f64 + sum;
                    let change = ((now - values[place][i]) / now).abs();
                    // A change that is no number must not count as none.
                    moved = if change <= moved { moved } else { change };
                    values[place][i] = now;
                }
            }
        }
        false
    }
}

impl Reading {
    fn is_good(&self) -> bool {
        self.error < UNRESOLVED && self.value > 0.0 && self.slope.is_finite()
    }
}
