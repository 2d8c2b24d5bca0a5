//! The redshifts of bins: whether one was typed as a scale factor, and whether a bin is too wide for one redshift.

use super::expectation::{Expected, in_all, predict_with};
use crate::assemble::Measurements;
use crate::resolve::Study;
use crate::run_error::RunError;
use nalgebra::DVector;
use oddwell_cosmology::{Background, gauss_legendre};
use oddwell_likelihood::verdicts::preference;
use oddwell_model::ModelSetup;
use serde::Serialize;

/// A bin within which the dipole's average differs from its value at the mean redshift by more than this needs nodes.
pub const LARGEST_CURVATURE: f64 = 0.02;

/// Redshifts are moved by this share of 1 + z for derivatives: the fourth derivative makes them wrong by 1e-4 of themselves.
const STEP: f64 = 0.01;

/// Nodes proposed for a wide bin: exact for what varies as a polynomial of degree 5.
const NODES: usize = 3;

/// Whether a bin is narrow enough to be predicted at one redshift.
#[derive(Clone, Debug, Serialize)]
pub struct WidthVerdict {
    /// `SURVEY.BIN`.
    pub bin: String,
    /// ½ ξ₁″/ξ₁ at the bin's redshift, weighted by signal and noise: what the dipole's average over a bin exceeds its value at
    /// the mean by, over the variance of redshift in the bin.
    pub curvature: f64,
    /// The full width of a bin of constant pair density in which that is 2 %.
    pub widest: f64,
    /// The excess over the bin's own edges, where its design gives them.
    pub excess: Option<f64>,
    /// Redshifts and weights in place of its one redshift, where the excess is above 2 %.
    pub nodes: Option<Vec<(f64, f64)>>,
}

/// Whether redshifts would fit far better if what was typed were scale factors.
#[derive(Clone, Debug, Serialize)]
pub struct ScaleFactorVerdict {
    /// `SURVEY.BIN`, or a survey with all of its bins.
    pub place: String,
    /// By how much −2 ln L changes with 1/z − 1 in place of z: below 0 where that fits better.
    pub difference: f64,
    /// What it is expected to be where the redshifts are right.
    pub expected: f64,
    /// A bound on the probability of a difference this far below 0 where they are.
    pub p_value: f64,
}

/// For every bin with one redshift below 1, and every survey with several of them.
pub(super) fn scale_factor_verdicts(
    measurements: &Measurements,
    expected: &Expected,
) -> Result<Vec<ScaleFactorVerdict>, RunError> {
    let setup = expected.posterior.model.setup();
    let mut alternatives: Vec<(String, Vec<usize>)> = Vec::new();
    for survey in &measurements.surveys {
        let bins: Vec<usize> = (0..setup.bins.len())
            .filter(|&bin| setup.bins[bin].survey == survey.name && mistakable(&setup.bins[bin].nodes))
            .collect();
        alternatives.extend(bins.iter().map(|&bin| (setup.bins[bin].path(), vec![bin])));
        if bins.len() > 1 {
            alternatives.push((survey.name.clone(), bins));
        }
    }
    let mut verdicts = Vec::new();
    for (place, bins) in alternatives {
        let mut other = setup.clone();
        for bin in bins {
            for node in &mut other.bins[bin].nodes {
                node.0 = 1.0 / node.0 - 1.0;
            }
        }
        // No prediction at all (a background that never was so small, a table that does not reach) is no better one.
        let Ok(predicted) = predict_with(&expected.posterior, other, &|_, value| value, &expected.values)
        else {
            continue;
        };
        let found = preference(&expected.open, &DVector::from_vec(predicted)).map_err(in_all)?;
        let (difference, p_value) = (found.difference, found.p_value);
        verdicts.push(ScaleFactorVerdict { place, difference, expected: found.expected, p_value });
    }
    Ok(verdicts)
}

/// Whether this could be a scale factor.
fn mistakable(nodes: &[(f64, f64)]) -> bool {
    matches!(nodes, [(redshift, _)] if *redshift < 1.0)
}

/// For every bin with one redshift and a dipole that is predicted not to vanish.
pub(super) fn width_verdicts(
    study: &Study,
    measurements: &Measurements,
    expected: &Expected,
) -> Result<Vec<WidthVerdict>, RunError> {
    let setup = expected.posterior.model.setup();
    let single = |bin: usize| setup.bins[bin].nodes.len() == 1;
    if !(0..setup.bins.len()).any(single) {
        return Ok(Vec::new());
    }
    let steps: Vec<f64> = setup.bins.iter().map(|bin| STEP * (1.0 + bin.nodes[0].0)).collect();
    let moved = |sign: f64| {
        let mut moved = ModelSetup::clone(setup);
        for (bin, step) in moved.bins.iter_mut().zip(&steps) {
            if let [node] = &mut bin.nodes[..] {
                node.0 += sign * step;
            }
        }
        predict_with(&expected.posterior, moved, &|_, value| value, &expected.values)
    };
    let low_enough = setup.bins.iter().zip(&steps).all(|(bin, step)| bin.nodes[0].0 > *step);
    if !low_enough {
        return Ok(Vec::new());
    }
    let (below, above) = (moved(-1.0)?, moved(1.0)?);
    let here = &expected.expectation.prediction;
    let mut verdicts = Vec::new();
    for bin in (0..setup.bins.len()).filter(|&bin| single(bin)) {
        let of_dipole =
            |row: usize| measurements.rows[row].bin == bin && measurements.rows[row].multipole == 1;
        let (mut overlap, mut own) = (0.0, 0.0);
        for (first, survey) in expected.posterior.data.with_offsets() {
            let rows = first..first + survey.rows();
            let pick = |value: &dyn Fn(usize) -> f64| -> Vec<f64> {
                rows.clone().map(|row| if of_dipole(row) { value(row) } else { 0.0 }).collect()
            };
            let value = pick(&|row| here[row]);
            let bent = pick(&|row| (below[row] + above[row] - 2.0 * here[row]) / steps[bin].powi(2));
            overlap += survey.projection(&bent, &value);
            own += survey.projection(&value, &value);
        }
        if !(own > 0.0) {
            continue;
        }
        let curvature = 0.5 * overlap / own;
        let edges = edges_of(study, bin);
        let (mut excess, mut nodes) = (None, None);
        if let Some((low, high)) = edges {
            let weighted = weighted_nodes(expected, low, high)?;
            let mean: f64 = weighted.iter().map(|(redshift, weight)| weight * redshift).sum();
            let variance: f64 =
                weighted.iter().map(|(redshift, weight)| weight * (redshift - mean).powi(2)).sum();
            excess = Some(curvature * variance);
            nodes = (curvature * variance).abs().gt(&LARGEST_CURVATURE).then_some(weighted);
        }
        verdicts.push(WidthVerdict {
            bin: setup.bins[bin].path(),
            curvature,
            // The variance of a constant density is width²/12.
            widest: (12.0 * LARGEST_CURVATURE / curvature.abs()).sqrt(),
            excess,
            nodes,
        });
    }
    Ok(verdicts)
}

/// The edges that a bin's design gives.
fn edges_of(study: &Study, bin: usize) -> Option<(f64, f64)> {
    let section = study.file.surveys.iter().flat_map(|survey| &survey.bins).nth(bin)?;
    Some(section.design.as_ref()?.redshifts.as_ref()?.value)
}

/// Gauss–Legendre nodes between two redshifts, weighted by pairs: n₁n₂ r²/E at constant densities, rounded to five digits.
fn weighted_nodes(expected: &Expected, low: f64, high: f64) -> Result<Vec<(f64, f64)>, RunError> {
    let layout = expected.posterior.model.layout();
    let value = |name: &str| layout.index(name).map_or(0.0, |slot| expected.values[slot]);
    let background = Background::new(
        value("background.omega_m"),
        value("background.omega_k"),
        value("background.w0"),
        value("background.wa"),
    )?;
    background.epoch(high)?;
    let rule = gauss_legendre(NODES).on(low, high);
    let pairs = |redshift: f64| {
        background.transverse_distance(redshift).powi(2) / background.expansion(1.0 / (1.0 + redshift))
    };
    let weights: Vec<f64> =
        rule.nodes.iter().zip(&rule.weights).map(|(&node, weight)| weight * pairs(node)).collect();
    let sum: f64 = weights.iter().sum();
    let rounded = |number: f64| (1e5 * number).round() / 1e5;
    let mut nodes: Vec<(f64, f64)> = rule
        .nodes
        .iter()
        .zip(&weights)
        .map(|(node, weight)| (rounded(*node), rounded(weight / sum)))
        .collect();
    // What rounding leaves over goes to the largest, the middle one.
    let others: f64 = nodes.iter().map(|(_, weight)| weight).sum::<f64>() - nodes[NODES / 2].1;
    nodes[NODES / 2].1 = rounded(1.0 - others);
    Ok(nodes)
}
