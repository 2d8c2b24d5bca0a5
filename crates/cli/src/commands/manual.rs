//! `oddwell manual [TOPIC]`

use oddwell_report::{manual_check, manual_text, manual_topics};
use oddwell_study::check::{KINDS, thresholds};
use oddwell_study::{manual_page, manual_pages};
use serde_json::{Value, json};

use crate::ending::{Failure, Status};
use crate::options::ManualArguments;
use crate::output::Output;

pub(super) fn run(arguments: &ManualArguments, output: &Output) -> Result<Status, Failure> {
    if let Some(folder) = &arguments.pages {
        return super::completions::write_pages(folder, output);
    }
    let Some(topic) = &arguments.topic else {
        if output.json {
            output.json_result(&serde_json::to_value(manual_pages()).map_err(Failure::input)?)?;
        } else {
            output.result(&manual_topics(output.style))?;
        }
        return Ok(Status::Done);
    };
    if topic == "check" {
        if output.json {
            let kinds: Vec<Value> =
                KINDS.iter().map(|kind| json!({ "code": kind.code, "meaning": kind.meaning })).collect();
            output.json_result(&json!({ "name": "check", "text": thresholds(), "warnings": kinds }))?;
        } else {
            output.result(&manual_check(output.style))?;
        }
        return Ok(Status::Done);
    }
    let page = manual_page(topic)
        .map_err(|nearest| Failure::command_line(format!("the manual has no topic `{topic}`; {nearest}")))?;
    if output.json {
        output.json_result(&serde_json::to_value(&page).map_err(Failure::input)?)?;
    } else {
        output.result(&manual_text(&page, output.style))?;
    }
    Ok(Status::Done)
}
