//! What is finished of a weighing, on disk: a hidden folder beside the run directory, which becomes it in the end.

use super::WeighOptions;
use crate::assemble::Measurements;
use crate::record::{Manifest, WeighRecord};
use crate::resolve::Study;
use crate::run_directory::is_run;
use crate::run_error::RunError;
use serde::de::DeserializeOwned;
use serde::{Deserialize, Serialize};
use std::fs::{self, File};
use std::io::{BufWriter, Write};
use std::path::{Path, PathBuf};

/// The folder, and where it goes in the end.
#[derive(Debug)]
pub(crate) struct State {
    folder: PathBuf,
    target: PathBuf,
}

/// What results depend on: with another key, nothing that was kept can be used.
#[derive(Debug, PartialEq, Serialize, Deserialize)]
struct Key {
    version: String,
    seed: u64,
    overrides: Vec<String>,
    inputs: Vec<crate::record::InputFile>,
}

/// Names of the files that do not belong in a finished run directory begin with this.
const KEPT: &str = "kept-";

impl State {
    /// Opens the folder: what an interrupted run left if it is to be resumed and nothing has changed, else empty.
    ///
    /// # Errors
    /// [`RunError::Exists`], [`RunError::NotARun`], [`RunError::Unwritable`]; [`RunError::NotResumable`] where there is nothing
    /// to go on with, or study, data, seed or version differ.
    pub(crate) fn open(
        study: &Study,
        measurements: &Measurements,
        seed: u64,
        options: &WeighOptions,
    ) -> Result<State, RunError> {
        let target = options.out.clone();
        if target.symlink_metadata().is_ok() {
            if !options.replace {
                return Err(RunError::Exists { path: target });
            }
            if !is_run(&target) {
                return Err(RunError::NotARun { path: target });
            }
        }
        let parent = match target.parent() {
            Some(parent) if !parent.as_os_str().is_empty() => parent.to_owned(),
            _ => PathBuf::from("."),
        };
        let name = target.file_name().unwrap_or_default().to_string_lossy();
        let folder = parent.join(format!(".{name}.weighing"));
        let key = Key {
            version: env!("CARGO_PKG_VERSION").to_owned(),
            seed,
            overrides: study.overrides().iter().map(|each| each.option.clone()).collect(),
            inputs: measurements.inputs.clone(),
        };
        let state = State { folder, target };
        let found: Option<Key> = state.load("key");
        if options.resume {
            if found.as_ref() != Some(&key) {
                let reason = match found {
                    Some(_) => "the study, its data, the seed or the program have changed since",
                    None => "there is nothing to go on with",
                };
                return Err(RunError::NotResumable { path: state.target, reason });
            }
            return Ok(state);
        }
        let unwritable = || RunError::unwritable(&state.target);
        if state.folder.exists() {
            fs::remove_dir_all(&state.folder).map_err(unwritable())?;
        }
        fs::create_dir_all(&state.folder).map_err(unwritable())?;
        state.store("key", &key)?;
        Ok(state)
    }

    /// The folder of a hypothesis's posterior.
    pub(crate) fn run_of(&self, hypothesis: &str) -> PathBuf {
        self.folder.join(hypothesis)
    }

    /// What was kept under a name, else what `make` makes, which is then kept.
    pub(crate) fn piece<T: Serialize + DeserializeOwned>(
        &self,
        name: &str,
        make: impl FnOnce() -> Result<T, RunError>,
    ) -> Result<T, RunError> {
        if let Some(kept) = self.load(name) {
            return Ok(kept);
        }
        let made = make()?;
        self.store(name, &made)?;
        Ok(made)
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.join(format!("{KEPT}{name}.json"))
    }

    fn load<T: DeserializeOwned>(&self, name: &str) -> Option<T> {
        let text = fs::read_to_string(self.path(name)).ok()?;
        serde_json::from_str(&text).ok()
    }

    /// Complete or not there: written beside, then renamed.
    fn store(&self, name: &str, value: &impl Serialize) -> Result<(), RunError> {
        let path = self.path(name);
        let beside = path.with_extension("unfinished");
        write(&beside, value).map_err(RunError::unwritable(&self.target))?;
        fs::rename(&beside, &path).map_err(RunError::unwritable(&self.target))
    }

    /// Writes the results, takes away what only an unfinished run needs, and puts the folder in its place.
    pub(crate) fn finish(&self, record: &WeighRecord, manifest: &Manifest) -> Result<(), RunError> {
        let unwritable = || RunError::unwritable(&self.target);
        write(&self.folder.join("weigh.json"), record).map_err(unwritable())?;
        write(&self.folder.join("manifest.json"), manifest).map_err(unwritable())?;
        for entry in fs::read_dir(&self.folder).map_err(unwritable())?.flatten() {
            if entry.file_name().to_string_lossy().starts_with(KEPT) {
                fs::remove_file(entry.path()).map_err(unwritable())?;
            }
        }
        if self.target.symlink_metadata().is_ok() {
            let old = self.folder.with_extension("replaced");
            fs::rename(&self.target, &old).map_err(unwritable())?;
            fs::rename(&self.folder, &self.target).map_err(unwritable())?;
            return fs::remove_dir_all(&old).map_err(unwritable());
        }
        fs::rename(&self.folder, &self.target).map_err(unwritable())
    }
}

fn write(path: &Path, value: &impl Serialize) -> std::io::Result<()> {
    let mut out = BufWriter::new(File::create(path)?);
    serde_json::to_writer_pretty(&mut out, value)?;
    out.write_all(b"\n")?;
    out.flush()?;
    out.get_ref().sync_all()
}
