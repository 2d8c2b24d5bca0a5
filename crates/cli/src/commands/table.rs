//! `oddwell table RUN…`

use oddwell_report::{TableFormat, run_table};
use oddwell_study::record::Summary;
use oddwell_study::{RunError, read_summary};
use serde_json::Value;

use crate::ending::{Failure, Status};
use crate::options::{TableArguments, TableStyle};
use crate::output::Output;

pub(super) fn run(arguments: &TableArguments, output: &Output) -> Result<Status, Failure> {
    let summaries: Vec<Summary> =
        arguments.runs.iter().map(|run| read_summary(run)).collect::<Result<_, RunError>>()?;
    for summary in summaries.iter().filter(|summary| !summary.converged) {
        output.not_converged(&format!("`{}` did not converge; the table marks it", summary.hypothesis));
    }
    if output.json {
        let values: Result<Vec<Value>, _> = summaries.iter().map(serde_json::to_value).collect();
        output.json_result(&Value::Array(values.map_err(Failure::input)?))?;
        return Ok(Status::Done);
    }
    let format = match arguments.format {
        TableStyle::Latex => TableFormat::Latex,
        TableStyle::Markdown => TableFormat::Markdown,
        TableStyle::Csv => TableFormat::Csv,
    };
    output.result(&run_table(&summaries, format))?;
    Ok(Status::Done)
}
