//! From a study file to a plan that can be run.
//!
//! 1. [`StudyFile`]: the file as typed, every value with its place ([`mod@file`]).
//! 2. [`Study`]: names resolved, rules checked, every hypothesis linked ([`resolve`]).
//! 3. [`ParameterMap`]: from the free parameters of a hypothesis to the flat vector that a model reads.
//!
//! What is wrong is a [`StudyError`], with file, line and column; what is suspicious is a [`Warning`].
//!
//! This crate does no arithmetic of physics or statistics and prints nothing.

mod checksum;
mod describe;
mod error;
mod fault;
mod nearest;
mod parameter_map;
mod predict;
mod run_error;
mod warnings;

pub mod assemble;
pub mod file;
pub mod record;
pub mod resolve;
pub mod template;

pub use describe::{DescribedQuantity, Kind, describe};
pub use error::{Location, Problem, StudyError};
pub use fault::Fault;
pub use file::{Located, Origin, Override, Place, PriorSpec, Quantity, StudyFile};
pub use nearest::Nearest;
pub use parameter_map::{ParameterMap, Term};
pub use predict::{PredictedRow, predict};
pub use run_error::RunError;
pub use resolve::{AffineForm, FreeParameter, FreePrior, Hypothesis, ResolvedQuantity, State, Study};
pub use warnings::Warning;
