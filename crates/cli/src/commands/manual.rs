//! `oddwell manual [TOPIC]`

use oddwell_report::{
    Style, manual_check, manual_data, manual_estimator, manual_text, manual_topics, manual_weigh,
};
use oddwell_study::check::{KINDS, thresholds};
use oddwell_study::{data_pages, manual_page, manual_pages};
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
    if let Some(page) = weighing(topic, output.style) {
        if output.json {
            let text = weighing(topic, Style::Plain);
            output.json_result(&json!({ "name": topic, "text": text }))?;
        } else {
            output.result(&page)?;
        }
        return Ok(Status::Done);
    }
    if let Some(page) = data_pages().iter().find(|page| page.name == topic) {
        if output.json {
            output.json_result(&serde_json::to_value(page).map_err(Failure::input)?)?;
        } else {
            output.result(&manual_data(page, output.style))?;
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

/// The page of `weigh`, or of an estimator.
fn weighing(topic: &str, style: Style) -> Option<String> {
    if topic == "weigh" { Some(manual_weigh(style)) } else { manual_estimator(topic, style) }
}
