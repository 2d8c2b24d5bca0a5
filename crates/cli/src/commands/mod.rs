//! One file a command.

mod blind;
mod check;
mod completions;
mod fit;
mod manual;
mod new;
mod predict;
mod report;
mod reveal;
mod schema;
mod show;
mod simulate;
mod table;
mod weigh;

use oddwell_study::{Hypothesis, Override, Study};

use crate::ending::{Failure, Status};
use crate::options::{Command, Options, StudyArguments};
use crate::output::Output;

/// Does what the options ask for.
pub(crate) fn run(options: &Options) -> Status {
    let output = Output::new(&options.global);
    let done = match &options.command {
        Command::New(arguments) => new::run(arguments, &output),
        Command::Show(arguments) => show::run(arguments, &output),
        Command::Predict(arguments) => predict::run(arguments, &output),
        Command::Fit(arguments) => fit::run(arguments, &output),
        Command::Weigh(arguments) => weigh::run(arguments, &output),
        Command::Check(arguments) => check::run(arguments, &output),
        Command::Report(arguments) => report::run(arguments, &output),
        Command::Table(arguments) => table::run(arguments, &output),
        Command::Schema(arguments) => schema::run(arguments, &output),
        Command::Completions(arguments) => completions::run(arguments, &output),
        Command::Manual(arguments) => manual::run(arguments, &output),
        Command::Blind(arguments) => blind::run(arguments, &output),
        Command::Reveal(arguments) => reveal::run(arguments, &output),
        Command::Simulate(arguments) => simulate::run(arguments, &output),
    };
    done.unwrap_or_else(|failure| output.failure(&failure))
}

/// The study with `--set` in place.
fn read_study(arguments: &StudyArguments) -> Result<Study, Failure> {
    let overrides: Result<Vec<Override>, _> =
        arguments.set.iter().map(|text| Override::parse(text)).collect();
    // What cannot be a quantity is wrong whatever the study says.
    let overrides = overrides.map_err(Failure::command_line)?;
    Ok(Study::read(&arguments.study, &overrides)?)
}

/// ``fitting `constant` (felt by light); also in the study: `gr` ``
fn choice(doing: &str, study: &Study, hypothesis: &Hypothesis) -> String {
    let others: Vec<String> = study
        .hypotheses
        .iter()
        .filter(|other| other.name != hypothesis.name)
        .map(|other| format!("`{}`", other.name))
        .collect();
    let others =
        if others.is_empty() { String::new() } else { format!("; also in the study: {}", others.join(", ")) };
    format!("{doing} `{}` ({}){others}", hypothesis.name, felt(hypothesis))
}

fn felt(hypothesis: &Hypothesis) -> String {
    if hypothesis.shape.name() == "none" {
        "no departure".to_owned()
    } else {
        format!("felt by {}", hypothesis.felt_by.name())
    }
}
