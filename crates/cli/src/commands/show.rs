//! `oddwell show STUDY`

use oddwell_report::{show_json, show_table};

use super::read_study;
use crate::ending::{Failure, Status};
use crate::options::StudyArguments;
use crate::output::Output;

pub(super) fn run(arguments: &StudyArguments, output: &Output) -> Result<Status, Failure> {
    let study = read_study(arguments)?;
    let hypothesis = study.hypothesis(arguments.hypothesis.as_deref())?;
    if output.json {
        output.json_result(&show_json(&study, hypothesis))?;
    } else {
        output.result(&show_table(&study, hypothesis, output.style))?;
    }
    Ok(Status::Done)
}
