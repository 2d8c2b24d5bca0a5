//! Checkpoints of a run: written whole or not at all, recognised if damaged, refused if they belong to another run.

use crate::record::InputFile;
use crate::run_error::RunError;
use serde::de::DeserializeOwned;
use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};
use std::fs::{self, File};
use std::io::{self, Write};
use std::path::{Path, PathBuf};
use std::time::{Duration, Instant};

/// Begins every checkpoint.
const MAGIC: &[u8; 16] = b"oddwell state 1\n";

/// Length of the checksum that ends it.
const CHECKSUM: usize = 32;

/// Share of the time that writing checkpoints may take: one is due once this many times the duration of the last has passed.
const PATIENCE: u32 = 60;

/// Time between two checkpoints at least.
const LEAST: Duration = Duration::from_millis(100);

/// What a state belongs to. A state is gone on from only where all of it is the same.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct RunIdentity {
    /// The program's name and version.
    pub version: String,
    /// What was run: the command, and what of its options matters to the result.
    pub task: String,
    /// Every input, the study file first.
    pub inputs: Vec<InputFile>,
    /// `--set` options, as given.
    pub overrides: Vec<String>,
    /// The seed.
    pub seed: u64,
}

impl RunIdentity {
    /// The first difference from what is asked for now, in words; none where there is none. Paths may differ (another
    /// current folder), contents may not.
    #[must_use]
    pub fn difference(&self, now: &RunIdentity) -> Option<String> {
        if self.version != now.version {
            return Some(format!("it was begun by {}, and this is {}", self.version, now.version));
        }
        if self.inputs.len() != now.inputs.len() {
            return Some("the study names other files now".to_owned());
        }
        let changed = self.inputs.iter().zip(&now.inputs).find(|(then, now)| then.sha256 != now.sha256);
        if let Some((_, file)) = changed {
            return Some(format!("{} has changed since", file.path));
        }
        let differs = |what: &str, then: &dyn ToString, now: &dyn ToString| {
            format!("it was begun with {what} {}, and this is {what} {}", then.to_string(), now.to_string())
        };
        if self.task != now.task {
            return Some(differs("", &self.task, &now.task).replace("  ", " "));
        }
        if self.overrides != now.overrides {
            return Some("the `--set` options are others now".to_owned());
        }
        (self.seed != now.seed).then(|| differs("seed", &self.seed, &now.seed))
    }
}

/// The checkpoints of one run: the last, and the one before.
#[derive(Debug)]
pub struct Checkpoints {
    folder: PathBuf,
    run: PathBuf,
    identity: RunIdentity,
    next: Instant,
    failure: Option<String>,
}

/// A state that was found.
#[derive(Debug)]
pub struct Kept<S> {
    /// The state.
    pub state: S,
    /// What was wrong with the last checkpoint, where the one before it had to do.
    pub damage: Option<String>,
}

impl Checkpoints {
    /// Of the run that is to stand at `run`, in a folder that is there.
    pub(crate) fn new(folder: &Path, run: &Path, identity: RunIdentity) -> Checkpoints {
        let (folder, run) = (folder.to_owned(), run.to_owned());
        Checkpoints { folder, run, identity, next: Instant::now() + LEAST, failure: None }
    }

    fn last(&self) -> PathBuf {
        last(&self.folder)
    }

    fn before(&self) -> PathBuf {
        self.folder.join("checkpoint-before")
    }

    /// Whether the time has come: a tenth of a second, or sixty times what the last one took, after that.
    #[must_use]
    pub fn is_due(&self) -> bool {
        Instant::now() >= self.next
    }

    /// Keeps a state if the time has come, or at any rate if `now`. A failure (a disk that is full, a folder that can't be
    /// written any more) is remembered, and the checkpoints that are there stay: the run goes on, and tries again later.
    pub fn keep<S: Serialize>(&mut self, state: &S, now: bool) {
        if !now && !self.is_due() {
            return;
        }
        let began = Instant::now();
        self.failure = self.write(state).err().map(|error| error.to_string());
        self.next = Instant::now() + LEAST.max(began.elapsed() * PATIENCE);
    }

    /// Why the last state could not be kept, if it could not.
    #[must_use]
    pub fn failure(&self) -> Option<&str> {
        self.failure.as_deref()
    }

    /// Writes a state beside the last checkpoint, in full and to the disk, and only then puts it in its place.
    fn write<S: Serialize>(&self, state: &S) -> io::Result<()> {
        let mut bytes = MAGIC.to_vec();
        bytes = postcard::to_extend(&self.identity, bytes).map_err(io::Error::other)?;
        bytes = postcard::to_extend(state, bytes).map_err(io::Error::other)?;
        let checksum = Sha256::digest(&bytes);
        bytes.extend_from_slice(&checksum);
        let new = self.folder.join("checkpoint-new");
        let written = File::create(&new).and_then(|mut file| {
            file.write_all(&bytes)?;
            file.sync_all()
        });
        if let Err(error) = written {
            let _ = fs::remove_file(&new);
            return Err(error);
        }
        if self.last().exists() {
            fs::rename(self.last(), self.before())?;
        }
        fs::rename(&new, self.last())?;
        sync_folder(&self.folder);
        Ok(())
    }

    /// The last state that was kept, or the one before where that is damaged; none where none was kept.
    ///
    /// # Errors
    /// [`RunError::ForeignState`] where it belongs to another study, other data, another version, other options;
    /// [`RunError::DamagedState`] where checkpoints are there and none is whole.
    pub fn load<S: DeserializeOwned>(&self) -> Result<Option<Kept<S>>, RunError> {
        let mut damage = None;
        for path in [self.last(), self.before()] {
            let bytes = match fs::read(&path) {
                Ok(bytes) => bytes,
                Err(error) if error.kind() == io::ErrorKind::NotFound => continue,
                Err(error) => {
                    damage.get_or_insert(format!("{}: {error}", path.display()));
                    continue;
                }
            };
            match read::<S>(&bytes) {
                Ok((identity, state)) => {
                    if let Some(difference) = identity.difference(&self.identity) {
                        return Err(RunError::ForeignState { path: self.run.clone(), difference });
                    }
                    let state = state.map_err(|reason| RunError::DamagedState {
                        path: self.run.clone(),
                        reason: format!("{}: {reason}", path.display()),
                    })?;
                    return Ok(Some(Kept { state, damage }));
                }
                Err(reason) => {
                    damage.get_or_insert(format!("{}: {reason}", path.display()));
                }
            }
        }
        match damage {
            Some(reason) => Err(RunError::DamagedState { path: self.run.clone(), reason }),
            None => Ok(None),
        }
    }
}

fn last(folder: &Path) -> PathBuf {
    folder.join("checkpoint")
}

/// Whether a state was kept in a folder.
pub(crate) fn is_kept(folder: &Path) -> bool {
    last(folder).exists() || folder.join("checkpoint-before").exists()
}

/// Makes renames within a folder last, where the system can.
pub(crate) fn sync_folder(folder: &Path) {
    let _ = File::open(folder).and_then(|folder| folder.sync_all());
}

/// Takes a checkpoint apart: what it belongs to, and its state, which another build of the same version might not read.
fn read<S: DeserializeOwned>(bytes: &[u8]) -> Result<(RunIdentity, Result<S, String>), String> {
    let content = bytes.len().checked_sub(CHECKSUM).filter(|length| *length >= MAGIC.len());
    let Some((content, checksum)) = content.map(|length| bytes.split_at(length)) else {
        return Err(format!("cut off after {} bytes", bytes.len()));
    };
    if Sha256::digest(content).as_slice() != checksum {
        return Err("its checksum is not that of its contents".to_owned());
    }
    let body = content.strip_prefix(MAGIC).ok_or("not a checkpoint of this program")?;
    let (identity, rest) =
        postcard::take_from_bytes::<RunIdentity>(body).map_err(|error| error.to_string())?;
    let state = postcard::from_bytes(rest).map_err(|error| error.to_string());
    Ok((identity, state))
}

#[cfg(test)]
mod tests;
