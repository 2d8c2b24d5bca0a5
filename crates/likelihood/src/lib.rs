//! Measured multipoles, their covariance and the likelihood of a prediction.
//!
//! What goes in: tables of measured numbers ([`read_multipoles`], [`keep_rows`]) and their covariance, from a file
//! ([`read_covariance`]; formats in [`array_formats`]) or from mock measurements ([`read_mocks`], [`read_mock_tables`]), with
//! theory errors added ([`ExtraCovariance`]) and shrunk towards a model ([`MockSet::shrunk`]). What comes out: χ² and
//! log-likelihood of a prediction, given number by number ([`SurveyLikelihood`], [`SurveySet`]) or as coefficients of fixed
//! kernels ([`CompressedLikelihood`]), under a noise model ([`noise_families`]), templates integrated out
//! ([`SurveyLikelihood::with_templates`]); the information about parameters ([`effective_parameters`]); how surprising a χ² is
//! ([`chi_squared_p_value`]); and the data's own [`verdicts`].
//!
//! This crate knows no physics, no priors and no sampling: a prediction is a vector, or kernels and coefficients.

mod arrays;
mod blocks;
mod cholesky;
mod compressed;
mod covariance;
mod covariance_file;
mod error;
mod extra;
mod fisher;
mod goodness;
mod header;
mod information;
mod integrated;
mod joint;
mod keep;
mod mocks;
mod noise;
mod parts;
mod records;
mod rewrite;
mod rows;
mod shrinkage;
mod survey;
mod surveys;
mod table;
mod templates;
mod triangle;
mod units;
pub mod verdicts;

pub use arrays::{ArrayError, ArrayFormat, array_formats, npy_bytes};
pub use compressed::{CompressedLikelihood, LeastSquares};
pub use covariance::{Covariance, CovarianceError, SYMMETRY_TOLERANCE};
pub use covariance_file::{
    COVARIANCE_ROW_COLUMNS, CovarianceRows, read_covariance, read_covariance_csv, read_covariance_rows,
};
pub use error::{DataError, Place};
pub use extra::{ExtraCovariance, read_extra_covariance};
pub use fisher::{FisherError, effective_parameters, expected_standard_deviations};
pub use goodness::chi_squared_p_value;
pub use header::IgnoredColumn;
pub use information::{
    allowed_shift, inverse_information, posterior_covariance, share_of_effective_parameters,
};
pub use integrated::{IntegratedScratch, IntegratedSet, IntegrationError, LinearPrior};
pub use joint::JointSurvey;
pub use keep::{Keep, Kept, keep_rows};
pub use mocks::{MockError, MockSet, MockTables, mock_files, read_mock_tables, read_mocks};
pub use noise::{NoiseChoice, NoiseError, NoiseFamily, NoiseInputs, NoiseModel, noise_families};
pub use parts::{Agreement, PartEstimates, agreement, part_estimates};
pub use rewrite::with_values;
pub use rows::{Axis, PAIRS};
pub use shrinkage::Shrunk;
pub use survey::{LikelihoodError, SurveyLikelihood};
pub use surveys::{CompressedSet, SurveySet};
pub use table::{MeasuredRow, MultipoleTable, TABLE_COLUMNS, read_multipoles};
pub use templates::{AmplitudePrior, Amplitudes, Template, TemplateError, read_template};
pub use units::LengthUnit;
