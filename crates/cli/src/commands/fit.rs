//! `oddwell fit STUDY`

use std::path::PathBuf;

use oddwell_report::closing_summary;
use oddwell_study::review::STABILITY_FILE;
use oddwell_study::{
    Control, Existing, FitOptions, Fitted, Hypothesis, Restriction, Resumed, RunError, Step, Study,
    default_directory, fit, stability, write_file,
};
use serde_json::Value;

use super::{choice, read_study};
use crate::ending::{Failure, Status};
use crate::interrupt::Interrupt;
use crate::options::{ALL, FitArguments};
use crate::output::Output;
use crate::progress::ProgressLine;

pub(super) fn run(arguments: &FitArguments, output: &Output) -> Result<Status, Failure> {
    let restriction = Restriction { only: arguments.only.clone(), without: arguments.without.clone() };
    let whole = read_study(&arguments.study)?;
    let study = if restriction.is_none() { whole } else { whole.restricted(&restriction)? };
    let threads = set_threads(arguments.threads)?;
    let asked = arguments.study.hypothesis.as_deref();
    let plan = plan(&study, arguments, output)?;
    if asked.is_none() {
        for (hypothesis, _) in &plan {
            output.notice(&choice("fitting", &study, hypothesis));
        }
    }
    // Better now than after the first of them has run.
    let existing = match (arguments.replace, arguments.resume) {
        (true, _) => Existing::Replace,
        (_, true) => Existing::Resume,
        _ => Existing::Refuse,
    };
    let taken = plan.iter().find(|(_, out)| existing == Existing::Refuse && out.symlink_metadata().is_ok());
    if let Some((_, path)) = taken {
        return Err(RunError::Exists { path: path.clone() }.into());
    }
    let planned = plan.len();
    let interrupt = Interrupt::listen(*output);
    let mut finished: Vec<Fitted> = Vec::new();
    for (hypothesis, out) in plan {
        if asked == Some(ALL) {
            output.notice(&format!("fitting `{}`", hypothesis.name));
        }
        let options = FitOptions {
            out,
            existing,
            seed: arguments.seed,
            maximum_evaluations: arguments.maximum_evaluations,
            command: std::env::args_os().map(|word| word.to_string_lossy().into_owned()).collect(),
            threads,
        };
        let fitted = watched_fit(&study, hypothesis, &options, output, &interrupt)?;
        if existing == Existing::Resume {
            output.notice(&went_on(&fitted));
        }
        if !output.json && !output.quiet {
            say_result(&fitted, output, finished.is_empty())?;
        }
        if arguments.stability && !interrupt.came() {
            stabilise(&study, hypothesis, &fitted, output, &interrupt)?;
        }
        let stop = fitted.interrupted || interrupt.came();
        finished.push(fitted);
        if stop {
            break;
        }
    }
    if output.json {
        output.json_result(&as_json(&finished, asked == Some(ALL))?)?;
    }
    Ok(status(&finished, output, finished.len() < planned))
}

/// Which hypotheses go where, in turn.
fn plan<'a>(
    study: &'a Study,
    arguments: &FitArguments,
    output: &Output,
) -> Result<Vec<(&'a Hypothesis, PathBuf)>, Failure> {
    if arguments.study.hypothesis.as_deref() != Some(ALL) {
        let hypothesis = study.hypothesis(arguments.study.hypothesis.as_deref())?;
        let out = arguments.out.clone().unwrap_or_else(|| default_directory(study, hypothesis));
        return Ok(vec![(hypothesis, out)]);
    }
    let mut plan = Vec::new();
    for hypothesis in &study.hypotheses {
        if hypothesis.free.is_empty() {
            output.notice(&format!("skipping `{}`: it has nothing to infer", hypothesis.name));
            continue;
        }
        let out = match &arguments.out {
            Some(folder) => folder.join(&hypothesis.name),
            None => default_directory(study, hypothesis),
        };
        plan.push((hypothesis, out));
    }
    if plan.is_empty() {
        let hypothesis = ALL.to_owned();
        return Err(RunError::NothingInferred { hypothesis }.into());
    }
    Ok(plan)
}

/// Sizes the pool in which chains run side by side, and says how many threads there are.
pub(super) fn set_threads(threads: Option<u16>) -> Result<usize, Failure> {
    if let Some(threads) = threads {
        rayon::ThreadPoolBuilder::new()
            .num_threads(usize::from(threads))
            .build_global()
            .map_err(|error| Failure::command_line(format!("--threads {threads}: {error}; give fewer")))?;
    }
    Ok(rayon::current_num_threads())
}

fn watched_fit(
    study: &Study,
    hypothesis: &Hypothesis,
    options: &FitOptions,
    output: &Output,
    interrupt: &Interrupt,
) -> Result<Fitted, Failure> {
    let watched: Vec<&str> =
        hypothesis.watched().into_iter().map(|index| hypothesis.free[index].name.as_str()).collect();
    let mut line = ProgressLine::new(output.shows_progress(), &watched);
    Ok(fit(study, hypothesis, options, &mut |progress, names| {
        line.show(progress, names);
        if interrupt.came() { Control::Stop } else { Control::Continue }
    })?)
}

/// Fits again with other cuts and assumptions, and writes what became of the departure into the run directory.
fn stabilise(
    study: &Study,
    hypothesis: &Hypothesis,
    fitted: &Fitted,
    output: &Output,
    interrupt: &Interrupt,
) -> Result<(), Failure> {
    if fitted.summary.departure_parameters.len() != 1 {
        let name = &hypothesis.name;
        output.notice(&format!("no stability runs of `{name}`: they follow one departure parameter"));
        return Ok(());
    }
    let shown = output.shows_progress();
    let found = stability(study, hypothesis, &fitted.summary, fitted.manifest.seed, &mut |step| {
        if let Step::Begun { index, count, text } = step
            && shown
        {
            output.notice(&format!("{} of {count}: {text}", index + 1));
        }
        if interrupt.came() { Control::Stop } else { Control::Continue }
    });
    let found = match found {
        Err(error) if error.is_interruption() => {
            output.notice("interrupted: the run is written, its stability is not");
            return Ok(());
        }
        found => found?,
    };
    let text = serde_json::to_string_pretty(&found).map_err(Failure::input)?;
    let path = fitted.directory.join(STABILITY_FILE);
    write_file(&path, format!("{text}\n").as_bytes(), true)?;
    if !output.json && !output.quiet {
        output.result(&format!("written to {}\n", path.display()))?;
    }
    Ok(())
}

/// What a run that was to be gone on with went on from.
fn went_on(fitted: &Fitted) -> String {
    let place = fitted.directory.display();
    match &fitted.resumed {
        Resumed::Begun => format!("{place}: there was nothing to go on with, so the run was begun"),
        Resumed::Continued { damage: None } => format!("{place}: went on from the last checkpoint"),
        Resumed::Continued { damage: Some(damage) } => {
            format!("{place}: went on from the checkpoint before the last, which is damaged ({damage})")
        }
        Resumed::Finished => format!("{place}: had been finished before"),
    }
}

fn say_result(fitted: &Fitted, output: &Output, first: bool) -> Result<(), Failure> {
    let gap = if first { "" } else { "\n\n" };
    let summary = closing_summary(&fitted.summary, output.style);
    Ok(output.result(&format!("{gap}{summary}\nwritten to {}\n", fitted.directory.display()))?)
}

/// The contents of `summary.json`; a list of them for all hypotheses.
fn as_json(finished: &[Fitted], list: bool) -> Result<Value, Failure> {
    let values: Result<Vec<Value>, _> =
        finished.iter().map(|fitted| serde_json::to_value(&fitted.summary)).collect();
    let mut values = values.map_err(Failure::input)?;
    Ok(match values.pop() {
        Some(only) if !list => only,
        last => {
            values.extend(last);
            Value::Array(values)
        }
    })
}

/// Says what did not converge, and returns the status.
fn status(finished: &[Fitted], output: &Output, cut_short: bool) -> Status {
    let mut status = Status::Done;
    for fitted in finished.iter().filter(|fitted| !fitted.summary.converged) {
        status = Status::NotConverged;
        let place = fitted.directory.display();
        let kept = if fitted.interrupted { ", and `--resume` goes on with it" } else { "" };
        let reason = fitted
            .summary
            .warnings
            .iter()
            .find(|warning| warning.code == "not-converged")
            .map_or("not converged", |warning| &warning.text);
        output.not_converged(&format!(
            "`{}`: {reason}; results so far are in {place}{kept}",
            fitted.summary.hypothesis
        ));
    }
    if cut_short || finished.iter().any(|fitted| fitted.interrupted) { Status::Interrupted } else { status }
}
