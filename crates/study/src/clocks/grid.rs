//! (T D)² as a polynomial in ln k, and the clock contrast's integral as a sum over its points.

use super::ClockContrasts;
use oddwell_model::ModelError;
use std::f64::consts::PI;

/// Where the k integrals of a prediction begin, h/Mpc: below, T and D keep their value here. 2e-5 of c² lies
/// there for clocks 50 Mpc/h apart, 6e-5 for 200 Mpc/h.
pub(super) const LOWEST: f64 = 1e-4;
/// Nothing of c² lies above this wavenumber, h/Mpc, or above 4.3 over the damping, where e^(−k² damping²) is 1e-8.
const HIGHEST: f64 = 20.0;
const DAMPED: f64 = 4.3;

/// Points over twelve units of ln k. A field of any mass gives τ = k²/(k² + m²), with singularities at Im ln k = ±π/2: the
/// polynomial through n Chebyshev points over a range L errs by exp(−π n/L), here 1e-6 of what depends on k.
const POINTS: usize = 56;

/// Added to a Lagrange polynomial, which at Chebyshev points stays within ±1.3, to make a square of a real number.
const OFFSET: f64 = 2.0;

/// Chebyshev points in ln k.
#[derive(Clone, Debug)]
pub(crate) struct Grid {
    logarithms: Vec<f64>,
    barycentric: Vec<f64>,
    low: f64,
    high: f64,
}

impl Grid {
    /// For predictions with this damping (Mpc/h) or more.
    pub(super) fn new(smallest_damping: f64) -> Grid {
        let (low, high) = (LOWEST.ln(), (DAMPED / smallest_damping).min(HIGHEST).ln());
        let angle = |point: usize| PI * (2 * point + 1) as f64 / (2 * POINTS) as f64;
        let place = |point| 0.5 * (low + high) - 0.5 * (high - low) * f64::cos(angle(point));
        let sign = |point: usize| if point.is_multiple_of(2) { 1.0 } else { -1.0 };
        Grid {
            logarithms: (0..POINTS).map(place).collect(),
            barycentric: (0..POINTS).map(|point| sign(point) * angle(point).sin()).collect(),
            low,
            high,
        }
    }

    /// The points, h/Mpc.
    pub(super) fn wavenumbers(&self) -> impl Iterator<Item = f64> {
        self.logarithms.iter().map(|logarithm| logarithm.exp())
    }

    /// The polynomial through values at the points, by the barycentric formula; beyond the ends, its value there.
    pub(super) fn interpolate(&self, values: &[f64], k: f64) -> f64 {
        let at = k.ln().clamp(self.low, self.high);
        let (mut above, mut below) = (0.0, 0.0);
        for ((place, weight), value) in self.logarithms.iter().zip(&self.barycentric).zip(values) {
            if at == *place {
                return *value;
            }
            let share = weight / (at - place);
            above += share * value;
            below += share;
        }
        above / below
    }
}

/// c² = ((3/2) Ωm(a) H² σ8)² Σ weight · (T D)² over the points of a grid.
#[derive(Clone, Debug)]
pub(crate) struct KWeights(Vec<(f64, f64)>);

impl KWeights {
    /// Each weight is the integral over the Lagrange polynomial of its point; the spectrum's shape is that of `values`.
    ///
    /// # Errors
    /// [`ModelError`] where the spectrum has no value.
    pub(super) fn new(contrasts: &ClockContrasts, values: &[f64]) -> Result<KWeights, ModelError> {
        let power = contrasts.power(values, 1.0)?;
        let grid = &contrasts.grid;
        let offset = OFFSET * contrasts.integral_of(values, &power, &|_| 1.0)?.powi(2);
        let weight = |(point, k): (usize, f64)| {
            let mut one = [0.0; POINTS];
            one[point] = 1.0;
            let lagrange = |k: f64| (OFFSET + grid.interpolate(&one, k)).max(0.0).sqrt();
            Ok((k, contrasts.integral_of(values, &power, &lagrange)?.powi(2) - offset))
        };
        Ok(KWeights(grid.wavenumbers().enumerate().map(weight).collect::<Result<_, ModelError>>()?))
    }

    /// Wavenumbers (h/Mpc) and weights.
    pub(super) fn points(&self) -> impl Iterator<Item = (f64, f64)> {
        self.0.iter().copied()
    }
}
