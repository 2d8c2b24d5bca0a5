//! What the terms of a prediction need to know of one bin, and of one pair in it.

use crate::rows::{Pair, SightLine};
use crate::setup::Effects;
use crate::tracer::Tracer;
use oddwell_cosmology::{Epoch, GrowthState, SPEED_OF_LIGHT};

/// One bin at one redshift (and, where growth or the departure depend on scale, at one wavenumber).
#[derive(Clone, Copy, Debug)]
pub struct BinState {
    /// Background at the redshift.
    pub epoch: Epoch,
    /// D (over D in general relativity today), f, f′.
    pub growth: GrowthState,
    /// T: 1 in general relativity.
    pub time_distortion: f64,
    /// The first tracer.
    pub first: Tracer,
    /// The second tracer.
    pub second: Tracer,
    /// Redshift offset v of the second tracer against the first, km/s.
    pub offset: f64,
    /// Towards where the sight-line points.
    pub sight_line: SightLine,
}

impl BinState {
    /// The state as a pair sees it: tracer 1 and 2 of the *pair*, with their responses R.
    #[must_use]
    pub fn pair(&self, pair: Pair, effects: &Effects) -> PairState {
        let (one, two) = match pair {
            Pair::FirstSecond => (self.first, self.second),
            Pair::FirstFirst => (self.first, self.first),
            Pair::SecondSecond => (self.second, self.second),
        };
        let response =
            |tracer: &Tracer| tracer.response(&self.epoch, &self.growth, self.time_distortion, effects);
        // Δ = (v/c)/H in Mpc/h: the shift along the line of sight; a sample has none against itself.
        let shift = if pair == Pair::FirstSecond && effects.offset {
            self.offset / SPEED_OF_LIGHT / self.epoch.conformal_hubble
        } else {
            0.0
        };
        PairState {
            bias: [one.bias, two.bias],
            magnification_bias: [one.magnification_bias, two.magnification_bias],
            response: [response(&one), response(&two)],
            bias_drift: [one, two]
                .map(|tracer| -self.epoch.conformal_hubble * tracer.bias * tracer.bias_slope),
            rate: self.growth.rate,
            rate_drift: -self.epoch.conformal_hubble * self.growth.rate_slope,
            growth_drift: -self.epoch.conformal_hubble * self.growth.rate,
            hubble: self.epoch.conformal_hubble,
            reduced_distance: self.epoch.reduced_distance,
            matter_fraction: self.epoch.matter_fraction,
            shift,
            fraction: self.sight_line.fraction(),
        }
    }
}

/// One pair of tracers; index 0 is the tracer that separations start from.
#[derive(Clone, Copy, Debug)]
pub struct PairState {
    /// b₁, b₂.
    pub bias: [f64; 2],
    /// s₁, s₂ (magnification).
    pub magnification_bias: [f64; 2],
    /// R₁, R₂.
    pub response: [f64; 2],
    /// ḃ = db/dr = −H b (dln b/dln a), h/Mpc.
    pub bias_drift: [f64; 2],
    /// f.
    pub rate: f64,
    /// ḟ = df/dr = −H f′, h/Mpc.
    pub rate_drift: f64,
    /// ḋ = dln D/dr = −H f, h/Mpc.
    pub growth_drift: f64,
    /// Conformal Hubble rate H, h/Mpc.
    pub hubble: f64,
    /// r̃ = r/C, Mpc/h.
    pub reduced_distance: f64,
    /// Ωm(a).
    pub matter_fraction: f64,
    /// Δ of the redshift offset, Mpc/h.
    pub shift: f64,
    /// t: the sight-line passes a fraction t of the way from tracer 1 to tracer 2.
    pub fraction: f64,
}
