//! `oddwell new DIR`

use oddwell_study::write_new_study;
use serde_json::json;

use crate::ending::{Failure, Status};
use crate::options::NewArguments;
use crate::output::Output;

pub(super) fn run(arguments: &NewArguments, output: &Output) -> Result<Status, Failure> {
    let written = write_new_study(&arguments.directory)?;
    let paths: Vec<String> = written.iter().map(|path| path.display().to_string()).collect();
    if output.json {
        output.json_result(&json!({ "written": paths }))?;
    } else {
        output.result(&(paths.join("\n") + "\n"))?;
    }
    if let Some(study) = paths.first() {
        output.notice(&format!(
            "the data are invented; next: `oddwell show {study}`, then `oddwell fit {study}`"
        ));
    }
    Ok(Status::Done)
}
