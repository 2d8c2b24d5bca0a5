//! The clock contrast's integral as a sum over points in ln k.

use super::{ClockContrasts, HIGHEST, LOWEST};
use oddwell_model::ModelError;

/// Points of the grid: 0.04 apart in ln k. (T D)² changes over an e-fold of k, and a straight line in between errs by
/// 0.04²/8 of its second derivative: 2e-4 where that is 1, in alternating senses, so that less of c is left.
const POINTS: usize = 306;

/// A point with less of c² than this is left out; all of them together hold 3e-7 of it at most.
const NEGLIGIBLE: f64 = 1e-9;

/// The grid, from the lowest wavenumber to the highest (h/Mpc).
pub(super) fn grid() -> impl Iterator<Item = f64> {
    (0..POINTS).map(|point| LOWEST * (spacing() * point as f64).exp())
}

fn spacing() -> f64 {
    (HIGHEST / LOWEST).ln() / (POINTS - 1) as f64
}

/// The point below a wavenumber and how far it is on to the next, 0 to 1; at its ends the grid holds on.
pub(super) fn between(k: f64) -> (usize, f64) {
    let position = ((k / LOWEST).ln() / spacing()).clamp(0.0, (POINTS - 1) as f64);
    let first = (position as usize).min(POINTS - 2);
    (first, position - first as f64)
}

/// c² = ((3/2) Ωm(a) H² σ8)² Σ weight · (T D)², with (T D)² a straight line in ln k between points.
#[derive(Clone, Debug)]
pub(crate) struct KWeights(Vec<(f64, f64)>);

impl KWeights {
    /// Each weight is the integral over the triangle around its point; the shape of the spectrum is that of `values`.
    ///
    /// # Errors
    /// [`ModelError`] where the spectrum has no value.
    pub(super) fn new(contrasts: &ClockContrasts, values: &[f64]) -> Result<KWeights, ModelError> {
        let power = contrasts.power(values, 1.0)?;
        let weight = |(point, k): (usize, f64)| {
            let triangle = |k: f64| {
                let (first, share) = between(k);
                let height = if first == point {
                    1.0 - share
                } else if first + 1 == point {
                    share
                } else {
                    0.0
                };
                height.sqrt()
            };
            Ok((k, contrasts.integral_of(values, &power, &triangle)?.powi(2)))
        };
        let mut weights = grid().enumerate().map(weight).collect::<Result<Vec<_>, ModelError>>()?;
        let total: f64 = weights.iter().map(|(_, weight)| weight).sum();
        weights.retain(|(_, weight)| *weight > NEGLIGIBLE * total);
        Ok(KWeights(weights))
    }

    /// Wavenumbers (h/Mpc) and weights.
    pub(super) fn points(&self) -> impl Iterator<Item = (f64, f64)> {
        self.0.iter().copied()
    }
}
