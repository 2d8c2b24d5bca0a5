//! What the README shows is what the program does.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_report::{Style, closing_summary};
use oddwell_study::{Control, Existing, FitOptions, Study, StudyFile, fit};
use std::path::{Path, PathBuf};

const BEGIN: &str = "<!-- demo output: begin -->";
const END: &str = "<!-- demo output: end -->";

fn top() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("..")
}

fn readme() -> String {
    std::fs::read_to_string(top().join("README.md")).unwrap()
}

fn closing_summary_of_the_demo() -> String {
    let study = Study::read(top().join("data-demo/study.toml"), &[]).unwrap();
    let folder = tempfile::tempdir().unwrap();
    let options = FitOptions {
        out: folder.path().join("run"),
        existing: Existing::Refuse,
        seed: None,
        maximum_evaluations: None,
        command: Vec::new(),
        threads: 2,
    };
    let fitted =
        fit(&study, study.hypothesis(None).unwrap(), &options, &mut |_, _| Control::Continue).unwrap();
    closing_summary(&fitted.summary, Style::default())
}

/// Lines as they stand in a block of Markdown, without the one that says how long it took.
fn comparable(text: &str) -> Vec<&str> {
    let lines = text.lines().map(|line| line.strip_prefix("    ").unwrap_or(line).trim_end());
    lines.filter(|line| !line.is_empty() && !line.contains("evaluations in")).collect()
}

/// The demo's closing summary stands in the README, as the program prints it. `ODDWELL_UPDATE_README=1` puts it there.
#[test]
fn the_walk_through_is_the_programs_own_output() {
    let readme = readme();
    let (before, rest) = readme.split_once(BEGIN).unwrap();
    let (shown, after) = rest.split_once(END).unwrap();
    let printed = closing_summary_of_the_demo();
    let block: String = printed
        .lines()
        .map(|line| if line.is_empty() { "\n".to_owned() } else { format!("    {line}\n") })
        .collect();
    if std::env::var_os("ODDWELL_UPDATE_README").is_some() {
        let updated = format!("{before}{BEGIN}\n\n{block}\n{END}{after}");
        std::fs::write(top().join("README.md"), updated).unwrap();
        return;
    }
    assert_eq!(
        comparable(shown),
        comparable(&block),
        "run with ODDWELL_UPDATE_README=1 and read what changed"
    );
}

/// The study file that the README explains is one.
#[test]
fn the_study_file_of_the_readme_resolves() {
    let readme = readme();
    let (_, rest) = readme.split_once("```toml\n").unwrap();
    let (text, _) = rest.split_once("```").unwrap();
    let study = Study::resolve(StudyFile::parse("README.md", text, ".").unwrap(), &[]).unwrap();
    assert_eq!(study.hypotheses.len(), 2);
    assert_eq!(study.hypothesis(None).unwrap().name, "constant");
}

/// Every shape of departure is in the README's table, with the answers to who may feel it.
#[test]
fn the_table_of_departures_is_the_registry() {
    let readme = readme();
    for shape in oddwell_model::departures::registry() {
        let row = readme
            .lines()
            .find(|line| line.starts_with('|') && line.contains(&format!("`{}`", shape.name())));
        let row = row.unwrap_or_else(|| panic!("{} is missing", shape.name()));
        if !shape.parameters().is_empty() {
            for felt_by in oddwell_model::FeltBy::ALL {
                let said = row.rsplit('|').nth(1).unwrap().contains(felt_by.name());
                assert_eq!(said, shape.allowed().contains(&felt_by), "{} {felt_by}", shape.name());
            }
        }
    }
}

/// The two commands stand in the README as `.ci/run` runs them.
#[test]
fn the_two_commands_are_those_of_ci() {
    let ci = std::fs::read_to_string(top().join(".ci/run")).unwrap();
    for command in ["cargo run --release -- fit data-demo/study.toml", "cargo test --release --workspace"] {
        assert!(readme().contains(&format!("    {command}\n")), "{command}");
        assert!(ci.lines().any(|line| line.starts_with(command)), "{command}");
    }
}
