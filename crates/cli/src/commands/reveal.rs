//! `oddwell reveal DIR --phrase-file F --out DIR`

use oddwell_study::blinding::reveal;
use serde_json::json;

use crate::ending::{Failure, Status};
use crate::options::BlindArguments;
use crate::output::Output;

pub(super) fn run(arguments: &BlindArguments, output: &Output) -> Result<Status, Failure> {
    let revealed = reveal(&arguments.study, &arguments.phrase_file, &arguments.out)?;
    let (path, log) = (revealed.study.display().to_string(), revealed.log.display().to_string());
    if output.json {
        output.json_result(&json!({ "study": path, "secret_departure": revealed.secret, "log": log }))?;
    } else {
        output.result(&format!("{path}\nthe secret departure was {:.4}\n", revealed.secret))?;
    }
    output.notice(&format!("what was planned, and when it was revealed, stands in {log}"));
    Ok(Status::Done)
}
