//! Gauss-Legendre quadrature: one rule on [−1, 1], and rules made of panels.
//!
//! A rule of n points is exact for polynomials up to degree 2n − 1, and for a function that is analytic around its
//! interval the error falls like ρ^(−2n), where ρ > 1 tells how far from the interval the nearest singularity lies.
//! So panels are cut where an integrand is not smooth or oscillates, not to make steps small.

use std::num::NonZeroUsize;

/// Nodes and weights: ∫ f ≈ Σ weightᵢ f(nodeᵢ).
#[derive(Clone, Debug, PartialEq, Default)]
pub struct GaussLegendre {
    /// Where the integrand is taken, ascending if the panels' edges ascend.
    pub nodes: Vec<f64>,
    /// What each value counts; as many as nodes.
    pub weights: Vec<f64>,
}

impl GaussLegendre {
    /// The same rule moved from [−1, 1] to [low, high]; with low > high the weights are negative, as the integral is.
    pub fn on(&self, low: f64, high: f64) -> GaussLegendre {
        let mut rule = GaussLegendre::default();
        rule.append_panel(self, low, high);
        rule
    }

    /// Number of nodes.
    pub fn len(&self) -> usize {
        self.nodes.len()
    }

    /// Whether the rule has no node at all (then every integral is 0).
    pub fn is_empty(&self) -> bool {
        self.nodes.is_empty()
    }

    /// Σ weight f(node): the integral over the interval that the rule stands on.
    pub fn integrate(&self, mut integrand: impl FnMut(f64) -> f64) -> f64 {
        self.nodes.iter().zip(&self.weights).map(|(&node, &weight)| weight * integrand(node)).sum()
    }

    /// Adds the panel [low, high], with the nodes of `unit`, a rule on [−1, 1].
    pub fn append_panel(&mut self, unit: &GaussLegendre, low: f64, high: f64) {
        let (middle, half) = (0.5 * (low + high), 0.5 * (high - low));
        self.nodes.extend(unit.nodes.iter().map(|node| middle + half * node));
        self.weights.extend(unit.weights.iter().map(|weight| half * weight));
    }
}

/// The Gauss-Legendre rule of `points` points on [−1, 1], to the last digit or so; no points make an empty rule.
///
/// Nodes and weights come from the asymptotic expansions of Bogaert (2014, SIAM J. Sci. Comput. 36, A1008), as the
/// crate `gauss-quad` implements them: no iteration, and no loss for large rules.
pub fn gauss_legendre(points: usize) -> GaussLegendre {
    match NonZeroUsize::new(points) {
        None => GaussLegendre::default(),
        Some(points) => {
            let (nodes, weights) =
                gauss_quad::GaussLegendre::new(points).as_node_weight_pairs().iter().copied().unzip();
            GaussLegendre { nodes, weights }
        }
    }
}

/// A rule over the panels between neighbouring `edges`, with `points` nodes in each.
///
/// Fewer than two edges make an empty rule. Use it with edges at kinks, or as wide as a fixed number of oscillations.
pub fn composite(edges: &[f64], points: usize) -> GaussLegendre {
    let unit = gauss_legendre(points);
    let mut rule = GaussLegendre::default();
    for panel in edges.windows(2) {
        rule.append_panel(&unit, panel[0], panel[1]);
    }
    rule
}

/// `panels` + 1 edges from `low` to `high`, evenly spaced.
pub fn even(low: f64, high: f64, panels: usize) -> Vec<f64> {
    spaced(panels, low, high, |share| low + (high - low) * share)
}

/// `panels` + 1 edges from `low` to `high`, both above 0, evenly spaced in their logarithms.
pub fn geometric(low: f64, high: f64, panels: usize) -> Vec<f64> {
    spaced(panels, low, high, |share| low * (high / low).powf(share))
}

/// The two ends are what was asked for, to the last bit.
fn spaced(panels: usize, low: f64, high: f64, inner: impl Fn(f64) -> f64) -> Vec<f64> {
    (0..=panels)
        .map(|index| match index {
            0 => low,
            index if index == panels => high,
            index => inner(index as f64 / panels as f64),
        })
        .collect()
}
