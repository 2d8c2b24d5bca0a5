//! `oddwell simulate STUDY --out DIR`

use oddwell_study::{Draw, Truth, simulate_study};
use serde_json::{Map, Value, json};

use super::{choice, read_study};
use crate::ending::{Failure, Status};
use crate::options::SimulateArguments;
use crate::output::Output;

pub(super) fn run(arguments: &SimulateArguments, output: &Output) -> Result<Status, Failure> {
    let study = read_study(&arguments.study)?;
    let hypothesis = study.hypothesis(arguments.study.hypothesis.as_deref())?;
    if arguments.study.hypothesis.is_none() {
        output.notice(&choice("drawing from", &study, hypothesis));
    }
    let truth = if arguments.from_prior { Truth::Prior } else { Truth::Centre };
    let draw = Draw { truth, seed: arguments.seed, mocks: usize::from(arguments.mocks.unwrap_or(0)) };
    let drawn = simulate_study(&study, hypothesis, draw, &arguments.out)?;
    let path = drawn.study.display().to_string();
    if output.json {
        let truth: Map<String, Value> =
            drawn.truth.iter().map(|(name, value)| (name.clone(), json!(value))).collect();
        output.json_result(&json!({ "study": path, "hypothesis": hypothesis.name, "truth": truth }))?;
    } else {
        output.result(&format!("{path}\n"))?;
    }
    output.notice("the measurements are synthetic; the truth is in truth.csv beside them");
    Ok(Status::Done)
}
