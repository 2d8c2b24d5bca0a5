//! `oddwell check`: reads everything, samples nothing, and says what the data themselves say.
//!
//! Every verdict compares the measurements with what is expected before a fit: the prediction at the centre of the priors in
//! general relativity, with the spread that the priors give it. Thresholds are such that each kind of warning arises in
//! fewer than one of a thousand sound studies ([`ALARM`], divided by the number of places looked at).

mod budget;
mod expectation;
mod kinds;
mod parity;
mod redshifts;
mod suspicions;
mod verdicts;

pub(crate) use expectation::predict_with;
pub use kinds::{KINDS, Kind, Rate, thresholds};
pub use parity::{LeakageVerdict, ParityVerdict};
pub use redshifts::{LARGEST_CURVATURE, ScaleFactorVerdict, WidthVerdict};
pub use verdicts::{
    AmplitudeVerdict, BudgetLine, CovarianceVerdict, GoodnessVerdict, ModeVerdict, OrientationVerdict,
    SignalVerdict, SurveyVerdict, TauEquivalent, Verdicts,
};

use crate::assemble::{Measurements, read_measurements};
use crate::record::WarningRecord;
use crate::resolve::{Hypothesis, Study};
use crate::run_error::RunError;
use serde::Serialize;

/// The rate at which a kind of warning may arise in sound studies.
pub const ALARM: f64 = 1e-3;

/// What `oddwell check` says.
#[derive(Clone, Debug, Serialize)]
pub struct CheckReport {
    /// What stops a fit; empty where there are verdicts.
    pub errors: Vec<String>,
    /// What is suspicious, with what to do.
    pub warnings: Vec<WarningRecord>,
    /// The data's own verdicts; null where there are errors.
    pub verdicts: Option<Verdicts>,
}

impl CheckReport {
    /// A report of errors alone, one a line of `message`.
    #[must_use]
    pub fn of_errors(message: &str) -> CheckReport {
        let errors = message.lines().map(str::to_owned).collect();
        CheckReport { errors, warnings: Vec::new(), verdicts: None }
    }
}

/// Checks a study under a hypothesis with an inferred departure (where it has none, verdicts on the departure are left out).
///
/// # Errors
/// [`RunError`] where the study can't be read or predicted; turn it into [`CheckReport::of_errors`].
pub fn check(study: &Study, hypothesis: &Hypothesis) -> Result<CheckReport, RunError> {
    check_measurements(study, hypothesis, &read_measurements(study)?, ALARM)
}

/// Checks measurements that have been read, with another threshold than [`ALARM`]: a larger one finds more, and more often
/// where nothing is.
///
/// # Errors
/// [`RunError`] where the study can't be predicted.
pub fn check_measurements(
    study: &Study,
    hypothesis: &Hypothesis,
    measurements: &Measurements,
    alarm: f64,
) -> Result<CheckReport, RunError> {
    let expected = expectation::Expected::new(study, hypothesis, measurements)?;
    let verdicts = verdicts::verdicts(study, measurements, &expected)?;
    let mut warnings: Vec<WarningRecord> = measurements
        .warnings
        .iter()
        .map(|warning| WarningRecord {
            code: warning.code().to_owned(),
            text: warning.text(),
            place: warning.place().to_owned(),
        })
        .collect();
    warnings.extend(suspicions::suspicions(study, measurements, &expected, &verdicts, alarm)?);
    Ok(CheckReport { errors: Vec::new(), warnings, verdicts: Some(verdicts) })
}
