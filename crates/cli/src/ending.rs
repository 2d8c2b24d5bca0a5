//! How a command ends: the exit status, and what is said of a failure.

use std::io;
use std::process::ExitCode;

use oddwell_study::{RunError, StudyError};

/// The exit status, a contract with scripts.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Status {
    /// 0: done.
    Done,
    /// 1: the input is wrong (or, said so in as many words, the program is).
    InputWrong,
    /// 2: the command line is wrong, whatever the study says.
    CommandLineWrong,
    /// 3: done, but not converged; results are written and marked so.
    NotConverged,
    /// 130: ended by Ctrl-C or SIGTERM; 128 + 2, as shells have it.
    Interrupted,
}

impl Status {
    /// The number that the shell sees.
    pub(crate) fn code(self) -> u8 {
        match self {
            Self::Done => 0,
            Self::InputWrong => 1,
            Self::CommandLineWrong => 2,
            Self::NotConverged => 3,
            Self::Interrupted => 130,
        }
    }
}

impl From<Status> for ExitCode {
    fn from(status: Status) -> Self {
        Self::from(status.code())
    }
}

/// Why a command could not do what it was asked for.
#[derive(Debug)]
pub(crate) enum Failure {
    /// What the user reads, one problem a line.
    Said {
        /// The exit status.
        status: Status,
        /// The text.
        text: String,
    },
    /// Standard output cannot be written.
    Output(io::Error),
}

impl Failure {
    /// The command line is wrong.
    pub(crate) fn command_line(text: impl ToString) -> Self {
        Self::Said { status: Status::CommandLineWrong, text: text.to_string() }
    }

    /// The input is wrong.
    pub(crate) fn input(text: impl ToString) -> Self {
        Self::Said { status: Status::InputWrong, text: text.to_string() }
    }
}

impl From<StudyError> for Failure {
    fn from(error: StudyError) -> Self {
        Self::input(error)
    }
}

impl From<RunError> for Failure {
    fn from(error: RunError) -> Self {
        if error.is_interruption() {
            return Self::Said { status: Status::Interrupted, text: error.to_string() };
        }
        Self::input(error)
    }
}

impl From<io::Error> for Failure {
    fn from(error: io::Error) -> Self {
        Self::Output(error)
    }
}
