//! Run directories: complete or not there at all.

use crate::chain_parquet::write_parquet;
use crate::record::{Manifest, Summary};
use crate::run_error::RunError;
use oddwell_sampler::Chain;
use serde::Serialize;
use std::fs::{self, File};
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};

/// A run directory to be. Until it is written, its files stand in a hidden folder beside it, which vanishes with this
/// value.
#[derive(Debug)]
pub struct RunDirectory {
    target: PathBuf,
    staging: PathBuf,
    /// Folders above the target that were made for it, the innermost first.
    made: Vec<PathBuf>,
    replace: bool,
}

impl RunDirectory {
    /// Makes the hidden folder, so that a run whose results can't be written ends before it begins.
    ///
    /// # Errors
    /// [`RunError::Exists`] where `target` exists and may not be replaced; [`RunError::NotARun`] where it is no run directory; [`RunError::Unwritable`] where the folder
    /// can't be made.
    pub fn claim(target: &Path, replace: bool) -> Result<RunDirectory, RunError> {
        if target.symlink_metadata().is_ok() {
            if !replace {
                return Err(RunError::Exists { path: target.to_owned() });
            }
            if !is_run(target) {
                return Err(RunError::NotARun { path: target.to_owned() });
            }
        }
        let parent = match target.parent() {
            Some(parent) if !parent.as_os_str().is_empty() => parent.to_owned(),
            _ => PathBuf::from("."),
        };
        let made: Vec<PathBuf> = parent
            .ancestors()
            .take_while(|folder| !folder.as_os_str().is_empty() && !folder.exists())
            .map(Path::to_owned)
            .collect();
        fs::create_dir_all(&parent).map_err(RunError::unwritable(target))?;
        let name = target.file_name().unwrap_or_default().to_string_lossy();
        sweep(&parent, &format!(".{name}.unfinished-"));
        let staging = parent.join(format!(".{name}.unfinished-{}", std::process::id()));
        let claimed = RunDirectory { target: target.to_owned(), staging, made, replace };
        fs::create_dir(&claimed.staging).map_err(RunError::unwritable(target))?;
        Ok(claimed)
    }

    /// Writes `chain.csv`, `chain.parquet`, `summary.json` and `manifest.json`, then puts the directory in its place. `derived` holds the
    /// names of derived quantities and for each a number for every draw.
    ///
    /// # Errors
    /// [`RunError::Unwritable`]; then nothing stays behind, and a directory that was to be replaced stands as it was.
    pub fn write(
        &self,
        names: &[String],
        chain: &Chain,
        derived: (&[String], &[Vec<f64>]),
        summary: &Summary,
        manifest: &Manifest,
    ) -> Result<(), RunError> {
        let unwritable = || RunError::unwritable(&self.target);
        write_file(&self.staging.join("chain.csv"), |out| write_chain(out, names, chain, derived))
            .map_err(unwritable())?;
        write_file(&self.staging.join("chain.parquet"), |out| {
            write_parquet(out, names, chain, derived, &manifest.units)
        })
        .map_err(unwritable())?;
        write_file(&self.staging.join("summary.json"), |out| write_json(out, summary))
            .map_err(unwritable())?;
        write_file(&self.staging.join("manifest.json"), |out| write_json(out, manifest))
            .map_err(unwritable())?;
        self.put_in_place().map_err(unwritable())
    }

    fn put_in_place(&self) -> io::Result<()> {
        if !(self.replace && self.target.symlink_metadata().is_ok()) {
            return fs::rename(&self.staging, &self.target);
        }
        let old = self.staging.with_extension("replaced");
        fs::rename(&self.target, &old)?;
        if let Err(error) = fs::rename(&self.staging, &self.target) {
            fs::rename(&old, &self.target)?;
            return Err(error);
        }
        if old.is_dir() { fs::remove_dir_all(&old) } else { fs::remove_file(&old) }
    }
}

impl Drop for RunDirectory {
    fn drop(&mut self) {
        // Gone already after a success; nothing half-written stays behind after a failure.
        let _ = fs::remove_dir_all(&self.staging);
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

/// Removes what a run that was killed left behind: hidden folders whose process is gone (where that can be told).
fn sweep(parent: &Path, prefix: &str) {
    let processes = Path::new("/proc");
    let Ok(entries) = fs::read_dir(parent) else { return };
    for entry in entries.flatten() {
        let name = entry.file_name();
        let process = name.to_str().and_then(|name| name.strip_prefix(prefix)?.parse::<u32>().ok());
        let gone = |id: u32| processes.join("self").exists() && !processes.join(id.to_string()).exists();
        if process.is_some_and(gone) {
            let _ = fs::remove_dir_all(entry.path());
        }
    }
}

/// Reads a run's `summary.json`.
///
/// # Errors
/// [`RunError::UnreadableRun`].
pub fn read_summary(directory: &Path) -> Result<Summary, RunError> {
    let path = directory.join("summary.json");
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
    let mut number = ryu::Buffer::new();
    for (row, draw) in chain.draws().enumerate() {
        write!(out, "{},{},{}", draw.ensemble, draw.walker, draw.step)?;
        for &value in [draw.log_prior, draw.log_likelihood].iter().chain(draw.point) {
            out.write_all(b",")?;
            out.write_all(number.format(value).as_bytes())?;
        }
        for column in columns {
            out.write_all(b",")?;
            if column[row].is_finite() {
                out.write_all(number.format(column[row]).as_bytes())?;
            }
        }
        out.write_all(b"\n")?;
    }
    Ok(())
}
