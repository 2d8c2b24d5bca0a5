//! `oddwell predict STUDY`

use oddwell_report::{prediction_csv, prediction_json};
use oddwell_study::blinding::WITHHELD;
use oddwell_study::{predict, predict_by_effect};

use super::{choice, read_study};
use crate::ending::{Failure, Status};
use crate::options::PredictArguments;
use crate::output::Output;

pub(super) fn run(arguments: &PredictArguments, output: &Output) -> Result<Status, Failure> {
    let PredictArguments { study: arguments, by_effect } = arguments;
    let study = read_study(arguments)?;
    let hypothesis = study.hypothesis(arguments.hypothesis.as_deref())?;
    if arguments.hypothesis.is_none() {
        output.notice(&choice("predicting", &study, hypothesis));
    }
    if study.file.blinding.is_some() {
        output.notice(&format!("BLINDED: no measured values here; {WITHHELD}"));
    }
    let (rows, effects) = if *by_effect {
        predict_by_effect(&study, hypothesis)?
    } else {
        (predict(&study, hypothesis)?, Vec::new())
    };
    if output.json {
        output.json_result(&prediction_json(&rows, &effects))?;
    } else {
        output.result(&prediction_csv(&rows, &effects))?;
    }
    Ok(Status::Done)
}
