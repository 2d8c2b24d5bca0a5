//! `oddwell weigh STUDY`

use oddwell_report::weigh_text;
use oddwell_study::{RunError, Study, WeighOptions, WeighWatch, Weighed, default_weigh_directory, weigh};

use super::fit::set_threads;
use super::read_study;
use crate::ending::{Failure, Status};
use crate::interrupt::Interrupt;
use crate::options::WeighArguments;
use crate::output::Output;
use crate::weigh_progress::WeighProgress;

pub(super) fn run(arguments: &WeighArguments, output: &Output) -> Result<Status, Failure> {
    let study = read_study(&arguments.study)?;
    let threads = set_threads(arguments.threads)?;
    let options = WeighOptions {
        out: arguments.out.clone().unwrap_or_else(|| default_weigh_directory(&study)),
        replace: arguments.replace,
        resume: arguments.resume,
        seed: arguments.seed,
        command: std::env::args_os().map(|word| word.to_string_lossy().into_owned()).collect(),
        threads,
    };
    let weighed = watched(&study, &options, output)?;
    if output.json {
        output.json_result(&serde_json::to_value(&weighed.record).map_err(Failure::input)?)?;
    } else if !output.quiet {
        let text = weigh_text(&weighed.record, output.style);
        output.result(&format!("{text}\nwritten to {}\n", weighed.directory.display()))?;
    }
    if weighed.record.agree {
        return Ok(Status::Done);
    }
    let names: Vec<String> = weighed
        .record
        .hypotheses
        .iter()
        .filter(|hypothesis| !hypothesis.agree)
        .map(|hypothesis| format!("`{}`", hypothesis.name))
        .collect();
    output.not_converged(&format!(
        "the estimators do not agree on {}: quote no odds that hang on it; results are in {}",
        names.join(", "),
        weighed.directory.display()
    ));
    Ok(Status::NotConverged)
}

/// Weighs on another thread, while this one shows progress and listens for the end.
fn watched(study: &Study, options: &WeighOptions, output: &Output) -> Result<Weighed, Failure> {
    let watch = WeighWatch::new(study);
    let interrupt = Interrupt::listen(*output);
    let weighed: Result<Weighed, RunError> = std::thread::scope(|scope| {
        let work = scope.spawn(|| weigh(study, options, &watch));
        let mut progress = WeighProgress::new(output.shows_progress(), &watch);
        while !work.is_finished() {
            std::thread::sleep(std::time::Duration::from_millis(40));
            progress.show(&watch);
            if interrupt.came() {
                watch.stop();
            }
        }
        drop(progress);
        work.join().unwrap_or_else(|panic| std::panic::resume_unwind(panic))
    });
    weighed.map_err(|error| {
        if error.is_stopped_weighing() {
            let text = "stopped; what is finished is kept: `--resume` goes on with it".to_owned();
            return Failure::Said { status: Status::Interrupted, text };
        }
        error.into()
    })
}
