//! What can be wrong with a background, a power spectrum or a growth history.

use thiserror::Error;

/// Why a cosmological quantity cannot be computed. Every text names the subject, the value, the rule and a way out.
#[derive(Clone, Debug, PartialEq, Error)]
#[non_exhaustive]
pub enum CosmologyError {
    /// A number lies outside the range in which the formulas hold.
    #[error("{name} = {value}: must be {rule}; {way_out}")]
    OutOfRange {
        /// The quantity, by the name that a study gives it.
        name: &'static str,
        /// What it was.
        value: f64,
        /// The range that it has to lie in.
        rule: &'static str,
        /// What to do about it.
        way_out: &'static str,
    },
    /// H² ≤ 0 somewhere between the redshift and today: such a universe bounced, and has no such past.
    #[error(
        "the expansion rate squared is {value} times today's at redshift {redshift}: must be above 0 all the way \
         from redshift {asked} to today; change omega_m, omega_k, w0 or wa"
    )]
    NoExpansion {
        /// Where it failed.
        redshift: f64,
        /// E² there.
        value: f64,
        /// The redshift that was asked for.
        asked: f64,
    },
    /// In a closed universe, light from this redshift has passed the point opposite to the observer.
    #[error(
        "redshift {redshift} lies at a comoving distance of {distance} Mpc/h, beyond the antipode at {antipode} \
         Mpc/h of a closed universe with omega_k = {omega_k}: must be nearer; give omega_k nearer to 0"
    )]
    BeyondAntipode {
        /// The redshift that was asked for.
        redshift: f64,
        /// Its comoving distance, Mpc/h.
        distance: f64,
        /// The antipode's comoving distance, Mpc/h.
        antipode: f64,
        /// The curvature.
        omega_k: f64,
    },
    /// A wavenumber lies outside the table of the power spectrum.
    #[error(
        "wavenumber {wavenumber} h/Mpc: the power table covers {low} to {high} h/Mpc only, and {needed_low} to \
         {needed_high} h/Mpc is needed; give a table that covers that range"
    )]
    OutsideTable {
        /// The first wavenumber that lies outside, h/Mpc.
        wavenumber: f64,
        /// The table's lowest wavenumber, h/Mpc.
        low: f64,
        /// The table's highest wavenumber, h/Mpc.
        high: f64,
        /// The lowest wavenumber that was asked for, h/Mpc.
        needed_low: f64,
        /// The highest wavenumber that was asked for, h/Mpc.
        needed_high: f64,
    },
    /// A table of the power spectrum is malformed.
    #[error("power table, entry {entry}: {what} = {value}: must be {rule}; correct the table")]
    BadTable {
        /// Which entry, counted from 1.
        entry: usize,
        /// `wavenumber` or `power`.
        what: &'static str,
        /// What stood there.
        value: f64,
        /// What must stand there.
        rule: &'static str,
    },
    /// A table of the power spectrum has the wrong number of entries.
    #[error(
        "power table: {wavenumbers} wavenumbers and {powers} powers: must be as many of each, and {least} or more; \
         correct the table"
    )]
    TableSize {
        /// How many wavenumbers there are.
        wavenumbers: usize,
        /// How many powers there are.
        powers: usize,
        /// The fewest that do.
        least: usize,
    },
    /// Two slices that belong together differ in length.
    #[error("{what}: {given} given where {wanted} are wanted: must be equally many; give one for each")]
    Length {
        /// What was given.
        what: &'static str,
        /// How many came.
        given: usize,
        /// How many should have come.
        wanted: usize,
    },
    /// The growth equation could not be integrated.
    #[error(
        "growth of matter: the integration failed near scale factor {scale_factor} ({reason}): must stay finite and \
         smooth; give a departure that is weaker or changes more slowly"
    )]
    Growth {
        /// Where it failed.
        scale_factor: f64,
        /// What went wrong.
        reason: String,
    },
}
