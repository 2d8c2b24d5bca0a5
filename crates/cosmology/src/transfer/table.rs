//! A power spectrum that the user brings along.

use crate::errors::CosmologyError;

/// Fewest entries of a table: a cubic through four points.
const LEAST: usize = 4;

/// Wavenumbers (h/Mpc) and linear power at z = 0 ((Mpc/h)³, of any amplitude), interpolated by a cubic spline of ln P
/// in ln k with continuous first and second derivatives.
///
/// The third derivative is continuous at the second and the last but one wavenumber (the "not-a-knot" end
/// conditions), so that nothing is assumed of the ends' curvature: a table of a cubic in ln k gives that cubic back.
/// There is no extrapolation.
#[derive(Clone, Debug, PartialEq)]
pub struct PowerTable {
    log_k: Vec<f64>,
    log_p: Vec<f64>,
    /// d² ln P/d(ln k)² at the entries.
    curvature: Vec<f64>,
    low: f64,
    high: f64,
}

impl PowerTable {
    /// Checks the table and prepares the spline.
    ///
    /// # Errors
    /// Fewer than 4 entries or columns of different length; a wavenumber that is not above 0, not finite or not above
    /// the one before; a power that is not above 0 or not finite.
    pub fn new(wavenumber: Vec<f64>, power: Vec<f64>) -> Result<Self, CosmologyError> {
        if wavenumber.len() != power.len() || wavenumber.len() < LEAST {
            return Err(CosmologyError::TableSize {
                wavenumbers: wavenumber.len(),
                powers: power.len(),
                least: LEAST,
            });
        }
        let mut before = 0.0;
        for (index, (&k, &p)) in wavenumber.iter().zip(&power).enumerate() {
            let bad = |what, value, rule| CosmologyError::BadTable { entry: index + 1, what, value, rule };
            if !(k > 0.0 && k.is_finite()) {
                return Err(bad("wavenumber", k, "above 0 and finite"));
            }
            if k <= before {
                return Err(bad("wavenumber", k, "above the one before it"));
            }
            if !(p > 0.0 && p.is_finite()) {
                return Err(bad("power", p, "above 0 and finite"));
            }
            before = k;
        }
        let (low, high) = (wavenumber[0], before);
        let log_k: Vec<f64> = wavenumber.iter().map(|k| k.ln()).collect();
        let log_p: Vec<f64> = power.iter().map(|p| p.ln()).collect();
        let curvature = spline_curvature(&log_k, &log_p);
        Ok(Self { log_k, log_p, curvature, low, high })
    }

    /// Lowest and highest wavenumber, h/Mpc.
    pub fn range(&self) -> (f64, f64) {
        (self.low, self.high)
    }

    /// The wavenumbers of its entries, h/Mpc, increasing.
    pub fn wavenumbers(&self) -> impl Iterator<Item = f64> + '_ {
        self.log_k.iter().map(|log_k| log_k.exp())
    }

    /// ln of the wavenumbers.
    pub(crate) fn log_wavenumbers(&self) -> &[f64] {
        &self.log_k
    }

    /// The table's power at `wavenumber` (h/Mpc), as given, before any rescaling; NaN outside the table.
    pub fn power(&self, wavenumber: f64) -> f64 {
        if !(self.low..=self.high).contains(&wavenumber) {
            return f64::NAN;
        }
        self.log_power(wavenumber.ln()).exp()
    }

    /// ln P at ln k, for k inside the table.
    pub(crate) fn log_power(&self, x: f64) -> f64 {
        let last = self.log_k.len() - 2;
        let i = self.log_k.partition_point(|&knot| knot <= x).saturating_sub(1).min(last);
        let width = self.log_k[i + 1] - self.log_k[i];
        let right = (x - self.log_k[i]) / width;
        let left = 1.0 - right;
        left * self.log_p[i]
            + right * self.log_p[i + 1]
            + width * width / 6.0
                * ((left * left * left - left) * self.curvature[i]
                    + (right * right * right - right) * self.curvature[i + 1])
    }
}

/// Second derivatives of the cubic spline through (x, y) with not-a-knot ends.
///
/// The inner equations are hᵢ₋₁ mᵢ₋₁ + 2(hᵢ₋₁ + hᵢ) mᵢ + hᵢ mᵢ₊₁ = 6 (slopeᵢ − slopeᵢ₋₁). Continuity of the third
/// derivative gives m₀ = m₁ + (m₁ − m₂) h₀/h₁ and the like at the other end; put in, the system is tridiagonal and,
/// unlike with the end equations kept as rows of their own, needs no pivoting. (de Boor 1978, A Practical Guide to
/// Splines, chapter IV.)
fn spline_curvature(x: &[f64], y: &[f64]) -> Vec<f64> {
    let n = x.len();
    let h: Vec<f64> = x.windows(2).map(|pair| pair[1] - pair[0]).collect();
    let slope: Vec<f64> = y.windows(2).zip(&h).map(|(pair, h)| (pair[1] - pair[0]) / h).collect();
    // Unknowns m[1] ... m[n-2].
    let size = n - 2;
    let mut lower = vec![0.0; size];
    let mut diagonal = vec![0.0; size];
    let mut upper = vec![0.0; size];
    let mut right = vec![0.0; size];
    for row in 0..size {
        let i = row + 1;
        lower[row] = h[i - 1];
        diagonal[row] = 2.0 * (h[i - 1] + h[i]);
        upper[row] = h[i];
        right[row] = 6.0 * (slope[i] - slope[i - 1]);
    }
    let first = h[0] / h[1];
    diagonal[0] += h[0] * (1.0 + first);
    upper[0] -= h[0] * first;
    let last = h[n - 2] / h[n - 3];
    diagonal[size - 1] += h[n - 2] * (1.0 + last);
    lower[size - 1] -= h[n - 2] * last;
    for row in 1..size {
        let factor = lower[row] / diagonal[row - 1];
        diagonal[row] -= factor * upper[row - 1];
        right[row] -= factor * right[row - 1];
    }
    let mut m = vec![0.0; n];
    m[size] = right[size - 1] / diagonal[size - 1];
    for row in (0..size - 1).rev() {
        m[row + 1] = (right[row] - upper[row] * m[row + 2]) / diagonal[row];
    }
    m[0] = m[1] + (m[1] - m[2]) * first;
    m[n - 1] = m[n - 2] + (m[n - 2] - m[n - 3]) * last;
    m
}
