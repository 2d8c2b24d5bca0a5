//! From a study file to a plan that can be run.
//!
//! 1. [`StudyFile`]: the file as typed, every value with its place ([`mod@file`]).
//! 2. [`Study`]: names resolved, rules checked, every hypothesis linked ([`resolve`]).
//! 3. [`ParameterMap`]: from the free parameters of a hypothesis to the flat vector that a model reads.
//!
//! What is wrong is a [`StudyError`], with file, line and column; what is suspicious is a [`Warning`].
//!
//! This crate does no arithmetic of physics or statistics and prints nothing.

mod chain_parquet;
mod checkpoint;
mod checksum;
mod clocks;
mod copy;
mod data_manual;
mod describe;
mod error;
mod evolution;
mod fault;
mod fit;
mod lock;
mod manual;
mod nearest;
mod new_study;
mod parameter_map;
mod predict;
mod run_directory;
mod run_error;
mod simulate;
mod stability;
mod unaveraged;
mod warnings;
mod weigh;
mod worth;
mod written;

pub mod assemble;
pub mod blinding;
pub mod check;
pub mod file;
pub mod record;
pub mod resolve;
pub mod review;
pub mod schema;
pub mod template;

pub use chain_parquet::{DESCRIPTIONS_KEY, UNITS_KEY, description_of};
pub use checkpoint::{Checkpoints, Kept, RunIdentity};
pub use copy::StudyCopy;
pub use data_manual::{DataPage, data_pages};
pub use describe::{DescribedQuantity, Kind, describe};
pub use error::{Location, Problem, StudyError};
pub use fault::Fault;
pub use file::{Located, Origin, Override, Place, PriorSpec, Quantity, StudyFile};
pub use fit::{FitOptions, Fitted, Resumed, default_directory, fit};
pub use lock::Lock;
pub use manual::{ManualPage, ManualParameter, manual_page, manual_pages};
pub use nearest::Nearest;
pub use new_study::write_new_study;
pub use oddwell_evidence::comparison::Verdict as WeighVerdict;
pub use oddwell_evidence::{Estimate, EstimatorFamily, estimator_families};
pub use oddwell_sampler::{Control, MAXIMUM_RHAT, Phase, Progress};
pub use parameter_map::{ParameterMap, Term};
pub use predict::{EffectColumns, PredictedRow, predict, predict_by_effect};
pub use resolve::{
    AffineForm, FreeParameter, FreePrior, Hypothesis, ResolvedQuantity, Restriction, State, Study,
};
pub use run_directory::{Existing, RunDirectory, read_manifest, read_summary};
pub use run_error::RunError;
pub use simulate::{Draw, Simulated, Truth, simulate_study};
pub use stability::{Step, stability};
pub use warnings::Warning;
pub use weigh::{HypothesisWatch, WeighOptions, WeighWatch, Weighed, default_weigh_directory, weigh};
pub use worth::{OffsetWorth, offset_in_tau};
pub use written::{make_folder, may_write, write_file};
