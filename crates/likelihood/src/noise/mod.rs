//! Noise models: from χ² to a log-likelihood, for a covariance that is known or was estimated from mocks.
//!
//! One model a file, one line in [`noise_families`].

mod gaussian;
mod hartlap;
mod percival;
mod t;

use std::fmt::Debug;
use std::sync::Arc;

use crate::error::{did_you_mean, listed, nearest};

/// How probable a χ² is. χ² is always with the covariance as given: a model that rescales it does so itself.
pub trait NoiseModel: Debug + Send + Sync {
    /// The name by which a study asks for it.
    fn name(&self) -> &'static str;

    /// Natural logarithm of the probability density of the data, constants included where
    /// [`is_normalised`](Self::is_normalised). `chi_squared` ≥ 0; NaN gives NaN.
    fn log_likelihood(&self, chi_squared: f64) -> f64;

    /// −2 ∂ ln L / ∂χ², above 0. JᵀC⁻¹J times this is the data's (observed, Gauss–Newton) information about the
    /// parameters where χ² is `chi_squared`: 1 where the covariance is known.
    fn weight(&self, chi_squared: f64) -> f64;

    /// Whether [`log_likelihood`](Self::log_likelihood) is a density, so that evidences mean something by
    /// themselves. If not, a constant is missing that is the same for every hypothesis.
    fn is_normalised(&self) -> bool {
        true
    }
}

/// What a noise model is built from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NoiseInputs {
    /// n_d: kept rows of the survey (of all surveys that share its covariance).
    pub rows: usize,
    /// ln det C.
    pub log_determinant: f64,
    /// n_s: mocks from which C was estimated, with the divisor n_s − 1.
    pub mock_count: Option<usize>,
    /// n_θ: quantities that the data determine.
    pub determined: Option<usize>,
}

/// An entry of the registry.
#[derive(Debug)]
pub struct NoiseFamily {
    /// The name by which a study asks for it.
    pub name: &'static str,
    /// One line for help and manual.
    pub summary: &'static str,
    /// Whether it needs a mock count.
    pub needs_mocks: bool,
    build: fn(&NoiseInputs) -> Result<Arc<dyn NoiseModel>, NoiseError>,
}

impl NoiseFamily {
    /// Builds the model.
    ///
    /// # Errors
    /// A mock count that is missing or too small.
    pub fn build(&self, inputs: &NoiseInputs) -> Result<Arc<dyn NoiseModel>, NoiseError> {
        (self.build)(inputs)
    }
}

/// A noise model that cannot be had.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum NoiseError {
    /// Not in the registry.
    #[error("unknown noise model `{name}`{}; there are {known}", did_you_mean(.nearest))]
    Unknown {
        /// What was asked for.
        name: String,
        /// The nearest one.
        nearest: Option<String>,
        /// All of them.
        known: String,
    },
    /// No mock count.
    #[error(
        "noise `{name}` needs the number of mocks behind the covariance; give `mock_count` or `mocks`, or choose noise \"gaussian\" where the covariance is known exactly"
    )]
    NeedsMockCount {
        /// The model.
        name: &'static str,
    },
    /// Too few mocks for the rows.
    #[error(
        "noise `{name}` needs at least {least} mocks for {rows} kept rows, found mock_count {mocks}; keep fewer rows or make more mocks"
    )]
    TooFewMocks {
        /// The model.
        name: &'static str,
        /// Mocks given.
        mocks: usize,
        /// Rows kept.
        rows: usize,
        /// Mocks needed.
        least: usize,
    },
    /// The number of quantities that the data determine is missing.
    #[error(
        "noise `{name}` needs the number of quantities that the data determine; count those whose sd the data at least halve, or set it"
    )]
    NeedsDetermined {
        /// The model.
        name: &'static str,
    },
    /// Templates to integrate out under noise that is not normal.
    #[error(
        "noise `{name}` is not normal, so that the amplitudes of templates cannot be integrated out exactly; choose noise \"gaussian\" or \"hartlap\", or infer the amplitudes as parameters"
    )]
    Templates {
        /// The model.
        name: &'static str,
    },
    /// More quantities determined than there are rows.
    #[error(
        "noise `{name}`: the data cannot determine {determined} quantities with {rows} kept rows; set at most {rows}"
    )]
    TooManyDetermined {
        /// The model.
        name: &'static str,
        /// Quantities claimed.
        determined: usize,
        /// Rows kept.
        rows: usize,
    },
}

impl NoiseInputs {
    /// The mock count, which must be at least `margin` above the number of rows.
    fn mocks(&self, name: &'static str, margin: usize) -> Result<usize, NoiseError> {
        let mocks = self.mock_count.ok_or(NoiseError::NeedsMockCount { name })?;
        let least = self.rows + margin;
        match mocks < least {
            true => Err(NoiseError::TooFewMocks { name, mocks, rows: self.rows, least }),
            false => Ok(mocks),
        }
    }
}

/// The noise models that a study can ask for.
pub fn noise_families() -> &'static [NoiseFamily] {
    const FAMILIES: [NoiseFamily; 4] = [gaussian::FAMILY, hartlap::FAMILY, t::FAMILY, percival::FAMILY];
    &FAMILIES
}

/// A noise model as asked for, before the data are known.
#[derive(Clone, Copy, Debug)]
pub struct NoiseChoice {
    /// Which.
    pub family: &'static NoiseFamily,
    /// n_s: mocks from which the covariance was estimated; `None` where it is known.
    pub mock_count: Option<usize>,
    /// n_θ: quantities that the data determine; only `percival` asks.
    pub determined: Option<usize>,
}

impl NoiseChoice {
    /// Looks a name up. The mock count is also kept for models that ignore it: p-values use it.
    ///
    /// # Errors
    /// [`NoiseError::Unknown`] with the nearest name.
    pub fn new(name: &str, mock_count: Option<usize>) -> Result<Self, NoiseError> {
        let families = noise_families();
        match families.iter().find(|family| family.name == name) {
            Some(family) => Ok(Self { family, mock_count, determined: None }),
            None => Err(NoiseError::Unknown {
                name: name.to_owned(),
                nearest: nearest(name, families.iter().map(|family| family.name)),
                known: listed(families.iter().map(|family| family.name)),
            }),
        }
    }

    /// Gaussian noise with a known covariance.
    pub fn gaussian() -> Self {
        Self { family: &noise_families()[0], mock_count: None, determined: None }
    }

    /// The same with n_θ, the number of quantities that the data determine.
    pub fn with_determined(self, determined: usize) -> Self {
        Self { determined: Some(determined), ..self }
    }

    pub(crate) fn build(&self, rows: usize, log_determinant: f64) -> Result<Arc<dyn NoiseModel>, NoiseError> {
        let Self { family, mock_count, determined } = *self;
        family.build(&NoiseInputs { rows, log_determinant, mock_count, determined })
    }
}

impl Default for NoiseChoice {
    fn default() -> Self {
        Self::gaussian()
    }
}
