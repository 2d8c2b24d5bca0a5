//! `oddwell report RUN…`

use std::path::{Path, PathBuf};

use oddwell_report::{Page, PageInput, page};
use oddwell_study::review::{Review, Weighing, read_weighing, review};
use oddwell_study::{RunError, make_folder, may_write, write_file};
use serde_json::json;

use crate::ending::{Failure, Status};
use crate::options::ReportArguments;
use crate::output::Output;

pub(super) fn run(arguments: &ReportArguments, output: &Output) -> Result<Status, Failure> {
    let ReportArguments { runs, out, figures, replace } = arguments;
    let first = runs.first().ok_or_else(|| Failure::command_line("name at least one run directory"))?;
    let file = out.clone().unwrap_or_else(|| first.join("report.html"));
    let bibliography = file.with_extension("bib");
    for path in [&file, &bibliography] {
        may_write(path, *replace)?;
    }
    let (reviews, weighed) = read(runs)?;
    let command: Vec<String> = std::env::args().collect();
    let made = page(&PageInput {
        runs: &reviews,
        weighed: &weighed,
        command: &command.join(" "),
        version: concat!("oddwell ", env!("CARGO_PKG_VERSION")),
    });
    write_file(&file, made.html.as_bytes(), *replace)?;
    write_file(&bibliography, made.bibliography.as_bytes(), *replace)?;
    let mut written = vec![file, bibliography];
    if let Some(folder) = figures {
        written.extend(write_figures(&made, folder, *replace)?);
    }
    for run in reviews.iter().filter(|run| !run.summary.converged) {
        output
            .not_converged(&format!("`{}` did not converge; the page says so first", run.summary.hypothesis));
    }
    for run in &reviews {
        if let Err(error) = &run.beside_data {
            output.notice(&format!(
                "{}: the page lacks what needs the measurements: {error}",
                run.directory.display()
            ));
        }
    }
    if output.json {
        let paths: Vec<String> = written.iter().map(|path| path.display().to_string()).collect();
        output.json_result(&json!({ "written": paths }))?;
    } else if !output.quiet {
        let more = written.len() - 2;
        let figures = figures.as_ref().filter(|_| more > 0);
        let figures =
            figures.map_or_else(String::new, |folder| format!(", {more} figures to {}", folder.display()));
        output.result(&format!(
            "written to {}, its BibTeX to {}{figures}\n",
            written[0].display(),
            written[1].display()
        ))?;
    }
    Ok(Status::Done)
}

/// Runs of `fit`, and of `weigh` with the posteriors in them; a posterior that is named twice is read once.
fn read(directories: &[PathBuf]) -> Result<(Vec<Review>, Vec<Weighing>), RunError> {
    let (mut runs, mut weighed) = (Vec::new(), Vec::new());
    for directory in directories {
        match read_weighing(directory)? {
            None => runs.push(directory.clone()),
            Some(found) => {
                runs.extend(found.runs());
                weighed.push(found);
            }
        }
    }
    let mut reviews: Vec<Review> = Vec::new();
    for run in runs {
        let found = review(&run)?;
        let same = |known: &Review| {
            (&known.summary.hypothesis, &known.manifest.study_text, known.summary.best.data_points)
                == (&found.summary.hypothesis, &found.manifest.study_text, found.summary.best.data_points)
        };
        if !reviews.iter().any(same) {
            reviews.push(found);
        }
    }
    Ok((reviews, weighed))
}

/// Each figure as SVG and as PDF.
fn write_figures(made: &Page, folder: &Path, replace: bool) -> Result<Vec<PathBuf>, Failure> {
    make_folder(folder)?;
    let mut written = Vec::new();
    for figure in &made.figures {
        for (ending, bytes) in [("svg", figure.svg().into_bytes()), ("pdf", figure.pdf())] {
            let path = folder.join(format!("{}.{ending}", figure.name));
            write_file(&path, &bytes, replace)?;
            written.push(path);
        }
    }
    Ok(written)
}
