//! What can go wrong in a prediction.

use oddwell_cosmology::CosmologyError;
use thiserror::Error;

/// Why a model could not be set up or evaluated.
///
/// [`ModelError::is_recoverable`] tells a rejected step (this point of parameter space has no prediction) from a
/// setup that can never work.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum ModelError {
    /// The background or the growth of structure has no value here (for instance E² ≤ 0 on the way to a redshift).
    #[error("{0}")]
    Cosmology(#[from] CosmologyError),
    /// A term of the prediction came out as infinity or not-a-number.
    #[error(
        "the {term} of bin `{bin}` is {value}: a prediction must be finite; look at the values of that bin"
    )]
    NotFinite {
        /// The term it arose in.
        term: &'static str,
        /// `SURVEY.BIN`.
        bin: String,
        /// The value found.
        value: f64,
    },
    /// Wavenumbers of a remapped bin stretch beyond the range in which spectra are tabulated.
    #[error(
        "the remapping of bin `{bin}` stretches by {along:.3} along the line of sight and {across:.3} across: wavenumbers \
         are tabulated for stretches up to {limit}; narrow the priors of the background, or give a fiducial nearer to it"
    )]
    Remapping {
        /// `SURVEY.BIN`.
        bin: String,
        /// α∥ = H_fid/H.
        along: f64,
        /// α⊥ = r/r_fid.
        across: f64,
        /// Largest stretch, either way.
        limit: f64,
    },
    /// A quantity that was to be taken as linear, and is not.
    #[error(
        "`{name}` does not enter the prediction linearly: only linear quantities can be integrated out; sample it"
    )]
    NotLinear {
        /// The quantity.
        name: String,
    },
    /// A setup that can't be predicted.
    #[error("{what} = {value}: {rule}; {way_out}")]
    Setup {
        /// The subject.
        what: String,
        /// The value given.
        value: String,
        /// The rule it breaks.
        rule: &'static str,
        /// What to do.
        way_out: &'static str,
    },
    /// A departure was given a value outside the range on which its formula holds.
    #[error("departure.{parameter} = {value}: {rule}")]
    Departure {
        /// The parameter's name.
        parameter: &'static str,
        /// The value given.
        value: f64,
        /// The rule it breaks.
        rule: &'static str,
    },
}

impl ModelError {
    /// Whether another point of parameter space may well have a prediction: then a sampler rejects the step and goes on.
    #[must_use]
    pub fn is_recoverable(&self) -> bool {
        !matches!(self, ModelError::Setup { .. } | ModelError::NotLinear { .. })
    }
}
