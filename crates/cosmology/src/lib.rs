//! The homogeneous universe and its linear perturbations: expansion, distances, growth and matter power.
//!
//! | module | owns |
//! |---|---|
//! | [`background`] | E(a), its slope, the densities' fractions, distances |
//! | [`epoch`] | everything of the background that one redshift needs, checked once |
//! | [`growth`] | D, f and f′ from the growth equation or from a growth index |
//! | [`growth_solver`] | the same for redshifts that stay while all else moves, many wavenumbers at once |
//! | [`transfer`] | shapes of the linear power spectrum |
//! | [`power`] | the linear power spectrum normalised to σ8 |
//! | [`clocks`] | how differently clocks tick a given distance apart |
//! | [`bessel`], [`legendre()`], [`quadrature`] | special functions and quadrature rules |
//!
//! Units throughout: comoving distances in Mpc/h, wavenumbers in h/Mpc, power in (Mpc/h)³, c = 1, `a = 1/(1+z)`,
//! a prime is d/d ln a. Radiation is neglected (2·10⁻⁴ of a distance at z = 2).
//!
//! This crate never reads a file or a clock, draws no random number, and knows nothing of tracers.

pub mod background;
pub mod bessel;
pub mod clocks;
mod elementary;
pub mod epoch;
pub mod errors;
pub mod growth;
pub mod growth_solver;
pub mod legendre;
pub mod power;
pub mod quadrature;
pub mod transfer;

pub use background::{Background, HUBBLE_DISTANCE, SPEED_OF_LIGHT};
pub use bessel::{spherical_bessel, spherical_bessel_all};
pub use clocks::{ClockContrast, ClockSetting, SECONDS_PER_YEAR, clock_contrast};
pub use epoch::Epoch;
pub use errors::CosmologyError;
pub use growth::{GrowthState, RawGrowth, growth_from_index, growth_history, growth_states};
pub use growth_solver::{GrowthScratch, GrowthSolver};
pub use legendre::legendre;
pub use power::{LinearPower, RawPower, Wavenumbers, variance_kernel};
pub use quadrature::{GaussLegendre, composite, gauss_legendre};
pub use transfer::{PowerShape, PowerTable};
