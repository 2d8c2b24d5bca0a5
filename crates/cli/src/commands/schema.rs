//! `oddwell schema [TOPIC]`

use oddwell_study::schema::schemas;
use serde_json::Value;

use crate::ending::{Failure, Status};
use crate::options::SchemaArguments;
use crate::output::Output;

pub(super) fn run(arguments: &SchemaArguments, output: &Output) -> Result<Status, Failure> {
    let Some(name) = &arguments.topic else {
        let names: Vec<Value> = schemas().iter().map(|topic| topic.name.into()).collect();
        if output.json {
            output.json_result(&Value::Array(names))?;
        } else {
            let lines = schemas().iter().map(|topic| format!("  {:<10} of {}\n", topic.name, topic.file));
            output.result(&format!("There are schemas:\n{}", lines.collect::<String>()))?;
        }
        return Ok(Status::Done);
    };
    let Some(topic) = schemas().iter().find(|topic| topic.name == name) else {
        let known: Vec<&str> = schemas().iter().map(|topic| topic.name).collect();
        return Err(Failure::command_line(format!(
            "there is no schema `{name}`; there are {}",
            known.join(", ")
        )));
    };
    output.json_result(&topic.schema())?;
    Ok(Status::Done)
}
