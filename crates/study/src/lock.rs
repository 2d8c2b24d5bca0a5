//! A file that only one process holds at a time.

use crate::run_error::RunError;
use std::fs::{self, File, OpenOptions, TryLockError};
use std::io::{Read, Seek, Write};
use std::path::{Path, PathBuf};

/// A lock on a run directory, held until this value goes.
///
/// The operating system holds it for the process, so that it ends with the process however that ends: the lock of a dead
/// process is none. The file says whose it is, for messages. Where the file system knows no locks, the number of a process
/// that is not alive any more stands for a lock that is free.
#[derive(Debug)]
pub struct Lock {
    path: PathBuf,
    file: File,
}

impl Lock {
    /// Takes the lock, or says who has it.
    ///
    /// # Errors
    /// [`RunError::Locked`] while another process has it; [`RunError::Unwritable`] where the file can't be made.
    pub fn take(path: &Path, run: &Path) -> Result<Lock, RunError> {
        loop {
            let file = OpenOptions::new().read(true).write(true).create(true).truncate(false).open(path);
            let mut file = file.map_err(RunError::unwritable(run))?;
            let mut holder = String::new();
            let _ = file.read_to_string(&mut holder);
            match file.try_lock() {
                Ok(()) => {}
                Err(TryLockError::WouldBlock) => return Err(locked(run, &holder)),
                // No locks here: the number of the process has to do.
                Err(TryLockError::Error(_)) if is_alive(&holder) => return Err(locked(run, &holder)),
                Err(TryLockError::Error(_)) => {}
            }
            // The process that had it may have removed the file since it was opened.
            if !is_still_there(&file, path) {
                continue;
            }
            let written = file
                .set_len(0)
                .and_then(|()| file.rewind())
                .and_then(|()| write!(file, "{}", std::process::id()));
            written.map_err(RunError::unwritable(run))?;
            return Ok(Lock { path: path.to_owned(), file });
        }
    }
}

impl Drop for Lock {
    fn drop(&mut self) {
        // While it is still held; and not the file of whoever came after this one's was taken away.
        if is_still_there(&self.file, &self.path) {
            let _ = fs::remove_file(&self.path);
        }
    }
}

fn locked(run: &Path, holder: &str) -> RunError {
    let holder = holder.trim();
    let holder = if holder.is_empty() { "another process".to_owned() } else { format!("process {holder}") };
    RunError::Locked { path: run.to_owned(), holder }
}

/// Whether a process of this number is alive, where that can be told; if not, it is taken to be.
fn is_alive(holder: &str) -> bool {
    let processes = Path::new("/proc");
    let Ok(number) = holder.trim().parse::<u32>() else { return false };
    !processes.join("self").exists() || processes.join(number.to_string()).exists()
}

#[cfg(unix)]
fn is_still_there(file: &File, path: &Path) -> bool {
    use std::os::unix::fs::MetadataExt;
    let identity = |metadata: fs::Metadata| (metadata.dev(), metadata.ino());
    file.metadata().ok().map(identity).is_some_and(|held| fs::metadata(path).ok().map(identity) == Some(held))
}

#[cfg(not(unix))]
fn is_still_there(_file: &File, path: &Path) -> bool {
    path.exists()
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a test stops at the first surprise")]

    use super::*;

    #[test]
    fn a_lock_is_had_once_at_a_time_and_names_its_holder() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("lock");
        let run = Path::new("runs/first");
        let held = Lock::take(&path, run).unwrap();
        let refused = Lock::take(&path, run).unwrap_err().to_string();
        let holder = format!("process {}", std::process::id());
        assert!(refused.starts_with("runs/first: ") && refused.contains(&holder), "{refused}");
        drop(held);
        assert!(!path.exists());
        Lock::take(&path, run).unwrap();
    }

    #[test]
    fn what_a_dead_process_left_is_no_lock() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("lock");
        fs::write(&path, "4294967295").unwrap();
        let lock = Lock::take(&path, Path::new("runs/first")).unwrap();
        assert_eq!(fs::read_to_string(&path).unwrap(), std::process::id().to_string());
        drop(lock);
        assert!(!is_alive("4294967295") && is_alive(&std::process::id().to_string()));
    }
}
