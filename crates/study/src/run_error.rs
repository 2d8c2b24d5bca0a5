//! What can stop a run, between a valid study file and a finished run directory.

use crate::error::StudyError;
use oddwell_cosmology::CosmologyError;
use oddwell_evidence::EvidenceError;
use oddwell_likelihood::{DataError, LikelihoodError, NoiseError};
use oddwell_model::ModelError;
use oddwell_sampler::{PriorError, SamplerError};
use std::path::PathBuf;
use thiserror::Error;

/// Why a study could not be assembled, predicted, fitted or written. The text is the whole message for the user.
#[derive(Debug, Error)]
#[non_exhaustive]
pub enum RunError {
    /// The study file is wrong.
    #[error(transparent)]
    Study(#[from] StudyError),
    /// A table of measurements or a covariance is wrong.
    #[error(transparent)]
    Data(#[from] DataError),
    /// Data and covariance don't go together, or the noise model doesn't suit them.
    #[error("survey `{survey}`: {source}")]
    Likelihood {
        /// The survey.
        survey: String,
        /// What is wrong.
        source: LikelihoodError,
    },
    /// The noise model needs what the study does not give.
    #[error("survey `{survey}`: {source}")]
    Noise {
        /// The survey.
        survey: String,
        /// What is wrong.
        source: NoiseError,
    },
    /// A row of a table belongs to no bin of the survey.
    #[error(
        "{file}, line {line}, column `bin`: `{bin}` is not a [[survey.bin]] of `{survey}`, which has {known}{suggestion}; add the bin to the study, or cut its rows with `keep`"
    )]
    RowWithoutBin {
        /// The table.
        file: String,
        /// The line.
        line: u64,
        /// The bin's name in the table.
        bin: String,
        /// The survey.
        survey: String,
        /// The bins that are there.
        known: String,
        /// `; did you mean …?`, or nothing.
        suggestion: String,
    },
    /// A bin of the study has no row left.
    #[error(
        "{study}, line {line}: the bin `{survey}.{bin}` has no row in {file}{after_keep}; add its rows, widen `keep`, or remove the bin"
    )]
    BinWithoutRow {
        /// The study file.
        study: String,
        /// The line of the bin's name.
        line: usize,
        /// The survey.
        survey: String,
        /// The bin.
        bin: String,
        /// The table.
        file: String,
        /// ` that passes `keep``, or nothing.
        after_keep: &'static str,
    },
    /// The background, growth or spectrum has no value.
    #[error(transparent)]
    Cosmology(#[from] CosmologyError),
    /// The prediction has no value.
    #[error(transparent)]
    Model(#[from] ModelError),
    /// A prior can't be built.
    #[error(transparent)]
    Prior(#[from] PriorError),
    /// Sampling failed.
    #[error(transparent)]
    Sampler(#[from] SamplerError),
    /// An evidence can't be had.
    #[error(transparent)]
    Evidence(#[from] EvidenceError),
    /// Nothing to go on with.
    #[error("{}: can't be resumed: {reason}; start anew without `--resume`", .path.display())]
    NotResumable {
        /// The run directory.
        path: PathBuf,
        /// Why.
        reason: &'static str,
    },
    /// Nothing to infer.
    #[error(
        "hypothesis `{hypothesis}` has nothing to infer: every quantity is held; give at least one quantity a prior, such as `tau = {{ normal = [0.0, 3.0] }}`"
    )]
    NothingInferred {
        /// The hypothesis.
        hypothesis: String,
    },
    /// Stability of a hypothesis that has not one departure.
    #[error(
        "hypothesis `{hypothesis}`: stability follows one departure parameter, found {found}; choose a hypothesis with one, such as departure = \"constant\""
    )]
    NoStability {
        /// The hypothesis.
        hypothesis: String,
        /// Departure parameters that it infers.
        found: usize,
    },
    /// A table of the matter power spectrum is wrong.
    #[error("{file}{at}: {rule}, found {value}; {way_out}")]
    PowerTable {
        /// The file.
        file: String,
        /// `, line N`, or nothing.
        at: String,
        /// The rule it breaks.
        rule: &'static str,
        /// What was found.
        value: String,
        /// What to do.
        way_out: &'static str,
    },
    /// A table of the matter power spectrum that does not reach as far as the prediction needs.
    #[error(
        "{file}: the power spectrum is given from {} to {} h/Mpc, and is needed from {} to {} h/Mpc; give a table that covers that range",
        .given.0, .given.1, .needed.0, .needed.1
    )]
    PowerRange {
        /// The table.
        file: String,
        /// The wavenumbers that it covers, h/Mpc.
        given: (f64, f64),
        /// The wavenumbers that are needed, h/Mpc, rounded outwards to two digits.
        needed: (f64, f64),
    },
    /// A table whose numbers are no matter power spectrum.
    #[error("{file}: {source}")]
    Power {
        /// The table.
        file: String,
        /// What is wrong.
        source: CosmologyError,
    },
    /// A window matrix, or the table that names its columns, is wrong.
    #[error("{file}{at}: {rule}, found {value}; {way_out}")]
    Window {
        /// The file.
        file: String,
        /// `, line N`, with more where it is known, or nothing.
        at: String,
        /// The rule it breaks.
        rule: String,
        /// What was found.
        value: String,
        /// What to do.
        way_out: String,
    },
    /// The run directory exists.
    #[error("{}: exists already, and a run is never overwritten; give `--replace`, or another folder with `--out` (`--resume` goes on with one that was interrupted)", .path.display())]
    Exists {
        /// The directory.
        path: PathBuf,
    },
    /// A file that is to be written exists.
    #[error("{}: exists already, and is never overwritten; give `--replace`, or another file with `--out`", .path.display())]
    FileExists {
        /// The file.
        path: PathBuf,
    },
    /// Another process is at the same run.
    #[error(
        "{}: {holder} is writing this run; wait for it, end it, or give another folder with `--out`", .path.display()
    )]
    Locked {
        /// The run directory.
        path: PathBuf,
        /// `process N`, or as much as is known.
        holder: String,
    },
    /// A run that was broken off.
    #[error(
        "{}: a run was broken off here; go on with `--resume`, or start over with `--replace`", .path.display()
    )]
    Unfinished {
        /// The run directory that it would have made.
        path: PathBuf,
    },
    /// A state to go on from that belongs to another run.
    #[error(
        "{}: the run to go on with is another: {difference}; bring back what it was begun with, or start over with `--replace`", .path.display()
    )]
    ForeignState {
        /// The run directory.
        path: PathBuf,
        /// What is different.
        difference: String,
    },
    /// No checkpoint that is whole.
    #[error(
        "{}: no checkpoint of the run to go on with is whole ({reason}); start over with `--replace`", .path.display()
    )]
    DamagedState {
        /// The run directory.
        path: PathBuf,
        /// What is wrong.
        reason: String,
    },
    /// What stands where the run directory is to be is no run directory.
    #[error(
        "{}: is not a run directory (it has no summary.json and manifest.json), so `--replace` leaves it alone; give another folder with `--out`", .path.display()
    )]
    NotARun {
        /// The path.
        path: PathBuf,
    },
    /// A survey that is known by its design alone.
    #[error(
        "survey `{survey}` has a [survey.design] and no measurements yet; draw some with `oddwell simulate {study} --out DIR`, or give `multipoles`"
    )]
    NotMeasured {
        /// The survey.
        survey: String,
        /// The study file.
        study: String,
    },
    /// A design beside a window.
    #[error(
        "survey `{survey}` has a window, and a design is drawn without a mask; remove `window` and `window_rows`, or the [survey.design] to draw with the covariance as given"
    )]
    DesignWithWindow {
        /// The survey.
        survey: String,
    },
    /// A design of a survey that shares volume with another.
    #[error(
        "survey `{survey}` has a [[joint_covariance]], and a design is drawn as if it shared no volume; remove the [survey.design] to draw with the covariance as given, or the [[joint_covariance]]"
    )]
    DesignOfShared {
        /// The survey.
        survey: String,
    },
    /// Noise from mocks, without mocks.
    #[error(
        "survey `{survey}`: the noise model `{noise}` is for a covariance estimated from mocks, and a design gives an exact one; draw mocks too, with `--mocks N`, or choose `noise = \"gaussian\"`"
    )]
    NeedsMocks {
        /// The survey.
        survey: String,
        /// The noise model.
        noise: String,
    },
    /// Blinded where it must not be, or not where it must.
    #[error("{what} is blinded; {way_out}")]
    Blinded {
        /// What is blinded.
        what: &'static str,
        /// What to do.
        way_out: &'static str,
    },
    /// A phrase that can't be used. Its text is never part of the message.
    #[error("{}: a phrase file: {reason}", .path.display())]
    Phrase {
        /// The phrase file.
        path: PathBuf,
        /// What is wrong with it.
        reason: String,
    },
    /// Not the phrase that the study commits to.
    #[error("{}: is not the phrase that the study was blinded with; give that one (nothing was revealed)", .path.display())]
    WrongPhrase {
        /// The phrase file.
        path: PathBuf,
    },
    /// A row that was not there when the study was blinded.
    #[error(
        "the row {row} was not measured when the study was blinded, so its shift is unknown; remove it, or bring back the table as it was"
    )]
    NotFrozen {
        /// The row.
        row: String,
    },
    /// A fit that would show how general relativity does on blinded measurements.
    #[error(
        "hypothesis `{hypothesis}` has no inferred departure, and {withheld}; fit a hypothesis with an inferred departure"
    )]
    Withheld {
        /// The hypothesis.
        hypothesis: String,
        /// Why.
        withheld: &'static str,
    },
    /// A verdict of the data that can't be had.
    #[error("{reason}")]
    Verdict {
        /// Why.
        reason: String,
    },
    /// The folder for a new study exists.
    #[error("{}: exists already; give a folder that does not, with `--out`", .path.display())]
    FolderExists {
        /// The folder.
        path: PathBuf,
    },
    /// A file or folder can't be written.
    #[error("{}: can't be written ({reason}); choose a folder that you may write to with `--out`", .path.display())]
    Unwritable {
        /// The path.
        path: PathBuf,
        /// What the operating system said.
        reason: String,
    },
    /// A written file can't be read back.
    #[error("{}: can't be read ({reason}); check that it is a run directory of this program", .path.display())]
    UnreadableRun {
        /// The path.
        path: PathBuf,
        /// What is wrong.
        reason: String,
    },
}

impl RunError {
    pub(crate) fn unwritable(path: impl Into<PathBuf>) -> impl FnOnce(std::io::Error) -> RunError {
        let path = path.into();
        move |error| RunError::Unwritable { path, reason: error.to_string() }
    }
}
