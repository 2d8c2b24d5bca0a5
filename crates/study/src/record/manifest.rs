//! The contents of `manifest.json`: what a run was made from.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// `manifest.json`.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Manifest {
    /// The program's name and version.
    pub version: String,
    /// The command line.
    pub command: Vec<String>,
    /// Path of the study file, as given.
    pub study_file: String,
    /// The study file as read.
    pub study_text: String,
    /// `--set` options, as given.
    pub overrides: Vec<String>,
    /// The surveys and bins that were left in alone, as `SURVEY` or `SURVEY.BIN`; empty: all.
    #[serde(default)]
    pub only: Vec<String>,
    /// Those that were left out.
    #[serde(default)]
    pub without: Vec<String>,
    /// The hypothesis.
    pub hypothesis: String,
    /// The seed of all random numbers.
    pub seed: u64,
    /// Threads available.
    pub threads: usize,
    /// When the run began, UTC, ISO 8601.
    pub started: String,
    /// When the run ended, UTC, ISO 8601.
    pub ended: String,
    /// Every input, the study file first.
    pub inputs: Vec<InputFile>,
    /// Whether it was interrupted, so that `--resume` has something to go on with.
    #[serde(default)]
    pub interrupted: bool,
    /// Steps dropped as warm-up.
    pub warm_up: u64,
    /// Every how many steps a draw is kept in the chain.
    pub thinning: u64,
    /// The rule by which it was thinned, in words.
    #[serde(default)]
    pub thinning_rule: String,
    /// The units of the chain's columns, by name, where they have one.
    pub units: std::collections::BTreeMap<String, String>,
}

/// One input file and its checksum.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
pub struct InputFile {
    /// Path, as given.
    pub path: String,
    /// SHA-256 of its bytes, lower-case hexadecimal.
    pub sha256: String,
}
