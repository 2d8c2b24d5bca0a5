//! What can be wrong with a prior.

use thiserror::Error;

/// A prior that cannot be built. Each variant carries what a caller needs to word its own message.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum PriorError {
    /// No family of that name.
    #[error("unknown prior family `{family}`; {}", match nearest { Some(name) => format!("did you mean `{name}`?"), None => format!("known: {}", known.join(", ")) })]
    UnknownFamily {
        /// What was asked for.
        family: String,
        /// The nearest known name, where one is near.
        nearest: Option<&'static str>,
        /// All known names.
        known: Vec<&'static str>,
    },
    /// Too few or too many numbers.
    #[error("{family} prior: needs {} number{} ({}), got {got}", names.len(), if names.len() == 1 { "" } else { "s" }, names.join(", "))]
    ArgumentCount {
        /// Family key.
        family: &'static str,
        /// Names of the arguments, in order.
        names: &'static [&'static str],
        /// How many were given.
        got: usize,
    },
    /// An argument is NaN or infinite.
    #[error("{family} prior: {argument} must be a finite number, got {value}")]
    NotFinite {
        /// Family key.
        family: &'static str,
        /// Argument name.
        argument: &'static str,
        /// The value given.
        value: f64,
    },
    /// An argument that must be above zero is not.
    #[error("{family} prior: {argument} must be above 0, got {value}; {way_out}")]
    NotPositive {
        /// Family key.
        family: &'static str,
        /// Argument name.
        argument: &'static str,
        /// The value given.
        value: f64,
        /// What to do about it.
        way_out: &'static str,
    },
    /// Lower bound not below the upper bound.
    #[error(
        "{family} prior: low must be below high, got [{low}, {high}]; swap them, or give a plain number to hold the quantity"
    )]
    InvertedBounds {
        /// Family key.
        family: &'static str,
        /// Lower bound.
        low: f64,
        /// Upper bound.
        high: f64,
    },
    /// The window of `within` is NaN or upside down.
    #[error("{family} prior: within must have low below high, got [{low}, {high}]; swap them")]
    InvertedWindow {
        /// Family key of the truncated prior.
        family: &'static str,
        /// Lower end of the window.
        low: f64,
        /// Upper end of the window.
        high: f64,
    },
    /// The window of `within` holds (almost) none of the prior's mass.
    #[error("{family} prior: within = [{low}, {high}] leaves it no probability (its mass there is {mass:e}, its support [{}, {}]); widen the window or move the prior", support.0, support.1)]
    EmptyWindow {
        /// Family key of the truncated prior.
        family: &'static str,
        /// Lower end of the window.
        low: f64,
        /// Upper end of the window.
        high: f64,
        /// Mass that the prior has inside.
        mass: f64,
        /// Support of the untruncated prior.
        support: (f64, f64),
    },
    /// Mean, covariance and list of a joint prior do not fit together.
    #[error(
        "joint prior: {of} quantities need a mean of {of} and a covariance of {of} by {of}, got a mean of {mean} and a covariance of {rows} by {columns}"
    )]
    JointShape {
        /// Number of quantities.
        of: usize,
        /// Length of the mean.
        mean: usize,
        /// Rows of the covariance.
        rows: usize,
        /// Columns of the covariance (of its first ragged row where rows differ).
        columns: usize,
    },
    /// The covariance of a joint prior holds NaN or infinity, or the mean does.
    #[error("joint prior: {part} must hold finite numbers, got {value} at {position:?}")]
    JointNotFinite {
        /// `mean` or `covariance`.
        part: &'static str,
        /// Where (row, column), counted from 0; the column is 0 in a mean.
        position: (usize, usize),
        /// The value given.
        value: f64,
    },
    /// The covariance of a joint prior is not symmetric.
    #[error(
        "joint prior: the covariance must be symmetric, but entry ({row}, {column}) is {value} and entry ({column}, {row}) is {mirrored}; make them equal"
    )]
    JointAsymmetric {
        /// Row, counted from 0.
        row: usize,
        /// Column, counted from 0.
        column: usize,
        /// Entry there.
        value: f64,
        /// Entry across the diagonal.
        mirrored: f64,
    },
    /// The covariance of a joint prior is not positive definite.
    #[error(
        "joint prior: the covariance must be positive definite, but its smallest eigenvalue is {smallest:e} (largest {largest:e}); check variances and correlations"
    )]
    JointIndefinite {
        /// Smallest eigenvalue.
        smallest: f64,
        /// Largest eigenvalue.
        largest: f64,
    },
    /// A dimension has two priors.
    #[error("prior set: dimension {dimension} has two priors; keep one")]
    TwoPriors {
        /// The dimension, counted from 0.
        dimension: usize,
    },
    /// A dimension has no prior.
    #[error("prior set: dimension {dimension} has no prior; give it one")]
    NoPrior {
        /// The dimension, counted from 0.
        dimension: usize,
    },
    /// A prior names a dimension that does not exist.
    #[error("prior set: dimension {dimension} does not exist, there are {count}")]
    NoDimension {
        /// The dimension asked for, counted from 0.
        dimension: usize,
        /// How many there are.
        count: usize,
    },
}

/// `value` if it is finite.
pub(crate) fn finite(family: &'static str, argument: &'static str, value: f64) -> Result<f64, PriorError> {
    if value.is_finite() { Ok(value) } else { Err(PriorError::NotFinite { family, argument, value }) }
}

/// `value` if it is finite and above zero.
pub(crate) fn positive(
    family: &'static str,
    argument: &'static str,
    value: f64,
    way_out: &'static str,
) -> Result<f64, PriorError> {
    let value = finite(family, argument, value)?;
    if value > 0.0 { Ok(value) } else { Err(PriorError::NotPositive { family, argument, value, way_out }) }
}

/// `(low, high)` if both are finite and in order.
pub(crate) fn ordered(family: &'static str, low: f64, high: f64) -> Result<(f64, f64), PriorError> {
    let (low, high) = (finite(family, "low", low)?, finite(family, "high", high)?);
    if low < high { Ok((low, high)) } else { Err(PriorError::InvertedBounds { family, low, high }) }
}
