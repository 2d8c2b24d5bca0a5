//! Shapes of a departure of the time distortion from general relativity, one file each.
//!
//! A departure is a shape τ(a, k) and an answer to *who feels it* ([`FeltBy`]). [`registry`] is the one list of them:
//! help, error messages and manual tables are derived from it.

mod braneworld;
mod constant;
mod dark_energy;
mod f_of_r;
mod finite_range;
mod none;
mod per_bin;
mod per_survey;
mod power_law;
mod step;

use crate::error::ModelError;
use oddwell_cosmology::Background;
use std::fmt;

/// Who feels a departure: what T (light) and G (matter) it sets.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum FeltBy {
    /// T = 1 + τ, G = 1: Ψ as light sees it; matter moves as in general relativity (or by index, or as given).
    Light,
    /// T = 1, G = 1 + τ: a fifth force; Euler's equation with Ψ breaks.
    Matter,
    /// T = G = 1 + τ: Ψ and the acceleration cancel in odd multipoles; only growth is left.
    Everything,
}

impl FeltBy {
    /// All answers, in the order of the documentation.
    pub const ALL: [FeltBy; 3] = [FeltBy::Light, FeltBy::Matter, FeltBy::Everything];

    /// The word in a study file.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            FeltBy::Light => "light",
            FeltBy::Matter => "matter",
            FeltBy::Everything => "everything",
        }
    }

    /// The answer of that name, if there is one.
    #[must_use]
    pub fn parse(name: &str) -> Option<FeltBy> {
        FeltBy::ALL.into_iter().find(|felt_by| felt_by.name() == name)
    }

    /// Whether T departs.
    #[must_use]
    pub fn reaches_light(self) -> bool {
        self != FeltBy::Matter
    }

    /// Whether G departs, and growth with it.
    #[must_use]
    pub fn reaches_matter(self) -> bool {
        self != FeltBy::Light
    }
}

impl fmt::Display for FeltBy {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str(self.name())
    }
}

/// Whether all bins share a departure's parameters.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Spread {
    /// One set for everything.
    Shared,
    /// One set a survey, with the same prior.
    PerSurvey,
    /// One set a bin, with the same prior.
    PerBin,
}

/// One parameter of a departure.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DepartureParameter {
    /// The key in `[[hypothesis]]`, and the name behind `departure.`.
    pub name: &'static str,
    /// One line: what it is, with its unit and range.
    pub meaning: &'static str,
    /// The value at which the shape is general relativity, whatever the others are; none if there is none.
    pub general_relativity: Option<f64>,
}

/// `tau`, as most shapes have it.
pub(crate) const TAU: DepartureParameter = DepartureParameter {
    name: "tau",
    meaning: "amplitude τ0, dimensionless; 0 is general relativity, −1 felt by light is no gravitational redshift",
    general_relativity: Some(0.0),
};

/// A shape τ(a, k).
pub trait Departure: Send + Sync + fmt::Debug {
    /// The word in a study file.
    fn name(&self) -> &'static str;

    /// One line for lists and help: the formula.
    fn formula(&self) -> &'static str;

    /// A paragraph for the manual: what it is, its range, and what an odd multipole can and can't tell about it.
    fn manual(&self) -> &'static str;

    /// Its parameters, in the order in which [`Departure::tau`] takes them.
    fn parameters(&self) -> &'static [DepartureParameter];

    /// Who may feel it, the default first.
    fn allowed(&self) -> &'static [FeltBy];

    /// Whether the bins share its parameters.
    fn spread(&self) -> Spread {
        Spread::Shared
    }

    /// Whether τ depends on k.
    fn scale_dependent(&self) -> bool {
        false
    }

    /// Checks the values once a prediction; the default accepts every finite number.
    ///
    /// # Errors
    /// [`ModelError::Departure`] where the formula does not hold.
    fn check(&self, _parameters: &[f64]) -> Result<(), ModelError> {
        Ok(())
    }

    /// τ at scale factor `a` in (0, 1] and wavenumber `k` (h/Mpc).
    fn tau(&self, parameters: &[f64], background: &Background, a: f64, k: f64) -> f64;

    /// τ at one scale factor and many wavenumbers, into `out` of the same length.
    fn taus(
        &self,
        parameters: &[f64],
        background: &Background,
        a: f64,
        wavenumbers: &[f64],
        out: &mut [f64],
    ) {
        for (tau, &k) in out.iter_mut().zip(wavenumbers) {
            *tau = self.tau(parameters, background, a, k);
        }
    }
}

/// Every shape, in the order of the documentation.
#[must_use]
pub fn registry() -> &'static [&'static dyn Departure] {
    &[
        &none::None,
        &constant::Constant,
        &dark_energy::DarkEnergy,
        &power_law::PowerLaw,
        &step::Step,
        &per_bin::PerBin,
        &per_survey::PerSurvey,
        &finite_range::FiniteRange,
        &braneworld::Braneworld,
        &f_of_r::FOfR,
    ]
}

/// The shape of that name, if there is one.
#[must_use]
pub fn find(name: &str) -> Option<&'static dyn Departure> {
    registry().iter().copied().find(|shape| shape.name() == name)
}

#[cfg(test)]
mod tests;
