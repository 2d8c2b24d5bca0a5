//! `oddwell simulate`: a complete study comes out, which fits, and whose truth is what was asked for.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use std::path::Path;
use std::process::{Command, Output};

fn oddwell(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_oddwell")).args(arguments).current_dir(folder).output().unwrap()
}

fn succeed(folder: &Path, arguments: &[&str]) -> String {
    let run = oddwell(folder, arguments);
    assert!(run.status.success(), "{arguments:?}: {}", String::from_utf8_lossy(&run.stderr));
    String::from_utf8(run.stdout).unwrap()
}

/// (measured, predicted, error) by row.
fn prediction(folder: &Path, study: &str, extra: &[&str]) -> Vec<[f64; 3]> {
    let mut arguments = vec!["predict", study, "--hypothesis", "constant"];
    arguments.extend(extra);
    let csv = succeed(folder, &arguments);
    let header: Vec<&str> = csv.lines().next().unwrap().split(',').collect();
    let column = |name: &str| header.iter().position(|field| *field == name).unwrap();
    let columns = [column("measured"), column("predicted"), column("error")];
    csv.lines()
        .skip(1)
        .map(|line| {
            let fields: Vec<&str> = line.split(',').collect();
            columns.map(|column| fields[column].parse().unwrap())
        })
        .collect()
}

#[test]
fn a_drawn_study_is_complete_and_scatters_about_its_truth() {
    let folder = tempfile::tempdir().unwrap();
    let folder = folder.path();
    succeed(folder, &["new", "first"]);
    let set = ["--set", "departure.tau=8", "--set", "windmere.near.offset=30"];
    let mut arguments = vec!["simulate", "first/study.toml", "--out", "drawn", "--seed", "5"];
    arguments.extend(set);
    succeed(folder, &arguments);
    let text = std::fs::read_to_string(folder.join("drawn/study.toml")).unwrap();
    assert!(text.starts_with("# SYNTHETIC MEASUREMENTS"), "{text}");
    // χ² of 60 numbers about the truth: mean 60, sd 11; about the study's own centre it is far larger.
    let rows = prediction(folder, "drawn/study.toml", &set);
    assert_eq!(rows.len(), 60);
    let distance = |rows: &[[f64; 3]]| -> f64 {
        rows.iter().map(|[measured, predicted, error]| ((measured - predicted) / error).powi(2)).sum()
    };
    // Rows are correlated within a bin, which widens this naive sum; five of its nominal standard deviations.
    assert!((distance(&rows) - 60.0).abs() < 55.0, "{}", distance(&rows));
    assert!(distance(&prediction(folder, "drawn/study.toml", &[])) > 5.0 * distance(&rows));
    succeed(folder, &["fit", "drawn/study.toml", "--quiet", "--out", "run"]);

    // The same seed gives the same bytes, another seed others, and a folder is never overwritten.
    arguments[3] = "again";
    succeed(folder, &arguments);
    let table = |name: &str| std::fs::read(folder.join(name).join("windmere-multipoles.csv")).unwrap();
    assert_eq!(table("drawn"), table("again"));
    arguments[5] = "6";
    let refused = oddwell(folder, &arguments);
    assert_eq!(refused.status.code(), Some(1));
    let said = String::from_utf8(refused.stderr).unwrap();
    assert!(
        said.contains("error: again: exists already; give a folder that does not, with `--out`"),
        "{said}"
    );
    arguments[3] = "other";
    succeed(folder, &arguments);
    assert_ne!(table("drawn"), table("other"));
}

#[test]
fn a_truth_from_the_priors_is_recorded() {
    let folder = tempfile::tempdir().unwrap();
    let folder = folder.path();
    succeed(folder, &["new", "first"]);
    succeed(folder, &["simulate", "first/study.toml", "--out", "drawn", "--from-prior", "--seed", "3"]);
    let truth = std::fs::read_to_string(folder.join("drawn/truth.csv")).unwrap();
    let tau = truth.lines().find_map(|line| line.strip_prefix("departure.tau,")).unwrap();
    let tau: f64 = tau.parse().unwrap();
    assert!(tau != 0.0 && tau.abs() <= 30.0, "{tau}");
}
