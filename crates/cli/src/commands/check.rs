//! `oddwell check STUDY`

use oddwell_report::check_text;
use oddwell_study::RunError;
use oddwell_study::check::{CheckReport, check};
use serde_json::json;

use super::read_study;
use crate::ending::{Failure, Status};
use crate::options::StudyArguments;
use crate::output::Output;

pub(super) fn run(arguments: &StudyArguments, output: &Output) -> Result<Status, Failure> {
    let report = match report(arguments) {
        Ok(report) => report,
        Err(Failure::Said { status: Status::InputWrong, text }) => CheckReport::of_errors(&text),
        Err(other) => return Err(other),
    };
    if output.json {
        output.json_result(&json!(report))?;
    } else {
        output.result(&check_text(&report, output.style))?;
    }
    Ok(if report.errors.is_empty() { Status::Done } else { Status::InputWrong })
}

fn report(arguments: &StudyArguments) -> Result<CheckReport, Failure> {
    let study = read_study(arguments)?;
    let hypothesis = study.hypothesis(arguments.hypothesis.as_deref())?;
    check(&study, hypothesis).map_err(|error: RunError| error.into())
}
