//! What turns a spectrum at the knots into a number at a separation, in a shell, at a wavenumber: fixed weights.

use crate::abscissa::Abscissa;
use crate::knots::{Knots, Panel};
use crate::rows::Space;
use crate::terms::Readout;
use oddwell_cosmology::{GaussLegendre, gauss_legendre, variance_kernel};
use std::f64::consts::PI;

/// Gauss–Legendre points between which the oscillating factor turns by no more than so many radians. The product of
/// cos(φx/2), φ = 16, with k² and a panel's polynomial (degree 44 at most) is integrated to 1e-13.
const POINTS: usize = 40;
const RADIANS: f64 = 16.0;

/// The window of σ8 squared oscillates with twice this length, Mpc/h.
const VARIANCE_LENGTH: f64 = 16.0;

/// The number that `readout` takes from a spectrum at abscissa `abscissa`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Reading {
    pub(crate) abscissa: usize,
    pub(crate) readout: Readout,
}

/// Weights of a stretch of knots.
#[derive(Clone, Copy, Debug)]
struct Span {
    first: usize,
    start: usize,
    length: usize,
}

/// Linear functionals of a function given at the knots.
#[derive(Clone, Debug)]
pub(crate) struct Functionals {
    weights: Vec<f64>,
    spans: Vec<Span>,
}

impl Functionals {
    /// The weights of each of `readings`; transforms integrate to wavenumber `end` (h/Mpc), where a panel ends.
    pub(crate) fn new(knots: &Knots, abscissae: &[Abscissa], readings: &[Reading], end: f64) -> Functionals {
        let mut functionals = Functionals { weights: Vec::new(), spans: Vec::new() };
        let transforms = transforms(knots, abscissae, readings, end);
        for (index, &Reading { abscissa, readout }) in readings.iter().enumerate() {
            match readout {
                Readout::Transform { .. } => functionals.push(0, &transforms[index]),
                Readout::Value | Readout::Slope => {
                    let (first, weights) = average(knots, &abscissae[abscissa], readout == Readout::Slope);
                    functionals.push(first, &weights);
                }
            }
        }
        functionals
    }

    fn push(&mut self, first: usize, weights: &[f64]) {
        self.spans.push(Span { first, start: self.weights.len(), length: weights.len() });
        self.weights.extend_from_slice(weights);
    }

    /// Functional `index` of `function`, given at the knots that rows reach.
    pub(crate) fn apply(&self, index: usize, function: &[f64]) -> f64 {
        let Span { first, start, length } = self.spans[index];
        dot(&self.weights[start..start + length], &function[first..first + length])
    }
}

/// Σ xᵢ yᵢ in eight running sums, so that the processor can overlap them.
pub(crate) fn dot(x: &[f64], y: &[f64]) -> f64 {
    const LANES: usize = 8;
    let mut sums = [0.0; LANES];
    let (x_blocks, x_rest) = x.as_chunks::<LANES>();
    let (y_blocks, y_rest) = y.as_chunks::<LANES>();
    for (a, b) in x_blocks.iter().zip(y_blocks) {
        for lane in 0..LANES {
            sums[lane] += a[lane] * b[lane];
        }
    }
    let rest: f64 = x_rest.iter().zip(y_rest).map(|(a, b)| a * b).sum();
    sums.iter().sum::<f64>() + rest
}

/// Calls `at(panel, k, weight)` for points and weights of ∫dk over the panels, so close that what turns by `length` × k
/// radians is resolved.
fn integrate<'a>(
    panels: impl Iterator<Item = &'a Panel>,
    length: f64,
    rule: &GaussLegendre,
    mut at: impl FnMut(&Panel, f64, f64),
) {
    for panel in panels {
        let pieces = ((panel.high - panel.low) * length / RADIANS).ceil().max(1.0);
        let width = (panel.high - panel.low) / pieces;
        for piece in 0..pieces as usize {
            let (low, high) = (panel.low + width * piece as f64, panel.low + width * (piece + 1) as f64);
            // In ln k: over a panel of several e-folds the integrand is a power of k.
            let (from, to) = (low.ln(), high.ln());
            let (centre, half) = (0.5 * (from + to), 0.5 * (to - from));
            for (node, weight) in rule.nodes.iter().zip(&rule.weights) {
                let k = (centre + half * node).exp();
                at(panel, k, half * weight * k);
            }
        }
    }
}

/// The weights of all transforms, by reading; empty for the others.
fn transforms(knots: &Knots, abscissae: &[Abscissa], readings: &[Reading], end: f64) -> Vec<Vec<f64>> {
    let mut tables = vec![Vec::new(); readings.len()];
    let mut wanted = vec![Vec::new(); abscissae.len()];
    for (index, reading) in readings.iter().enumerate() {
        if let Readout::Transform { separation, order } = reading.readout {
            tables[index] = vec![0.0; knots.reached()];
            wanted[reading.abscissa].push((index, separation, order));
        }
    }
    let separations = abscissae.iter().filter(|abscissa| abscissa.space == Space::Separation);
    let largest = separations.map(Abscissa::end).fold(0.0, f64::max);
    if largest == 0.0 {
        return tables;
    }
    let averages: Vec<_> = abscissae.iter().map(Abscissa::shell).collect();
    let reached = knots.panels().iter().filter(|panel| panel.range().end <= knots.reached());
    let panels = reached.filter(|panel| panel.high <= end * (1.0 + 1e-9));
    let mut basis = Vec::new();
    integrate(panels, largest, &gauss_legendre(POINTS), |panel, k, weight| {
        knots.weights(panel, k, false, &mut basis);
        let measure = weight * k * k / (2.0 * PI * PI);
        for (average, wanted) in averages.iter().zip(&wanted).filter(|(_, wanted)| !wanted.is_empty()) {
            let bessel = average.bessel(k);
            for &(index, separation, order) in wanted {
                let factor = measure * bessel[separation][order];
                for (total, weight) in tables[index][panel.range()].iter_mut().zip(&basis) {
                    *total += factor * weight;
                }
            }
        }
    });
    tables
}

/// First knot and weights of the average over a Fourier bin, or of the slope dP/dk's.
fn average(knots: &Knots, abscissa: &Abscissa, slope: bool) -> (usize, Vec<f64>) {
    let points = abscissa.wavenumbers();
    let ranges = points.iter().map(|(k, _)| knots.panel_of(*k).range());
    let first = ranges.clone().map(|range| range.start).min().unwrap_or(0);
    let last = ranges.map(|range| range.end).max().unwrap_or(0);
    let mut weights = vec![0.0; last - first];
    let mut basis = Vec::new();
    for (k, weight) in points {
        let panel = knots.panel_of(k);
        knots.weights(panel, k, slope, &mut basis);
        for (total, value) in weights[panel.first - first..].iter_mut().zip(&basis) {
            *total += weight * value;
        }
    }
    (first, weights)
}

/// Weights of all knots, the tail's included, that give σ8² of an undamped spectrum.
pub(crate) fn variance(knots: &Knots) -> Vec<f64> {
    let mut weights = vec![0.0; knots.wavenumbers().len()];
    let mut basis = Vec::new();
    integrate(knots.panels().iter(), VARIANCE_LENGTH, &gauss_legendre(POINTS), |panel, k, weight| {
        knots.weights(panel, k, false, &mut basis);
        let factor = weight * variance_kernel(k);
        for (total, value) in weights[panel.range()].iter_mut().zip(&basis) {
            *total += factor * value;
        }
    });
    weights
}
