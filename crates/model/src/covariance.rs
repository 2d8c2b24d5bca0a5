//! The covariance of measured multipoles for Gaussian fields: for simulating a measurement and planning one.

use crate::abscissa::Abscissa;
use crate::error::ModelError;
use crate::grid::WavenumberGrid;
use crate::model::Model;
use crate::rows::{Pair, Row, Space};
use crate::state::BinState;
use crate::tracer::Tracer;
use crate::workspace::Workspace;
use nalgebra::DMatrix;
use oddwell_cosmology::{GaussLegendre, gauss_legendre, legendre};
use std::f64::consts::PI;

/// The Legendre integrals over μ are of polynomials of degree 16 at most: nine points are exact.
const DIRECTIONS: usize = 9;

/// How a bin was sampled.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sampling {
    /// Volume V, (Mpc/h)³.
    pub volume: f64,
    /// Comoving number density n₁ of the first tracer, (h/Mpc)³.
    pub first_density: f64,
    /// Comoving number density n₂ of the second tracer, (h/Mpc)³.
    pub second_density: f64,
}

/// ½∫dμ Lₗ Lₘ × (the two products of spectra), for all ℓ, m: without and with shot noise alone.
struct AngularIntegrals {
    /// By ℓ then m: what multiplies (−1)^m, P₁₁tot P₂₂tot − 1/(n₁n₂).
    autos: [[f64; 5]; 5],
    /// By ℓ then m: of P₁₂², real part for ℓ+m even, imaginary part for ℓ+m odd.
    cross: [[f64; 5]; 5],
}

/// g(μ) = b + fμ² + iμ(H/k)R: real and imaginary part.
fn amplitude(tracer: &Tracer, response: f64, state: &BinState, k: f64, mu: f64) -> (f64, f64) {
    let real = tracer.bias + state.growth.rate * mu * mu;
    (real, mu * state.epoch.conformal_hubble / k * response)
}

impl AngularIntegrals {
    /// `power` is P(k) at the bin's redshift.
    fn new(
        model: &Model,
        state: &BinState,
        sampling: &Sampling,
        k: f64,
        power: f64,
        rule: &GaussLegendre,
    ) -> Self {
        let effects = &model.setup().effects;
        let response =
            |tracer: &Tracer| tracer.response(&state.epoch, &state.growth, state.time_distortion, effects);
        let (first_response, second_response) = (response(&state.first), response(&state.second));
        let (shot_first, shot_second) = (1.0 / sampling.first_density, 1.0 / sampling.second_density);
        let mut integrals = AngularIntegrals { autos: [[0.0; 5]; 5], cross: [[0.0; 5]; 5] };
        for (&mu, &weight) in rule.nodes.iter().zip(&rule.weights) {
            let (x1, y1) = amplitude(&state.first, first_response, state, k, mu);
            let (x2, y2) = amplitude(&state.second, second_response, state, k, mu);
            let first = (x1 * x1 + y1 * y1) * power;
            let second = (x2 * x2 + y2 * y2) * power;
            // P₁₁tot P₂₂tot without 1/(n₁n₂), which has a closed form.
            let autos = first * second + first * shot_second + second * shot_first;
            // P₁₂ = g₁ g₂* P.
            let (real, imaginary) = ((x1 * x2 + y1 * y2) * power, (y1 * x2 - x1 * y2) * power);
            let (square_real, square_imaginary) =
                (real * real - imaginary * imaginary, 2.0 * real * imaginary);
            for l in 0..5 {
                for m in 0..5 {
                    let angle = 0.5 * weight * legendre(l, mu) * legendre(m, mu);
                    integrals.autos[l][m] += angle * autos;
                    integrals.cross[l][m] +=
                        angle * if (l + m) % 2 == 0 { square_real } else { square_imaginary };
                }
            }
        }
        integrals
    }

    /// The bracket of the covariance of ξₗ and ξₘ, with (−i)^(ℓ+m) in front: real.
    fn separation(&self, l: usize, m: usize) -> f64 {
        let sign_m = if m.is_multiple_of(2) { 1.0 } else { -1.0 };
        if (l + m).is_multiple_of(2) {
            let phase = if ((l + m) / 2).is_multiple_of(2) { 1.0 } else { -1.0 };
            phase * (sign_m * self.autos[l][m] + self.cross[l][m])
        } else {
            // (−i)^(2j+1) i = (−1)^j: the odd–even blocks, first order in H/k.
            let phase = if ((l + m - 1) / 2).is_multiple_of(2) { 1.0 } else { -1.0 };
            phase * self.cross[l][m]
        }
    }

    /// The bracket of the covariance of Pₗ and Pₘ (imaginary parts for odd ℓ). Real and imaginary part of one mode's
    /// Δ₁Δ₂* have the covariance ½ Im P₁₂²: the odd–even blocks, first order in H/k.
    fn fourier(&self, l: usize, m: usize) -> f64 {
        let sign = if l.is_multiple_of(2) { 1.0 } else { -1.0 };
        if (l + m).is_multiple_of(2) { self.autos[l][m] + sign * self.cross[l][m] } else { self.cross[l][m] }
    }
}

/// The covariance of the rows of one bin (those of the cross pair; in the order of the model's rows), rows × rows.
///
/// ```text
/// Cov[ξₗ(s_i), ξₘ(s_j)] = (−i)^(l+m) (2l+1)(2m+1)/V ∫k²dk/2π² j̄ₗ(ks_i) j̄ₘ(ks_j) ½∫dμ Lₗ Lₘ [(−1)^m P₁₁tot P₂₂tot + P₁₂²]
/// Cov[Pₗ, Pₘ] = (2l+1)(2m+1)/N_k ½∫dμ LₗLₘ [P₁₁tot P₂₂tot + (−1)^l Re P₁₂²],  l+m even;  [Im P₁₂²],  l+m odd;
/// N_k = V V_shell/(2π)³
/// ```
///
/// with P_XX = |g_X|²P, P₁₂ = g₁g₂*P, g = b + fμ² + iμ(H/k)R, tot = + 1/n. Odd–even blocks (first order in H/k) and the
/// (H/k)² part of the odd multipoles' variance are kept: at low redshift they matter. The product of the two shot noises
/// is in closed form, δᵢⱼ δₗₘ (2l+1)/(V n₁ n₂ V_shell). Assumes Gaussian fields, no galaxy in both samples, a volume much
/// larger than the separations, and no mask; no two shells of one multipole may overlap.
///
/// # Errors
/// [`ModelError::Setup`] where a row of the bin is not of the cross pair or has no shell, where spaces are mixed, or a
/// volume or density is not above 0; otherwise as [`Model::predict`].
pub fn gaussian_covariance(
    model: &Model,
    values: &[f64],
    workspace: &mut Workspace,
    bin: usize,
    sampling: &Sampling,
) -> Result<DMatrix<f64>, ModelError> {
    let rows: Vec<Row> = model.setup().rows.iter().filter(|row| row.bin == bin).copied().collect();
    let shells = shells_of(&rows, sampling)?;
    if rows.first().is_some_and(|row| row.space == Space::Fourier) {
        return fourier(model, values, workspace, bin, sampling, &rows, &shells);
    }
    let largest = rows.iter().map(|row| Abscissa::of(row).end()).fold(0.0, f64::max);
    // Products of two Bessel functions oscillate with the sum of the separations.
    let grid = WavenumberGrid::new(2.0 * largest, model.setup().smallest_damping);
    let mut abscissae: Vec<Abscissa> = Vec::new();
    let of_row: Vec<usize> = rows
        .iter()
        .map(|row| {
            let abscissa = Abscissa::of(row);
            abscissae.iter().position(|known| *known == abscissa).unwrap_or_else(|| {
                abscissae.push(abscissa);
                abscissae.len() - 1
            })
        })
        .collect();
    let tables: Vec<Vec<[f64; 5]>> = abscissae
        .iter()
        .map(|abscissa| {
            let shell = abscissa.shell();
            grid.wavenumbers.iter().map(|&k| shell.bessel(k)[0]).collect()
        })
        .collect();
    let integrals = angular_integrals(model, values, workspace, bin, sampling, &grid.wavenumbers)?;
    let mut covariance = DMatrix::zeros(rows.len(), rows.len());
    for i in 0..rows.len() {
        for j in 0..=i {
            let (l, m) = (usize::from(rows[i].multipole), usize::from(rows[j].multipole));
            let (left, right) = (&tables[of_row[i]], &tables[of_row[j]]);
            let sum: f64 = (0..grid.weights.len())
                .map(|n| grid.weights[n] * left[n][l] * right[n][m] * integrals[n].separation(l, m))
                .sum();
            let factor = ((2 * l + 1) * (2 * m + 1)) as f64 / sampling.volume;
            let mut value = factor * sum;
            if l == m && of_row[i] == of_row[j] {
                let pairs = sampling.volume * sampling.first_density * sampling.second_density * shells[i];
                value += (2 * l + 1) as f64 / pairs;
            }
            covariance[(i, j)] = value;
            covariance[(j, i)] = value;
        }
    }
    Ok(covariance)
}

/// P at the bin's redshift and its angular integrals, averaged over the bin's redshift nodes.
fn angular_integrals(
    model: &Model,
    values: &[f64],
    workspace: &mut Workspace,
    bin: usize,
    sampling: &Sampling,
    wavenumbers: &[f64],
) -> Result<Vec<AngularIntegrals>, ModelError> {
    let rule = gauss_legendre(DIRECTIONS);
    let spectrum = model.spectrum(values, wavenumbers)?;
    let nodes = &model.setup().bins[bin].nodes;
    let mut result = Vec::with_capacity(wavenumbers.len());
    for (&k, &linear) in wavenumbers.iter().zip(&spectrum) {
        let mut mean = AngularIntegrals { autos: [[0.0; 5]; 5], cross: [[0.0; 5]; 5] };
        for (within, &(_, weight)) in nodes.iter().enumerate() {
            let state = model.bin_state(values, workspace, bin, within, k)?;
            let power = linear * state.growth.growth.powi(2);
            let at_node = AngularIntegrals::new(model, &state, sampling, k, power, &rule);
            for l in 0..5 {
                for m in 0..5 {
                    mean.autos[l][m] += weight * at_node.autos[l][m];
                    mean.cross[l][m] += weight * at_node.cross[l][m];
                }
            }
        }
        result.push(mean);
    }
    Ok(result)
}

fn fourier(
    model: &Model,
    values: &[f64],
    workspace: &mut Workspace,
    bin: usize,
    sampling: &Sampling,
    rows: &[Row],
    shells: &[f64],
) -> Result<DMatrix<f64>, ModelError> {
    let mut covariance = DMatrix::zeros(rows.len(), rows.len());
    for i in 0..rows.len() {
        let points = Abscissa::of(&rows[i]).wavenumbers();
        let wavenumbers: Vec<f64> = points.iter().map(|(k, _)| *k).collect();
        let integrals = angular_integrals(model, values, workspace, bin, sampling, &wavenumbers)?;
        // Modes of different wavenumber bins are independent.
        for j in (0..=i).filter(|&j| Abscissa::of(&rows[i]) == Abscissa::of(&rows[j])) {
            let (l, m) = (usize::from(rows[i].multipole), usize::from(rows[j].multipole));
            let weighted = points.iter().zip(&integrals);
            let mut mean: f64 = weighted.map(|((_, weight), integral)| weight * integral.fourier(l, m)).sum();
            if l == m {
                mean += 1.0 / (sampling.first_density * sampling.second_density * (2 * l + 1) as f64);
            }
            let modes = sampling.volume * shells[i] / (2.0 * PI).powi(3);
            let value = ((2 * l + 1) * (2 * m + 1)) as f64 / modes * mean;
            covariance[(i, j)] = value;
            covariance[(j, i)] = value;
        }
    }
    Ok(covariance)
}

/// The volumes of the rows' shells, (Mpc/h)³ or (h/Mpc)³, after checking what can be covered.
fn shells_of(rows: &[Row], sampling: &Sampling) -> Result<Vec<f64>, ModelError> {
    let fail = |what: &str, value: String, rule, way_out| {
        Err(ModelError::Setup { what: what.to_string(), value, rule, way_out })
    };
    for (what, value) in [
        ("volume", sampling.volume),
        ("density of the first tracer", sampling.first_density),
        ("density of the second tracer", sampling.second_density),
    ] {
        if !(value > 0.0 && value.is_finite()) {
            return fail(what, value.to_string(), "must be above 0", "give it in (Mpc/h)³ or (h/Mpc)³");
        }
    }
    let mut volumes = Vec::with_capacity(rows.len());
    for row in rows {
        if row.pair != Pair::FirstSecond || row.space != rows[0].space {
            let rule = "the Gaussian covariance is that of the cross pair in one space";
            return fail("row", row.pair.to_string(), rule, "leave the other rows out");
        }
        let Some((low, high)) = row.edges else {
            let rule = "a Gaussian covariance needs the edges of each shell";
            return fail("row", format!("at {}", row.at), rule, "give `low` and `high`");
        };
        volumes.push(4.0 * PI / 3.0 * (high.powi(3) - low.powi(3)));
    }
    Ok(volumes)
}
