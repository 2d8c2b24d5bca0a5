//! The program `oddwell`: options and glue. What it computes is computed in the other crates.

mod bug;
mod commands;
mod ending;
mod interrupt;
mod options;
mod output;
mod progress;
mod weigh_progress;

use std::process::ExitCode;

fn main() -> ExitCode {
    bug::guarded(|| match options::read(std::env::args_os()) {
        Ok(options) => commands::run(&options),
        Err(refused) => refused,
    })
    .into()
}
