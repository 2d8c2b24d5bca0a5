//! `oddwell blind STUDY --phrase-file F --out DIR`

use oddwell_study::Study;
use oddwell_study::blinding::blind;
use serde_json::json;

use crate::ending::{Failure, Status};
use crate::options::BlindArguments;
use crate::output::Output;

pub(super) fn run(arguments: &BlindArguments, output: &Output) -> Result<Status, Failure> {
    let study = Study::read(&arguments.study, &[])?;
    let blinded = blind(&study, &arguments.phrase_file, &arguments.out)?;
    let path = blinded.study.display().to_string();
    if output.json {
        output.json_result(
            &json!({ "study": path, "width": blinded.width, "expected_sd": blinded.expected }),
        )?;
    } else {
        output.result(&format!("{path}\n"))?;
    }
    output.notice(&format!(
        "BLINDED: every measured number is shifted by a secret departure, normal of width {} where the study expects to \
         measure it to {:.2}; analyse {path}, and keep the phrase",
        blinded.width, blinded.expected
    ));
    Ok(Status::Done)
}
