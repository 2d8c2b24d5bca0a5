//! Unbounded coordinates in which the prior is about one unit wide: what the peak search moves in.

use crate::priors::PriorSet;

/// x as a function of an unbounded u, one dimension.
#[derive(Debug, Clone, Copy)]
enum Map {
    /// x = centre + spread · u.
    Line { centre: f64, spread: f64 },
    /// x = edge + sign · width · eᵘ: one finite end.
    Ray { edge: f64, signed_width: f64 },
    /// x = low + width / (1 + e^(−4u)): two finite ends; slope `width` in the middle.
    Segment { low: f64, high: f64 },
}

/// The map of every dimension.
#[derive(Debug, Clone)]
pub(super) struct Coordinates {
    maps: Vec<Map>,
    spreads: Vec<f64>,
}

impl Coordinates {
    /// Coordinates from the supports and spreads of the marginal priors.
    pub(super) fn new(priors: &PriorSet) -> Self {
        let spreads: Vec<f64> = (0..priors.dimension()).map(|dimension| priors.spread(dimension)).collect();
        let maps = (0..priors.dimension())
            .map(|dimension| match priors.support(dimension) {
                (low, high) if low.is_finite() && high.is_finite() => Map::Segment { low, high },
                (low, _) if low.is_finite() => {
                    Map::Ray { edge: low, signed_width: priors.median(dimension) - low }
                }
                (_, high) if high.is_finite() => {
                    Map::Ray { edge: high, signed_width: priors.median(dimension) - high }
                }
                _ => Map::Line { centre: priors.median(dimension), spread: spreads[dimension] },
            })
            .collect();
        Self { maps, spreads }
    }

    /// Number of dimensions.
    pub(super) fn dimension(&self) -> usize {
        self.maps.len()
    }

    /// Width of the marginal prior, the unit of length of a dimension.
    pub(super) fn spread(&self, dimension: usize) -> f64 {
        self.spreads[dimension]
    }

    /// From unbounded to physical coordinates; always inside the support, possibly on its edge.
    pub(super) fn to_point(&self, unbounded: &[f64], point: &mut [f64]) {
        for ((x, map), u) in point.iter_mut().zip(&self.maps).zip(unbounded) {
            *x = match *map {
                Map::Line { centre, spread } => centre + spread * u,
                Map::Ray { edge, signed_width } => edge + signed_width * u.min(700.0).exp(),
                Map::Segment { low, high } => {
                    let width = high - low;
                    // From the nearer end, so that no digits are lost there.
                    if *u < 0.0 {
                        low + width * ((4.0 * u).exp() / (1.0 + (4.0 * u).exp()))
                    } else {
                        high - width * ((-4.0 * u).exp() / (1.0 + (-4.0 * u).exp()))
                    }
                }
            };
        }
    }

    /// From physical to unbounded coordinates; points on or beyond an edge land a millionth of a width inside.
    pub(super) fn to_unbounded(&self, point: &[f64]) -> Vec<f64> {
        const INSIDE: f64 = 1e-6;
        self.maps
            .iter()
            .zip(point)
            .map(|(map, x)| match *map {
                Map::Line { centre, spread } => (x - centre) / spread,
                Map::Ray { edge, signed_width } => ((x - edge) / signed_width).max(INSIDE).ln(),
                Map::Segment { low, high } => {
                    let share = ((x - low) / (high - low)).clamp(INSIDE, 1.0 - INSIDE);
                    0.25 * (share / (1.0 - share)).ln()
                }
            })
            .collect()
    }
}
