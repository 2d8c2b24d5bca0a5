//! What can be wrong with a study, and how it is said: file, line and column, key, rule, value, way out.

use std::fmt;
use std::path::PathBuf;

use thiserror::Error;

use crate::fault::Fault;

/// Why a study cannot be used.
#[derive(Debug, Error)]
#[non_exhaustive]
pub enum StudyError {
    /// The study file cannot be read at all.
    #[error("{}: the study file cannot be read: {reason}; give the path of a study file (`oddwell new DIR` writes one)", path.display())]
    Unreadable {
        /// The path as given.
        path: PathBuf,
        /// What the system says.
        reason: String,
    },
    /// The study file, or a `--set`, breaks one rule or several.
    #[error("{}", lines(.0))]
    Problems(Vec<Problem>),
    /// The folder for a new study has something in it.
    #[error("{}: exists already and is not an empty folder; a new study needs a folder of its own", path.display())]
    NotEmpty {
        /// The folder.
        path: PathBuf,
    },
    /// A new study cannot be written.
    #[error("{}: a new study cannot be written there: {reason}; choose a folder that you may write to", path.display())]
    Unwritable {
        /// The folder.
        path: PathBuf,
        /// What the system says.
        reason: String,
    },
    /// The model has a quantity that the study does not name, or the other way round: a fault of the program.
    #[error(
        "`{name}` is a quantity of the {has} but not of the {lacks}; this is a fault of oddwell, please report it"
    )]
    Mismatch {
        /// The quantity's dotted name.
        name: String,
        /// Who has it.
        has: &'static str,
        /// Who lacks it.
        lacks: &'static str,
    },
}

impl StudyError {
    /// The problems of the study file, in its order; empty where the file could not be read.
    pub fn problems(&self) -> &[Problem] {
        match self {
            Self::Problems(problems) => problems,
            _ => &[],
        }
    }

    /// Fails with these problems, in the order of the file and each said once; succeeds with `value` if there are none.
    pub(crate) fn unless_none<T>(mut problems: Vec<Problem>, value: Option<T>) -> Result<T, Self> {
        problems.sort_by_key(|problem| match problem.location {
            Location::File { line, column, .. } => (line, column),
            _ => (0, 0),
        });
        let (mut said, mut texts): (Vec<Problem>, Vec<String>) = Default::default();
        for problem in problems {
            // The same in the user's eyes, even if found in two hypotheses with different names to choose from.
            let text = problem.to_string();
            if !texts.contains(&text) {
                texts.push(text);
                said.push(problem);
            }
        }
        match value {
            Some(value) if said.is_empty() => Ok(value),
            _ => Err(Self::Problems(said)),
        }
    }
}

fn lines(problems: &[Problem]) -> String {
    problems.iter().map(Problem::to_string).collect::<Vec<_>>().join("\n")
}

/// One broken rule and where it is broken.
#[derive(Clone, Debug, PartialEq, Error)]
#[error("{location}: {fault}")]
pub struct Problem {
    /// Where.
    pub location: Location,
    /// What.
    pub fault: Fault,
}

/// Where a problem lies.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Location {
    /// At a place of the study file.
    File {
        /// The file's path as the user gave it.
        file: String,
        /// Line, from 1.
        line: usize,
        /// Column in characters, from 1.
        column: usize,
    },
    /// In the study file as a whole.
    WholeFile {
        /// The file's path as the user gave it.
        file: String,
    },
    /// In an option of the command line.
    Option {
        /// The option as typed, such as `--set background.h=0.7`.
        option: String,
    },
}

impl fmt::Display for Location {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::File { file, line, column } => write!(out, "{file}:{line}:{column}"),
            Self::WholeFile { file } => write!(out, "{file}"),
            Self::Option { option } => write!(out, "{option}"),
        }
    }
}
