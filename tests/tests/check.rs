//! `check` finds faults that are planted in the demo, one at a time, and is silent about the demo itself.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_study::Study;
use oddwell_study::check::{CheckReport, check};
use std::path::{Path, PathBuf};

fn demo() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../data-demo")
}

/// A copy of the demo's files, each passed through `change` (name, text).
fn checked(change: &dyn Fn(&str, String) -> String) -> CheckReport {
    let folder = tempfile::tempdir().unwrap();
    for name in [
        "study.toml",
        "larkfield-multipoles.csv",
        "larkfield-covariance.csv",
        "northmoor-multipoles.csv",
        "northmoor-covariance.csv",
    ] {
        let text = std::fs::read_to_string(demo().join(name)).unwrap();
        std::fs::write(folder.path().join(name), change(name, text)).unwrap();
    }
    let study = Study::read(folder.path().join("study.toml"), &[]).unwrap();
    check(&study, study.hypothesis(None).unwrap()).unwrap()
}

fn codes(report: &CheckReport) -> Vec<&str> {
    report.warnings.iter().map(|warning| warning.code.as_str()).collect()
}

/// The table's lines below the header, changed where `pick` says so.
fn rows(text: &str, change: &dyn Fn(Vec<String>) -> Vec<String>) -> String {
    let mut lines = text.lines();
    let header = lines.next().unwrap();
    let changed = change(lines.map(str::to_owned).collect());
    format!("{header}\n{}\n", changed.join("\n"))
}

fn with_value(line: &str, change: &dyn Fn(f64) -> f64) -> String {
    let (front, value) = line.rsplit_once(',').unwrap();
    format!("{front},{:e}", change(value.parse().unwrap()))
}

#[test]
fn the_demo_is_sound() {
    let report = checked(&|_, text| text);
    assert_eq!(codes(&report), [""; 0], "{:?}", report.warnings);
    let verdicts = report.verdicts.unwrap();
    // Three claims, three numbers, in falling order of how much they claim.
    let any = verdicts.any_odd_signal.unwrap().sigma.unwrap();
    let redshift = verdicts.gravitational_redshift.unwrap().sigma.unwrap();
    let departure = verdicts.departure.unwrap();
    assert!(any > redshift && redshift > departure.sigma.unwrap());
    // What the linear estimate expects is what the fit measures, within a few per cent: the problem is nearly linear.
    assert!((verdicts.expected_sd.unwrap() / 1.07 - 1.0).abs() < 0.1, "{:?}", verdicts.expected_sd);
}

#[test]
fn swapped_tracers_are_found() {
    let report = checked(&|name, text| {
        if !name.ends_with("multipoles.csv") {
            return text;
        }
        rows(&text, &|lines| lines.iter().map(|line| with_value(line, &|value| -value)).collect())
    });
    assert!(codes(&report).contains(&"orientation"), "{:?}", report.warnings);
    let text = &report.warnings.iter().find(|warning| warning.code == "orientation").unwrap().text;
    assert!(text.contains("the first tracer of each bin is `bright`"), "{text}");
}

#[test]
fn a_covariance_in_other_units_is_found() {
    let report = checked(&|name, text| {
        if name != "larkfield-covariance.csv" {
            return text;
        }
        let scaled = |field: &str| format!("{:e}", field.parse::<f64>().unwrap() * 1e4);
        text.lines().map(|line| line.split(',').map(scaled).collect::<Vec<_>>().join(",") + "\n").collect()
    });
    assert!(codes(&report).contains(&"covariance-scale"), "{:?}", report.warnings);
}

#[test]
fn rows_in_another_order_are_found() {
    let report = checked(&|name, text| {
        if name != "larkfield-multipoles.csv" {
            return text;
        }
        // The dipole of the first bin, smallest separations last: the values move, the labels stay.
        rows(&text, &|lines| {
            let values: Vec<String> =
                lines.iter().map(|line| line.rsplit_once(',').unwrap().1.to_owned()).collect();
            let reordered = lines.iter().enumerate().map(|(index, line)| {
                let from = if index < 15 { 14 - index } else { index };
                format!("{},{}", line.rsplit_once(',').unwrap().0, values[from])
            });
            reordered.collect()
        })
    });
    let found = codes(&report);
    assert!(found.contains(&"row-order") || found.contains(&"poor-fit"), "{:?}", report.warnings);
}

#[test]
fn a_survey_given_twice_is_found() {
    let report = checked(&|name, text| match name {
        "northmoor-multipoles.csv" => {
            let other = std::fs::read_to_string(demo().join("larkfield-multipoles.csv")).unwrap();
            let renamed = other.replace("near,", "early,").replace("middle,", "earliest,");
            let kept: Vec<&str> = renamed.lines().filter(|line| !line.starts_with("far,")).collect();
            kept.join("\n") + "\n"
        }
        _ => text,
    });
    assert!(codes(&report).contains(&"duplicated-survey"), "{:?}", report.warnings);
}

#[test]
fn an_observed_slope_given_as_evolution_is_found() {
    let report = checked(&|name, text| match name {
        "study.toml" => {
            text.replace("evolution = { normal = [0.6, 0.2] }", "evolution = { normal = [-6.5, 0.2] }")
        }
        _ => text,
    });
    assert!(codes(&report).contains(&"large-evolution"), "{:?}", report.warnings);
}

#[test]
fn too_few_mocks_are_found() {
    let report = checked(&|name, text| match name {
        "study.toml" => text.replacen(
            "covariance = \"larkfield-covariance.csv\"",
            "covariance = \"larkfield-covariance.csv\"\nnoise = \"t\"\nmock_count = 110",
            1,
        ),
        _ => text,
    });
    assert!(codes(&report).contains(&"few-mocks"), "{:?}", report.warnings);
}
