//! Run directories: complete or not there at all.

use crate::chain_parquet::write_parquet;
use crate::checkpoint::{self, Checkpoints, RunIdentity};
use crate::lock::Lock;
use crate::record::{Manifest, Summary};
use crate::run_error::RunError;
use oddwell_sampler::Chain;
use rayon::prelude::*;
use serde::Serialize;
use serde::de::DeserializeOwned;
use std::fs::{self, File};
use std::io::{self, BufWriter, Write};
use std::ops::Range;
use std::path::{Path, PathBuf};

/// What to do about a run directory, or an unfinished run, that is there already.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Existing {
    /// Refuse.
    Refuse,
    /// Start over; the old one is taken away once the new one is complete.
    Replace,
    /// Go on with what is unfinished, or start; take a finished one for the result.
    Resume,
}

/// A run directory to be. Until it is written, all that belongs to it stands in a hidden folder beside it,
/// `.NAME.unfinished`: the lock, checkpoints, and results as they are written. The folder vanishes with this value, unless
/// there is a checkpoint to go on from.
#[derive(Debug)]
pub struct RunDirectory {
    target: PathBuf,
    workshop: PathBuf,
    /// Folders above the target that were made for it, the innermost first.
    made: Vec<PathBuf>,
    existing: Existing,
    _lock: Lock,
}

impl RunDirectory {
    /// Makes the hidden folder and locks it, so that a run whose results can't be written ends before it begins.
    ///
    /// # Errors
    /// [`RunError::Locked`] where another process is at it; [`RunError::Exists`] where `target` exists and may not be replaced;
    /// [`RunError::Unfinished`] where a run was broken off and is neither to be gone on with nor to be given up;
    /// [`RunError::NotARun`] where `target` is no run directory; [`RunError::Unwritable`] where the folder can't be made.
    pub fn claim(target: &Path, existing: Existing) -> Result<RunDirectory, RunError> {
        let parent = match target.parent() {
            Some(parent) if !parent.as_os_str().is_empty() => parent.to_owned(),
            _ => PathBuf::from("."),
        };
        let name = target.file_name().unwrap_or_default().to_string_lossy();
        let workshop = parent.join(format!(".{name}.unfinished"));
        if target.symlink_metadata().is_ok() {
            if existing == Existing::Refuse {
                return Err(RunError::Exists { path: target.to_owned() });
            }
            if !is_run(target) {
                return Err(RunError::NotARun { path: target.to_owned() });
            }
        }
        let made: Vec<PathBuf> = parent
            .ancestors()
            .take_while(|folder| !folder.as_os_str().is_empty() && !folder.exists())
            .map(Path::to_owned)
            .collect();
        fs::create_dir_all(&parent).map_err(RunError::unwritable(target))?;
        let lock = loop {
            match fs::create_dir(&workshop) {
                Err(error) if error.kind() != io::ErrorKind::AlreadyExists => {
                    return Err(RunError::unwritable(target)(error));
                }
                _ => {}
            }
            match Lock::take(&workshop.join("lock"), target) {
                // Another process that has just ended took the folder away.
                Err(RunError::Unwritable { .. }) if !workshop.exists() => continue,
                taken => break taken?,
            }
        };
        let claimed = RunDirectory { target: target.to_owned(), workshop, made, existing, _lock: lock };
        claimed.put_back()?;
        if claimed.has_state() {
            match existing {
                Existing::Refuse => return Err(RunError::Unfinished { path: target.to_owned() }),
                Existing::Replace => claimed.forget_state(),
                Existing::Resume => {}
            }
        }
        let _ = fs::remove_dir_all(claimed.staging());
        fs::create_dir(claimed.staging()).map_err(RunError::unwritable(target))?;
        Ok(claimed)
    }

    fn staging(&self) -> PathBuf {
        self.workshop.join("results")
    }

    fn replaced(&self) -> PathBuf {
        self.workshop.join("replaced")
    }

    /// Whether an earlier process left a state to go on from.
    #[must_use]
    pub fn has_state(&self) -> bool {
        checkpoint::is_kept(&self.workshop)
    }

    /// Whether the run is there, finished.
    #[must_use]
    pub fn is_finished(&self) -> bool {
        self.target.is_dir() && !self.has_state()
    }

    /// The run's checkpoints.
    #[must_use]
    pub fn checkpoints(&self, identity: RunIdentity) -> Checkpoints {
        Checkpoints::new(&self.workshop, &self.target, identity)
    }

    fn forget_state(&self) {
        for file in ["checkpoint", "checkpoint-before", "checkpoint-new"] {
            let _ = fs::remove_file(self.workshop.join(file));
        }
    }

    /// Puts a directory back that a killed process was about to replace.
    fn put_back(&self) -> Result<(), RunError> {
        if !self.replaced().is_dir() {
            return Ok(());
        }
        if self.target.symlink_metadata().is_ok() {
            let _ = fs::remove_dir_all(self.replaced());
            return Ok(());
        }
        fs::rename(self.replaced(), &self.target).map_err(RunError::unwritable(&self.target))
    }

    /// Writes `chain.csv`, `chain.parquet`, `summary.json` and `manifest.json`, then puts the directory in its place. `derived` holds the
    /// names of derived quantities and for each a number for every draw. Checkpoints are kept if `interrupted`.
    ///
    /// # Errors
    /// [`RunError::Unwritable`]; then no half of it stays behind, a directory that was to be replaced stands as it was, and so
    /// do checkpoints.
    pub fn write(
        &self,
        names: &[String],
        chain: &Chain,
        derived: (&[String], &[Vec<f64>]),
        summary: &Summary,
        manifest: &Manifest,
        interrupted: bool,
    ) -> Result<(), RunError> {
        let unwritable = || RunError::unwritable(&self.target);
        let staging = self.staging();
        write_file(&staging.join("chain.csv"), |out| write_chain(out, names, chain, derived))
            .map_err(unwritable())?;
        write_file(&staging.join("chain.parquet"), |out| {
            write_parquet(out, names, chain, derived, &manifest.units)
        })
        .map_err(unwritable())?;
        write_file(&staging.join("summary.json"), |out| write_json(out, summary)).map_err(unwritable())?;
        write_file(&staging.join("manifest.json"), |out| write_json(out, manifest)).map_err(unwritable())?;
        self.put_in_place().map_err(unwritable())?;
        if !interrupted {
            self.forget_state();
        }
        Ok(())
    }

    fn put_in_place(&self) -> io::Result<()> {
        let staging = self.staging();
        checkpoint::sync_folder(&staging);
        if self.target.symlink_metadata().is_ok() {
            if self.existing == Existing::Refuse {
                return fs::rename(&staging, &self.target);
            }
            fs::rename(&self.target, self.replaced())?;
        }
        if let Err(error) = fs::rename(&staging, &self.target) {
            let _ = fs::rename(self.replaced(), &self.target);
            return Err(error);
        }
        if let Some(parent) = self.target.parent().filter(|parent| !parent.as_os_str().is_empty()) {
            checkpoint::sync_folder(parent);
        }
        if self.replaced().exists() { fs::remove_dir_all(self.replaced()) } else { Ok(()) }
    }
}

impl Drop for RunDirectory {
    fn drop(&mut self) {
        // Gone already after a success; nothing half-written stays behind after a failure.
        let _ = fs::remove_dir_all(self.staging());
        if !self.has_state() {
            // The lock in it ends with the process, or with this value.
            let _ = fs::remove_dir_all(&self.workshop);
        }
        // Folders made for a run that did not come about; those that hold one stay, since they are not empty.
        for folder in &self.made {
            let _ = fs::remove_dir(folder);
        }
    }
}

/// Whether `--replace` may take it away: an empty folder, or one that this program has written.
pub(crate) fn is_run(path: &Path) -> bool {
    let empty = fs::read_dir(path).is_ok_and(|mut entries| entries.next().is_none());
    let has = |file: &str| path.join(file).is_file();
    empty || (has("manifest.json") && (has("summary.json") || has("weigh.json")))
}

/// Reads a run's `summary.json`.
///
/// # Errors
/// [`RunError::UnreadableRun`].
pub fn read_summary(directory: &Path) -> Result<Summary, RunError> {
    read_json(directory, "summary.json")
}

/// Reads a run's `manifest.json`.
///
/// # Errors
/// [`RunError::UnreadableRun`].
pub fn read_manifest(directory: &Path) -> Result<Manifest, RunError> {
    read_json(directory, "manifest.json")
}

fn read_json<T: DeserializeOwned>(directory: &Path, file: &str) -> Result<T, RunError> {
    let path = directory.join(file);
    let unreadable = |reason: String| RunError::UnreadableRun { path: path.clone(), reason };
    let text = fs::read_to_string(&path).map_err(|error| unreadable(error.to_string()))?;
    serde_json::from_str(&text).map_err(|error| unreadable(error.to_string()))
}

fn write_file(path: &Path, write: impl FnOnce(&mut BufWriter<File>) -> io::Result<()>) -> io::Result<()> {
    let mut out = BufWriter::with_capacity(1 << 16, File::create_new(path)?);
    write(&mut out)?;
    out.flush()?;
    out.get_ref().sync_all()
}

fn write_json(out: &mut impl Write, value: &impl Serialize) -> io::Result<()> {
    serde_json::to_writer_pretty(&mut *out, value)?;
    out.write_all(b"\n")
}

/// One line a draw: ensemble, walker, step, log prior, log likelihood, then the parameters in the study's order, then
/// derived quantities. Numbers are the shortest that read back as the same 64-bit value; what is not finite is left empty.
fn write_chain(
    out: &mut impl Write,
    names: &[String],
    chain: &Chain,
    (derived, columns): (&[String], &[Vec<f64>]),
) -> io::Result<()> {
    out.write_all(b"ensemble,walker,step,log_prior,log_likelihood")?;
    for name in names.iter().chain(derived) {
        write!(out, ",{name}")?;
    }
    out.write_all(b"\n")?;
    // Blocks of lines are formatted side by side, as many as there are threads at a time, and written in their order.
    let blocks: Vec<usize> = (0..chain.len()).step_by(BLOCK).collect();
    for group in blocks.chunks(rayon::current_num_threads().max(1)) {
        let lines = |first: &usize| lines(chain, columns, *first..(first + BLOCK).min(chain.len()));
        let formatted: Vec<Vec<u8>> = group.par_iter().map(lines).collect();
        formatted.iter().try_for_each(|lines| out.write_all(lines))?;
    }
    Ok(())
}

/// Lines of the chain that are formatted by one thread at a time: about a megabyte.
const BLOCK: usize = 2048;

/// The lines of some rows.
fn lines(chain: &Chain, columns: &[Vec<f64>], rows: Range<usize>) -> Vec<u8> {
    let mut out = Vec::with_capacity(rows.len() * 20 * (chain.dimension + columns.len() + 4));
    let mut number = ryu::Buffer::new();
    let mut put = |out: &mut Vec<u8>, value: f64| {
        out.push(b',');
        out.extend_from_slice(number.format(value).as_bytes());
    };
    for row in rows {
        let Some(draw) = chain.draw(row) else { continue };
        let place = [draw.ensemble as u64, draw.walker as u64, draw.step];
        for (at, value) in place.into_iter().enumerate() {
            if at > 0 {
                out.push(b',');
            }
            digits(value, &mut out);
        }
        for &value in [draw.log_prior, draw.log_likelihood].iter().chain(draw.point) {
            put(&mut out, value);
        }
        for column in columns {
            match column[row].is_finite() {
                true => put(&mut out, column[row]),
                false => out.push(b','),
            }
        }
        out.push(b'\n');
    }
    out
}

/// A whole number in decimal digits.
fn digits(mut value: u64, out: &mut Vec<u8>) {
    let start = out.len();
    loop {
        out.push(b'0' + (value % 10) as u8);
        value /= 10;
        if value == 0 {
            break;
        }
    }
    out[start..].reverse();
}
