//! `oddwell completions SHELL`, and the pages that `oddwell manual --pages DIR` writes: both from the options themselves.

use std::path::{Path, PathBuf};

use clap::{Command, CommandFactory};
use clap_mangen::Man;
use oddwell_study::{RunError, make_folder, may_write, write_file};
use serde_json::json;

use crate::ending::{Failure, Status};
use crate::options::{CompletionsArguments, Options};
use crate::output::Output;

pub(super) fn run(arguments: &CompletionsArguments, output: &Output) -> Result<Status, Failure> {
    let mut command = Options::command();
    let mut script = Vec::new();
    clap_complete::generate(arguments.shell, &mut command, "oddwell", &mut script);
    let text = String::from_utf8_lossy(&script);
    if output.json {
        output.json_result(&json!({ "script": text }))?;
    } else {
        output.result(&text)?;
    }
    Ok(Status::Done)
}

/// Writes a page for the program and one for each of its commands, as `man` reads them.
pub(super) fn write_pages(folder: &Path, output: &Output) -> Result<Status, Failure> {
    let mut command = Options::command();
    command.build();
    let mut pages = vec![("oddwell.1".to_owned(), rendered(command.clone())?)];
    for own in command.get_subcommands().filter(|own| own.get_name() != "help") {
        let name = format!("oddwell-{}", own.get_name());
        let page = own.clone().display_name(name.clone()).bin_name(format!("oddwell {}", own.get_name()));
        pages.push((format!("{name}.1"), rendered(page)?));
    }
    make_folder(folder)?;
    let paths: Vec<PathBuf> = pages.iter().map(|(name, _)| folder.join(name)).collect();
    paths.iter().try_for_each(|path| may_write(path, false))?;
    for (path, (_, page)) in paths.iter().zip(&pages) {
        write_file(path, page, false).map_err(|error: RunError| Failure::from(error))?;
    }
    if output.json {
        let written: Vec<String> = paths.iter().map(|path| path.display().to_string()).collect();
        output.json_result(&json!({ "written": written }))?;
    } else {
        output.result(&format!("{} pages written to {}\n", pages.len(), folder.display()))?;
    }
    Ok(Status::Done)
}

fn rendered(command: Command) -> Result<Vec<u8>, Failure> {
    let mut page = Vec::new();
    Man::new(command).render(&mut page)?;
    Ok(page)
}
