//! Where words go: results to standard output, everything else to standard error.

use std::io::{self, IsTerminal, Write};

use oddwell_report::Style;
use serde_json::{Value, json};

use crate::ending::{Failure, Status};
use crate::options::{Colour, Global};

/// The two streams, as the global options want them.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Output {
    /// How results are dressed.
    pub(crate) style: Style,
    /// How notices and errors are dressed.
    pub(crate) error_style: Style,
    /// Whether only results and errors are wanted.
    pub(crate) quiet: bool,
    /// Whether results are for a program.
    pub(crate) json: bool,
}

impl Output {
    /// The streams of this process.
    pub(crate) fn new(global: &Global) -> Self {
        let style = |terminal: bool| match global.color {
            Colour::Always => Style::Coloured,
            Colour::Auto if terminal && !colour_refused() => Style::Coloured,
            Colour::Auto | Colour::Never => Style::Plain,
        };
        Self {
            style: style(io::stdout().is_terminal()),
            error_style: style(io::stderr().is_terminal()),
            quiet: global.quiet,
            json: global.json,
        }
    }

    /// Whether progress is shown: to a person who watches.
    pub(crate) fn shows_progress(&self) -> bool {
        !self.quiet && !self.json && io::stderr().is_terminal()
    }

    /// Writes a result.
    pub(crate) fn result(&self, text: &str) -> io::Result<()> {
        write_out(text)
    }

    /// Writes a result for a program.
    pub(crate) fn json_result(&self, value: &Value) -> io::Result<()> {
        self.result(&format!("{value:#}\n"))
    }

    /// Says something beside the result.
    pub(crate) fn notice(&self, text: &str) {
        if !self.quiet {
            say(text);
        }
    }

    /// Says that a fit did not converge; also when only errors are wanted.
    pub(crate) fn not_converged(&self, text: &str) {
        say(&format!("{} {text}", self.error_style.caution("warning:")));
    }

    /// Says what failed, a line a problem; with `--json` also as an object on standard output. Returns the status.
    pub(crate) fn failure(&self, failure: &Failure) -> Status {
        let (status, text) = match failure {
            // Whoever read the output has read enough, as `head` does.
            Failure::Output(error) if error.kind() == io::ErrorKind::BrokenPipe => return Status::Done,
            Failure::Output(error) => {
                say(&self.labelled(&format!("standard output cannot be written: {error}")));
                return Status::InputWrong;
            }
            Failure::Said { status, text } => (*status, text),
        };
        for line in text.lines() {
            say(&self.labelled(line));
        }
        if self.json {
            // Nobody is left to be told if this fails as well.
            let _ = Self::json_error(text);
        }
        status
    }

    /// Writes an error for a program.
    pub(crate) fn json_error(text: &str) -> io::Result<()> {
        write_out(&format!("{:#}\n", json!({ "error": text })))
    }

    fn labelled(&self, line: &str) -> String {
        format!("{} {line}", self.error_style.fault("error:"))
    }
}

/// <https://no-color.org>, and terminals that say that they cannot.
fn colour_refused() -> bool {
    let set = |name: &str| std::env::var_os(name).filter(|value| !value.is_empty());
    set("NO_COLOR").is_some() || set("TERM").is_some_and(|value| value == "dumb")
}

fn write_out(text: &str) -> io::Result<()> {
    let mut out = io::stdout().lock();
    out.write_all(text.as_bytes())?;
    out.flush()
}

/// A line on standard error; if that is gone, nobody is there to be told.
pub(crate) fn say(text: &str) {
    let _ = writeln!(io::stderr().lock(), "{text}");
}
