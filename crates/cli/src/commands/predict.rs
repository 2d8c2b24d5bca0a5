//! `oddwell predict STUDY`

use oddwell_report::{prediction_csv, prediction_json};
use oddwell_study::blinding::WITHHELD;
use oddwell_study::predict;

use super::{choice, read_study};
use crate::ending::{Failure, Status};
use crate::options::StudyArguments;
use crate::output::Output;

pub(super) fn run(arguments: &StudyArguments, output: &Output) -> Result<Status, Failure> {
    let study = read_study(arguments)?;
    let hypothesis = study.hypothesis(arguments.hypothesis.as_deref())?;
    if arguments.hypothesis.is_none() {
        output.notice(&choice("predicting", &study, hypothesis));
    }
    if study.file.blinding.is_some() {
        output.notice(&format!("BLINDED: no measured values here; {WITHHELD}"));
    }
    let rows = predict(&study, hypothesis)?;
    if output.json {
        output.json_result(&prediction_json(&rows))?;
    } else {
        output.result(&prediction_csv(&rows))?;
    }
    Ok(Status::Done)
}
