//! What the odd and even multipoles of a two-tracer correlation look like, given a background, two tracers and a
//! departure from general relativity.
//!
//! The crate turns a flat vector of *quantities* (see [`Layout`]) into a *prediction*, one number a measured row
//! ([`Model::predict`]). Where no quantity that changes a k-shape moves, the same prediction is `kernels ×
//! coefficients` ([`Model::kernels`], [`Model::coefficients`]): the kernels are fixed, the coefficients a short
//! polynomial in the nuisances, so that a likelihood can compress its data exactly.
//!
//! Units throughout: separations in Mpc/h, wavenumbers in h/Mpc, spectra in (Mpc/h)³, offsets in km/s.
//! Never here: reading or writing, measured data, statistics.

mod abscissa;
#[cfg(test)]
mod accuracy;
mod by_effect;
mod check;
mod coefficients;
pub mod covariance;
pub mod degeneracy;
pub mod departures;
mod error;
mod functionals;
mod grid;
mod growth;
mod integration;
mod kernels;
mod knots;
mod layout;
mod linear;
mod model;
mod plan;
mod remapping;
mod rows;
mod setup;
mod spectrum;
mod state;
mod terms;
mod tracer;
mod workspace;

pub use by_effect::EffectName;
pub use departures::{Departure, FeltBy, Spread};
pub use error::ModelError;
pub use kernels::Kernels;
pub use layout::Layout;
pub use linear::LinearSlots;
pub use model::Model;
pub use rows::{Pair, Row, SightLine, Space};
pub use setup::{BinSetup, Effects, ModelSetup};
pub use state::{BinState, PairState};
pub use tracer::{Tracer, evolution_bias_of_slope};
pub use workspace::Workspace;
