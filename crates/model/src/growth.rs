//! Growth at the redshift nodes, as a function of k where gravity depends on it.

use crate::error::ModelError;
use crate::knots::Knots;
use oddwell_cosmology::{
    Background, GrowthScratch, GrowthSolver, GrowthState, Wavenumbers, growth_from_index,
};
use std::f64::consts::PI;

/// Chebyshev points in ln k a unit of ln k. A field of any mass gives τ = k²/(k² + m²), so growth has its singularities
/// at Im ln k = ±π/2 and the polynomial through n points over a range L errs by ρ^(−n), ln ρ ≈ π/L: exp(−π × 5.5) = 3e-8
/// of the (small) part of growth that depends on k.
const POINTS_PER_UNIT: f64 = 5.5;

/// The wavenumbers at which growth is integrated, and how to come from them to others.
#[derive(Clone, Debug)]
pub(crate) struct GrowthTable {
    wavenumbers: Wavenumbers,
    low: f64,
    high: f64,
    /// Weights of the points that give the value at each knot: by knot, then by point.
    at_knots: Vec<f64>,
}

impl GrowthTable {
    pub(crate) fn new(knots: &Knots) -> Result<GrowthTable, ModelError> {
        let (low, high) = knots.range();
        let (low, high) = (low.ln(), high.ln());
        let points = ((high - low) * POINTS_PER_UNIT).ceil().max(8.0) as usize;
        let place = |i: usize| {
            let unit = -(PI * (2 * i + 1) as f64 / (2 * points) as f64).cos();
            (0.5 * (low + high) + 0.5 * (high - low) * unit).exp()
        };
        let wavenumbers = Wavenumbers::new((0..points).map(place).collect())?;
        let mut table = GrowthTable { wavenumbers, low, high, at_knots: Vec::new() };
        let mut at_knots = Vec::with_capacity(knots.reached() * points);
        for &log_k in &knots.wavenumbers().logarithms()[..knots.reached()] {
            at_knots.extend(table.weights(log_k));
        }
        table.at_knots = at_knots;
        Ok(table)
    }

    /// Weights of the points for ln k (the range's end for one outside), by the barycentric formula.
    fn weights(&self, log_k: f64) -> Vec<f64> {
        let points = self.wavenumbers.len();
        let log_k = log_k.clamp(self.low, self.high);
        let apart = |i: usize| log_k - self.wavenumbers.logarithms()[i];
        if let Some(exact) = (0..points).find(|&i| apart(i) == 0.0) {
            return (0..points).map(|i| f64::from(u8::from(i == exact))).collect();
        }
        let mut weights: Vec<f64> = (0..points)
            .map(|i| {
                let weight = (PI * (2 * i + 1) as f64 / (2 * points) as f64).sin() / apart(i);
                if i % 2 == 0 { weight } else { -weight }
            })
            .collect();
        let sum: f64 = weights.iter().sum();
        weights.iter_mut().for_each(|weight| *weight /= sum);
        weights
    }
}

/// Writes G at a scale factor and many wavenumbers (h/Mpc).
pub(crate) type Gravity<'a> = dyn Fn(f64, &[f64], &mut [f64]) + 'a;

/// What growth follows.
#[derive(Clone, Copy)]
pub(crate) enum Law<'a> {
    /// General relativity.
    Einstein,
    /// f = Ωm(a)^γ.
    Index(f64),
    /// G(a), the same for all wavenumbers.
    Gravity(&'a dyn Fn(f64) -> f64),
    /// G(a, k).
    ScaleDependent(&'a Gravity<'a>),
}

/// D, f and f′ at each redshift node.
#[derive(Clone, Debug, Default)]
pub(crate) struct Growth {
    /// By node, then by wavenumber of the table (one only where growth does not depend on scale).
    states: Vec<GrowthState>,
    lanes: usize,
    /// By node, then by knot; empty where growth does not depend on scale.
    at_knots: Vec<GrowthState>,
    knots: usize,
    scratch: GrowthScratch,
}

impl Growth {
    pub(crate) fn fill(
        &mut self,
        law: Law<'_>,
        background: &Background,
        solver: &GrowthSolver,
        table: Option<&GrowthTable>,
    ) -> Result<(), ModelError> {
        let Growth { states, lanes, scratch, .. } = self;
        *lanes = 1;
        self.at_knots.clear();
        match (law, table) {
            (Law::Einstein, _) => solver.general_relativity(background, scratch, states)?,
            (Law::Index(gamma), _) => *states = growth_from_index(background, gamma, solver.scale_factors())?,
            (Law::Gravity(gravity), _) => {
                let mut fill = |a: f64, out: &mut [f64]| out.fill(gravity(a));
                solver.states(background, 1, &mut fill, scratch, states)?;
            }
            (Law::ScaleDependent(gravity), Some(table)) => {
                *lanes = table.wavenumbers.len();
                let mut fill = |a: f64, out: &mut [f64]| gravity(a, table.wavenumbers.values(), out);
                solver.states(background, *lanes, &mut fill, scratch, states)?;
                self.fill_knots(table);
            }
            // A model whose gravity depends on scale has a table.
            (Law::ScaleDependent(_), None) => states.clear(),
        }
        Ok(())
    }

    fn fill_knots(&mut self, table: &GrowthTable) {
        self.knots = table.at_knots.len() / self.lanes;
        for states in self.states.chunks_exact(self.lanes) {
            let knots = table.at_knots.chunks_exact(self.lanes);
            self.at_knots.extend(knots.map(|weights| combine(weights, states)));
        }
    }

    /// At a node, where growth does not depend on scale.
    pub(crate) fn at_node(&self, node: usize) -> GrowthState {
        self.states[node * self.lanes]
    }

    /// At a node and a knot.
    pub(crate) fn at_knot(&self, node: usize, knot: usize) -> GrowthState {
        if self.at_knots.is_empty() { self.at_node(node) } else { self.at_knots[node * self.knots + knot] }
    }

    /// At a node and any wavenumber (h/Mpc).
    pub(crate) fn at(&self, node: usize, k: f64, table: Option<&GrowthTable>) -> GrowthState {
        match table {
            Some(table) if self.lanes > 1 => {
                combine(&table.weights(k.ln()), &self.states[node * self.lanes..(node + 1) * self.lanes])
            }
            _ => self.at_node(node),
        }
    }
}

/// Σ weight × state.
fn combine(weights: &[f64], states: &[GrowthState]) -> GrowthState {
    let mut sum = GrowthState { growth: 0.0, rate: 0.0, rate_slope: 0.0 };
    for (weight, state) in weights.iter().zip(states) {
        sum.growth += weight * state.growth;
        sum.rate += weight * state.rate;
        sum.rate_slope += weight * state.rate_slope;
    }
    sum
}
