//! The wavenumbers at which spectra are computed, and the interpolation between them.
//!
//! Every integral over k of a prediction is linear in the spectrum. So the spectrum is taken at few *knots*, enough to
//! carry a polynomial in each of a few panels, and what oscillates (Bessel functions, averages over shells, the window of
//! σ8) is integrated against those polynomials once, when the model is built: see [`crate::functionals`].

use crate::error::ModelError;
use crate::functionals::dot;
use oddwell_cosmology::{PowerShape, PowerTable, Wavenumbers};
use std::f64::consts::PI;
use std::ops::Range;

/// Panels of a transfer function: up to which wavenumber (h/Mpc), how wide at most, whether in ln k or in k, and how many
/// knots in a panel of that width.
///
/// What decides is the acoustic feature: 100 Mpc/h and, at a tenth of the height, its harmonic. Silk damping ends most of
/// it, but what of it comes from infall falls as k⁻² only, and dipoles with a factor s see it to k of 3. With these knots
/// (found by dynamic programming over ends, widths and numbers) a polynomial follows the spectrum to 3e-8 of itself up to
/// 0.6 h/Mpc and to 1e-7 up to 3, in backgrounds around ours; half the matter makes the sound horizon half as long again,
/// and it is 1e-5. What scale-dependent growth adds is smooth over an e-fold.
const ZONES: [Zone; 6] = [
    Zone { end: 0.006, width: 4.1, logarithmic: true, knots: 20 },
    Zone { end: 0.08, width: 2.6, logarithmic: true, knots: 28 },
    Zone { end: 0.4, width: 0.16, logarithmic: false, knots: 30 },
    Zone { end: 0.6, width: 0.2, logarithmic: false, knots: 26 },
    Zone { end: 3.0, width: 0.4, logarithmic: false, knots: 29 },
    Zone { end: f64::INFINITY, width: 0.8, logarithmic: true, knots: 12 },
];

/// In the range in which rows take dP/dk, which a polynomial follows three digits worse than P, there are this many times
/// more knots: then it is as good as P without. And what is left of the acoustic feature is followed farther, to where it
/// is 1e-5 of P: its slope still counts there.
const SLOPE_KNOTS: f64 = 1.4;
const SLOPE_END: f64 = 5.0;

/// Knots of a panel cut narrower than its zone's width: at least this many, or this share.
const FEWEST: usize = 10;
const SHARE: f64 = 0.4;

/// Widest panel in ln k, and its knots, between entries of a user's table: a cubic in ln k there.
const TABLE_WIDTH: f64 = 0.35;
const TABLE_KNOTS: usize = 6;
/// Entries closer than this in ln k share a panel.
const TABLE_NARROWEST: f64 = 0.02;

/// Beyond the end of all rows, only σ8 wants the spectrum: few parts in a million of it come from there.
const TAIL_END: f64 = 200.0;
const TAIL_WIDTH: f64 = 3.2;
const TAIL_KNOTS: usize = 16;

/// A range of wavenumbers that is cut into panels in the same way.
#[derive(Clone, Copy, Debug)]
struct Zone {
    end: f64,
    width: f64,
    logarithmic: bool,
    knots: usize,
}

/// One panel: a polynomial in ln k or in k through its knots, which lie at the Chebyshev points.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Panel {
    pub(crate) low: f64,
    pub(crate) high: f64,
    logarithmic: bool,
    centre: f64,
    half: f64,
    pub(crate) knots: usize,
    /// Its first knot among all.
    pub(crate) first: usize,
    /// Its place in [`Knots::transforms`].
    transform: usize,
}

impl Panel {
    fn new(low: f64, high: f64, logarithmic: bool, knots: usize) -> Panel {
        let (from, to) = if logarithmic { (low.ln(), high.ln()) } else { (low, high) };
        let (centre, half) = (0.5 * (from + to), 0.5 * (to - from));
        Panel { low, high, logarithmic, centre, half, knots, first: 0, transform: 0 }
    }

    /// Its knots among all.
    pub(crate) fn range(&self) -> Range<usize> {
        self.first..self.first + self.knots
    }

    /// The wavenumber at place t in [−1, 1].
    pub(crate) fn wavenumber(&self, t: f64) -> f64 {
        let place = self.centre + self.half * t;
        if self.logarithmic { place.exp() } else { place }
    }

    /// The place t of a wavenumber.
    fn place(&self, k: f64, log_k: f64) -> f64 {
        ((if self.logarithmic { log_k } else { k }) - self.centre) / self.half
    }

    /// dt/dk.
    fn place_slope(&self, k: f64) -> f64 {
        1.0 / (self.half * if self.logarithmic { k } else { 1.0 })
    }
}

/// Chebyshev coefficient n from value i of a panel of so many knots, at n·knots + i.
#[derive(Clone, Debug)]
struct Transform {
    knots: usize,
    matrix: Vec<f64>,
}

fn angle(i: usize, knots: usize) -> f64 {
    PI * (2 * i + 1) as f64 / (2 * knots) as f64
}

impl Transform {
    fn new(knots: usize) -> Transform {
        let matrix = (0..knots)
            .flat_map(|n| {
                let norm = if n == 0 { 1.0 } else { 2.0 } / knots as f64;
                // The points increase: they are −cos.
                let sign = if n % 2 == 0 { norm } else { -norm };
                (0..knots).map(move |i| sign * (n as f64 * angle(i, knots)).cos())
            })
            .collect();
        Transform { knots, matrix }
    }

    fn rows(&self) -> impl Iterator<Item = &[f64]> {
        self.matrix.chunks_exact(self.knots)
    }
}

/// Knots in panels, increasing.
#[derive(Clone, Debug)]
pub(crate) struct Knots {
    wavenumbers: Wavenumbers,
    panels: Vec<Panel>,
    /// How many panels rows reach; the others are σ8's.
    used: usize,
    transforms: Vec<Transform>,
    /// k⁻², k⁻¹, 1, k at the knots that rows reach.
    powers: [Vec<f64>; 4],
}

impl Knots {
    /// Knots for a shape between `low` and `high` (h/Mpc); `split` are wavenumbers at which a panel must end; derivatives
    /// are asked for in the range `slopes`.
    pub(crate) fn new(
        shape: &PowerShape,
        (low, high): (f64, f64),
        split: &[f64],
        slopes: Option<(f64, f64)>,
    ) -> Result<Knots, ModelError> {
        let mut panels = match shape {
            PowerShape::Table(table) => table_panels(table, low, high, split),
            _ => shape_panels(low, high, split, slopes),
        };
        let used = panels.len();
        if !matches!(shape, PowerShape::Table(_)) && high < TAIL_END {
            panels.extend(pieces(high, TAIL_END, TAIL_WIDTH, true, |_| TAIL_KNOTS));
        }
        let mut transforms: Vec<Transform> = Vec::new();
        let (mut wavenumbers, mut first) = (Vec::new(), 0);
        for panel in &mut panels {
            let known = transforms.iter().position(|transform| transform.knots == panel.knots);
            panel.transform = known.unwrap_or_else(|| {
                transforms.push(Transform::new(panel.knots));
                transforms.len() - 1
            });
            panel.first = first;
            first += panel.knots;
            wavenumbers.extend((0..panel.knots).map(|i| panel.wavenumber(-angle(i, panel.knots).cos())));
        }
        let wavenumbers = Wavenumbers::new(wavenumbers)?;
        let reached = &wavenumbers.values()[..panels[used - 1].range().end];
        let powers = std::array::from_fn(|m| reached.iter().map(|k| k.powi(m as i32 - 2)).collect());
        Ok(Knots { panels, used, transforms, powers, wavenumbers })
    }

    /// All knots, those of the tail included.
    pub(crate) fn wavenumbers(&self) -> &Wavenumbers {
        &self.wavenumbers
    }

    /// How many of them rows reach: the length of an integrand.
    pub(crate) fn reached(&self) -> usize {
        self.panels[self.used - 1].range().end
    }

    /// All panels, the tail's included.
    pub(crate) fn panels(&self) -> &[Panel] {
        &self.panels
    }

    /// The range that rows reach, h/Mpc.
    pub(crate) fn range(&self) -> (f64, f64) {
        (self.panels[0].low, self.panels[self.used - 1].high)
    }

    /// k^power at the knots that rows reach, for powers −2 to 1.
    pub(crate) fn power(&self, power: i32) -> &[f64] {
        &self.powers[(power + 2) as usize]
    }

    /// The panel in which a wavenumber lies (the first or last for one outside).
    pub(crate) fn panel_of(&self, k: f64) -> &Panel {
        &self.panels[self.panels.partition_point(|panel| panel.high < k).min(self.panels.len() - 1)]
    }

    /// Weights of the knots of a panel that give the value at `k`, or its derivative in k.
    pub(crate) fn weights(&self, panel: &Panel, k: f64, derivative: bool, out: &mut Vec<f64>) {
        let t = panel.place(k, k.ln());
        out.clear();
        out.resize(panel.knots, 0.0);
        // T_n, and T_n′ = n U_(n−1).
        let (mut value, mut next) = (1.0, t);
        let (mut second, mut second_before) = (0.0, 0.0);
        for (n, row) in self.transforms[panel.transform].rows().enumerate() {
            let factor = if derivative { n as f64 * second * panel.place_slope(k) } else { value };
            for (total, weight) in out.iter_mut().zip(row) {
                *total += factor * weight;
            }
            (value, next) = (next, 2.0 * t * next - value);
            let after = if n == 0 { 1.0 } else { 2.0 * t * second - second_before };
            (second_before, second) = (second, after);
        }
    }

    /// The Chebyshev coefficients of each panel from the values at the knots that rows reach.
    pub(crate) fn coefficients(&self, values: &[f64], out: &mut [f64]) {
        for panel in &self.panels[..self.used] {
            let values = &values[panel.range()];
            for (coefficient, row) in
                out[panel.range()].iter_mut().zip(self.transforms[panel.transform].rows())
            {
                *coefficient = dot(row, values);
            }
        }
    }

    /// The function with these Chebyshev coefficients at `scale` times each knot that rows reach; beyond the range, its
    /// value at the range's end. `scale` of 1 gives the values at the knots to rounding.
    pub(crate) fn scaled(&self, coefficients: &[f64], scale: f64, out: &mut [f64]) {
        let (low, high) = self.range();
        let log_scale = scale.ln();
        let knots = self.wavenumbers.values().iter().zip(self.wavenumbers.logarithms());
        let mut places = [0.0; BLOCK];
        let (mut count, mut from) = (0, 0);
        let mut panel = 0;
        for (index, (&k, &log_k)) in knots.take(self.reached()).enumerate() {
            let (k, log_k) = (k * scale, log_k + log_scale);
            let (k, log_k) = match () {
                () if k < low => (low, low.ln()),
                () if k > high => (high, high.ln()),
                () => (k, log_k),
            };
            let mut here = panel;
            while here + 1 < self.used && k > self.panels[here].high {
                here += 1;
            }
            if count == BLOCK || here != panel {
                clenshaw(&coefficients[self.panels[panel].range()], &places, &mut out[from..index]);
                (count, from, panel) = (0, index, here);
            }
            places[count] = self.panels[here].place(k, log_k);
            count += 1;
        }
        let end = self.reached();
        clenshaw(&coefficients[self.panels[panel].range()], &places, &mut out[from..end]);
    }
}

/// Points of one panel that are summed together, so that the processor can overlap them.
const BLOCK: usize = 8;

/// Σ cₙ Tₙ(t) at as many of `places` as `out` is long.
fn clenshaw(coefficients: &[f64], places: &[f64; BLOCK], out: &mut [f64]) {
    let (mut one, mut two) = ([0.0; BLOCK], [0.0; BLOCK]);
    let double = places.map(|t| 2.0 * t);
    for coefficient in coefficients[1..].iter().rev() {
        for i in 0..BLOCK {
            let now = coefficient + double[i] * one[i] - two[i];
            two[i] = one[i];
            one[i] = now;
        }
    }
    for (i, value) in out.iter_mut().enumerate() {
        *value = coefficients[0] + places[i] * one[i] - two[i];
    }
}

/// `edges` from `low` to `high` with those of `split` that lie between.
fn with_splits(low: f64, high: f64, others: impl Iterator<Item = f64>) -> Vec<f64> {
    let mut edges = vec![low, high];
    // Not beside an end by nothing but rounding.
    edges.extend(others.filter(|&k| k > low * (1.0 + 1e-9) && k < high * (1.0 - 1e-9)));
    edges.sort_by(f64::total_cmp);
    edges.dedup_by(|after, before| *after < *before * (1.0 + 1e-9));
    edges
}

/// Panels from `low` to `high`, evenly spaced in ln k or k and at most `width` wide; `knots` gets the share of that width.
fn pieces(
    low: f64,
    high: f64,
    width: f64,
    logarithmic: bool,
    knots: impl Fn(f64) -> usize,
) -> impl Iterator<Item = Panel> {
    let (start, length) = if logarithmic { (low.ln(), (high / low).ln()) } else { (low, high - low) };
    // A width that fits but for rounding needs no second piece.
    let count = ((length / width) * (1.0 - 1e-9)).ceil().max(1.0) as usize;
    let knots = knots(length / count as f64 / width);
    let edge = move |i: usize| match i {
        0 => low,
        i if i == count => high,
        i => {
            let place = start + length * i as f64 / count as f64;
            if logarithmic { place.exp() } else { place }
        }
    };
    (0..count).map(move |i| Panel::new(edge(i), edge(i + 1), logarithmic, knots))
}

fn shape_panels(low: f64, high: f64, split: &[f64], slopes: Option<(f64, f64)>) -> Vec<Panel> {
    let ends = ZONES.iter().map(|zone| zone.end);
    let ends = ends.chain(slopes.into_iter().flat_map(|(from, to)| [from, to, SLOPE_END]));
    let edges = with_splits(low, high, ends.chain(split.iter().copied()));
    let panels = edges.windows(2).flat_map(|pair| {
        let middle = 0.5 * (pair[0] + pair[1]);
        let sloped = slopes.is_some_and(|(from, to)| from < middle && middle < to);
        let last = ZONES.len() - 1;
        let mut index = ZONES.iter().position(|zone| middle < zone.end).unwrap_or(last);
        if sloped && index == last && middle < SLOPE_END {
            index = last - 1;
        }
        let zone = ZONES[index];
        let knots = move |share: f64| {
            let full = zone.knots as f64 * if sloped { SLOPE_KNOTS } else { 1.0 };
            FEWEST.max((full * (SHARE + (1.0 - SHARE) * share)).ceil() as usize)
        };
        pieces(pair[0], pair[1], zone.width, zone.logarithmic, knots)
    });
    panels.collect()
}

fn table_panels(table: &PowerTable, low: f64, high: f64, split: &[f64]) -> Vec<Panel> {
    let mut last = low;
    let entries = table.wavenumbers().filter(|k| {
        let apart = *k > last * TABLE_NARROWEST.exp();
        if apart {
            last = *k;
        }
        apart
    });
    let edges = with_splits(low, high, entries.chain(split.iter().copied()));
    edges.windows(2).flat_map(|pair| pieces(pair[0], pair[1], TABLE_WIDTH, true, |_| TABLE_KNOTS)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use oddwell_cosmology::LinearPower;

    fn errors(densities: (f64, f64, f64), slopes: Option<(f64, f64)>) -> Vec<(f64, f64, f64)> {
        let shape = PowerShape::EisensteinHu;
        let knots = Knots::new(&shape, (1e-4, 8.6), &[], slopes).unwrap();
        let (omega_m, omega_b, h) = densities;
        let power = LinearPower::new(&shape, omega_m, omega_b, h, 0.965, 0.8).unwrap();
        let mut values = vec![0.0; knots.wavenumbers().len()];
        power.tabulate(knots.wavenumbers().values(), &mut values).unwrap();
        let mut weights = Vec::new();
        let mut worst = Vec::new();
        for panel in &knots.panels()[..knots.used] {
            let (mut value, mut slope) = (0.0_f64, 0.0_f64);
            for i in 0..=200 {
                let k = panel.wavenumber(-1.0 + 0.01 * f64::from(i));
                knots.weights(panel, k, false, &mut weights);
                value = value.max((dot(&weights, &values[panel.range()]) / power.power(k) - 1.0).abs());
                knots.weights(panel, k, true, &mut weights);
                let found = dot(&weights, &values[panel.range()]);
                let at = |share: f64| power.power(k * (1.0 + 1e-4 * share));
                let expected = (at(-2.0) - 8.0 * at(-1.0) + 8.0 * at(1.0) - at(2.0)) / 12e-4;
                slope = slope.max((found * k - expected).abs() / power.power(k));
            }
            worst.push((panel.high, value, slope));
        }
        worst
    }

    /// What the zones promise. Slopes are compared with differences, good to 1e-11 of P/k.
    #[test]
    fn polynomials_follow_the_spectrum() {
        for densities in
            [(0.31, 0.049, 0.68), (0.27, 0.0483, 0.704), (0.25, 0.055, 0.78), (0.36, 0.045, 0.62)]
        {
            for (high, value, _) in errors(densities, None) {
                let promised = if high <= 0.6 {
                    1e-7
                } else if high <= 3.0 {
                    3e-7
                } else {
                    4e-6
                };
                assert!(value < promised, "{densities:?} to {high}: {value:e}");
            }
            for (high, value, slope) in errors(densities, Some((1e-4, 8.6))) {
                assert!(
                    high > 3.0 || value < 1e-9 && slope < 3e-6,
                    "{densities:?} to {high}: {value:e} {slope:e}"
                );
            }
        }
        for densities in [(0.15, 0.04, 0.7), (0.6, 0.05, 0.6)] {
            assert!(errors(densities, None).iter().all(|(high, value, _)| *high > 3.0 || *value < 1e-5));
        }
    }

    /// Chebyshev sums at scaled places are the polynomial through the knots; clamped at the ends of the range.
    #[test]
    fn scaled_is_the_interpolation_elsewhere() {
        let knots = Knots::new(&PowerShape::EisensteinHu, (1e-3, 5.0), &[0.3], None).unwrap();
        let reached = knots.reached();
        let wavenumbers = &knots.wavenumbers().values()[..reached];
        let values: Vec<f64> = wavenumbers.iter().map(|k| (3.0 * k.ln()).sin() + k * k).collect();
        let (mut coefficients, mut found) = (vec![0.0; reached], vec![0.0; reached]);
        knots.coefficients(&values, &mut coefficients);
        let mut weights = Vec::new();
        for scale in [1.0, 0.97, 1.02, 0.7, 1.4] {
            knots.scaled(&coefficients, scale, &mut found);
            for (index, found) in found.iter().enumerate() {
                let k = (wavenumbers[index] * scale).clamp(1e-3, 5.0);
                let panel = knots.panel_of(k);
                knots.weights(panel, k, false, &mut weights);
                let expected = dot(&weights, &values[panel.range()]);
                assert!((found - expected).abs() < 1e-12 * (1.0 + expected.abs()), "{scale} {k}");
                assert!(scale != 1.0 || (found - values[index]).abs() < 1e-13 * (1.0 + values[index].abs()));
            }
        }
    }

    #[test]
    fn panels_join_and_end_where_they_must() {
        let table =
            oddwell_cosmology::PowerTable::new(vec![1e-4, 1e-3, 1e-2, 0.1, 0.101, 20.0], vec![1.0; 6]);
        let table = PowerShape::Table(std::sync::Arc::new(table.unwrap()));
        for shape in [PowerShape::EisensteinHu, table] {
            for range in [(1e-4, 8.6), (3e-4, 0.02), (0.099, 0.101), (1e-4, 40.0 / 2.0)] {
                let knots = Knots::new(&shape, range, &[0.0123], Some((0.005, 0.09))).unwrap();
                assert_eq!(knots.range(), range);
                for pair in knots.panels().windows(2) {
                    assert_eq!(pair[0].high, pair[1].low);
                    assert_eq!(pair[0].range().end, pair[1].first);
                }
                let inside = range.0 < 0.0123 && 0.0123 < range.1;
                assert_eq!(knots.panels().iter().any(|panel| panel.high == 0.0123), inside);
                assert!(knots.wavenumbers().values().is_sorted());
            }
        }
    }
}
