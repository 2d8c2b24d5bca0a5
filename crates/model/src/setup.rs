//! What a model is built from.

use crate::departures::{Departure, FeltBy};
use crate::rows::{Row, SightLine};
use oddwell_cosmology::{Background, PowerShape};

/// One redshift bin of one survey.
#[derive(Clone, Debug, PartialEq)]
pub struct BinSetup {
    /// The survey's name.
    pub survey: String,
    /// The bin's name.
    pub name: String,
    /// (redshift, weight), weights summing to one: the prediction is the weighted mean. One entry for a thin bin.
    pub nodes: Vec<(f64, f64)>,
    /// The sight-line of the survey's pairs.
    pub sight_line: SightLine,
    /// Whether f and f′ are quantities of the bin (`growth_rate`, `growth_slope`), in place of the growth equation.
    pub growth_given: bool,
    /// Whether the slope of the density that the catalogue shows stands in place of the evolution bias (of the first, of the
    /// second tracer): the quantity is then `observed_density_slope`, see
    /// [`evolution_bias_of_slope`](crate::evolution_bias_of_slope).
    pub observed_slopes: [bool; 2],
    /// The background with which the measurement turned redshifts and angles into separations (or wavenumbers), which the
    /// prediction is then remapped to (Alcock & Paczynski 1979). None: separations are true ones whatever the background,
    /// so that positions and shells move with it.
    pub fiducial: Option<Background>,
}

impl BinSetup {
    /// `SURVEY.BIN`.
    #[must_use]
    pub fn path(&self) -> String {
        format!("{}.{}", self.survey, self.name)
    }
}

/// Which effects enter the prediction. The default is everything that is known.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Effects {
    /// Doppler terms of R.
    pub doppler: bool,
    /// Acceleration terms of R (light-cone effect on velocities included).
    pub acceleration: bool,
    /// The gravitational-redshift term of R.
    pub gravitational_redshift: bool,
    /// Redshift offset between the tracers.
    pub offset: bool,
    /// Wide-angle terms, first order in s/r.
    pub wide_angle: bool,
    /// Evolution of the tracers and of growth along the light cone, first order in s.
    pub light_cone: bool,
    /// Lensing of the farther tracer by matter around the nearer one.
    pub lensing: bool,
}

impl Effects {
    /// None of them: what is left is the zeroth order of the even multipoles.
    pub const NONE: Effects = Effects {
        doppler: false,
        acceleration: false,
        gravitational_redshift: false,
        offset: false,
        wide_angle: false,
        light_cone: false,
        lensing: false,
    };
}

impl Default for Effects {
    fn default() -> Self {
        Effects {
            doppler: true,
            acceleration: true,
            gravitational_redshift: true,
            offset: true,
            wide_angle: true,
            light_cone: true,
            lensing: true,
        }
    }
}

/// Everything that is fixed before the first prediction.
#[derive(Clone, Debug)]
pub struct ModelSetup {
    /// The bins of all surveys.
    pub bins: Vec<BinSetup>,
    /// The rows to predict, in the order of the output.
    pub rows: Vec<Row>,
    /// The shape of the matter power spectrum.
    pub power: PowerShape,
    /// Which effects to include.
    pub effects: Effects,
    /// Whether growth follows f = Ωm(a)^γ with γ the quantity `prediction.growth_index`.
    pub growth_index: bool,
    /// The smallest `prediction.damping` (Mpc/h) that will be asked for; it sets the range of the k integrals.
    pub smallest_damping: f64,
    /// The shape of the departure.
    pub departure: &'static dyn Departure,
    /// Who feels it.
    pub felt_by: FeltBy,
}
