//! `oddwell fit` from the outside: what it writes, says and returns.

#![allow(clippy::panic, reason = "a test fails by panicking")]

mod common;

use common::{Folder, json_file, names};
use std::fs;

const FILES: [&str; 3] = ["chain.csv", "manifest.json", "summary.json"];

#[test]
fn a_fit_writes_a_run_directory_and_says_what_came_out() {
    let folder = Folder::new();
    let ran = folder.run(&["fit", "study.toml"]);
    assert_eq!(ran.status, Some(0), "{}", ran.err);
    assert_eq!(ran.err, "fitting `constant` (felt by light); also in the study: `gr`\n");
    let run = folder.path("runs/a-small-survey-constant");
    assert!(FILES.iter().all(|file| names(&run).iter().any(|name| name == file)), "{:?}", names(&run));
    assert_eq!(names(&folder.path("runs")).len(), 1, "nothing half-written stays behind");
    assert!(
        ran.out.starts_with("A small survey: hypothesis `constant` (departure constant, felt by light)\n\n")
    );
    assert!(ran.out.contains("\n  departure.tau = ") && ran.out.contains("\n  Converged: "), "{}", ran.out);
    assert!(ran.out.ends_with("\nwritten to runs/a-small-survey-constant\n"), "{}", ran.out);
    let manifest = json_file(&run.join("manifest.json"));
    assert_eq!((&manifest["command"][1], &manifest["command"][2]), (&"fit".into(), &"study.toml".into()));
    assert_eq!(manifest["seed"], 3);
}

#[test]
fn an_existing_run_is_refused_without_replace_and_kept() {
    let folder = Folder::new();
    assert_eq!(folder.run(&["fit", "study.toml", "--out", "run", "--seed", "5"]).status, Some(0));
    let before = fs::read(folder.path("run/chain.csv")).expect("a chain");
    let refused = folder.run(&["fit", "study.toml", "--out", "run", "--hypothesis", "constant"]);
    assert_eq!((refused.status, refused.out.as_str()), (Some(1), ""));
    assert_eq!(
        refused.err,
        "error: run: exists already, and a run is never overwritten; give `--replace`, or another folder with `--out` (`--resume` goes on with one that was interrupted)\n"
    );
    assert_eq!(fs::read(folder.path("run/chain.csv")).ok(), Some(before.clone()));
    let replaced = folder.run(&["fit", "study.toml", "--out", "run", "--replace", "--quiet"]);
    assert_eq!((replaced.status, replaced.out.as_str(), replaced.err.as_str()), (Some(0), "", ""));
    assert_ne!(fs::read(folder.path("run/chain.csv")).ok(), Some(before), "another seed, another chain");
    assert_eq!(json_file(&folder.path("run/manifest.json"))["seed"], 3);
}

#[test]
fn json_is_the_summary_and_threads_change_nothing() {
    let folder = Folder::new();
    let one = folder.run(&["fit", "study.toml", "--out", "one", "--threads", "1", "--json"]);
    assert_eq!(one.status, Some(0), "{}", one.err);
    assert_eq!(one.json(), json_file(&folder.path("one/summary.json")));
    assert_eq!(one.json()["sampler"]["threads"], 1);
    let two = folder.run(&["fit", "study.toml", "--out", "two", "--threads", "2", "--json"]);
    assert_eq!(two.json()["sampler"]["threads"], 2);
    let chain = |run: &str| fs::read(folder.path(run).join("chain.csv")).expect("a chain");
    assert!(chain("one") == chain("two"), "the chain depends on the number of threads");
}

#[test]
fn too_few_evaluations_are_status_3_and_name_what_failed() {
    let folder = Folder::with("{ normal = [0.0, 0.3] }", 1_000_000);
    let ran = folder.run(&["fit", "study.toml", "--out", "run", "--maximum-evaluations", "5000"]);
    assert_eq!(ran.status, Some(3), "{}", ran.err);
    let warning = ran.err.lines().last().unwrap_or_default().to_owned();
    assert!(warning.starts_with("warning: `constant`: ") && warning.contains("departure.tau"), "{warning}");
    assert!(
        warning.contains(" times as long") && warning.ends_with("results so far are in run"),
        "{warning}"
    );
    assert!(ran.out.contains("\nNOT CONVERGED: "), "{}", ran.out);
    assert_eq!(json_file(&folder.path("run/summary.json"))["converged"], false);
}

#[test]
fn all_hypotheses_are_fitted_in_turn() {
    let folder = Folder::new();
    let ran = folder.run(&["fit", "study.toml", "--hypothesis", "all", "--out", "runs", "--json"]);
    assert_eq!(ran.status, Some(0), "{}", ran.err);
    assert_eq!(ran.err, "fitting `gr`\nfitting `constant`\n");
    let list = ran.json();
    assert_eq!(list.as_array().map(Vec::len), Some(2));
    assert_eq!(list[0], json_file(&folder.path("runs/gr/summary.json")));
    assert_eq!(list[1], json_file(&folder.path("runs/constant/summary.json")));
    // The first is free again, the second is not: nothing runs.
    fs::remove_dir_all(folder.path("runs/gr")).expect("removable");
    let refused = folder.run(&["fit", "study.toml", "--hypothesis", "all", "--out", "runs"]);
    assert_eq!(refused.status, Some(1));
    assert_eq!(names(&folder.path("runs")), ["constant"]);
}

#[test]
fn hypotheses_with_nothing_to_infer_are_skipped() {
    let folder = Folder::with("0.0", 500);
    let ran = folder.run(&["fit", "study.toml", "--hypothesis", "all", "--out", "runs"]);
    assert_eq!(ran.status, Some(0), "{}", ran.err);
    assert_eq!(ran.err, "skipping `gr`: it has nothing to infer\nfitting `constant`\n");
    assert_eq!(names(&folder.path("runs")), ["constant"]);
    let ran = folder.run(&[
        "fit",
        "study.toml",
        "--hypothesis",
        "all",
        "--set",
        "departure.tau=0",
        "--out",
        "held",
    ]);
    assert_eq!(ran.status, Some(1));
    assert!(ran.err.contains("has nothing to infer"), "{}", ran.err);
    assert!(!folder.path("held").exists());
}

/// Ctrl-C and what a batch system sends: both end a fit that would take hours, and keep what was sampled.
#[cfg(unix)]
mod signals {
    use super::*;
    use std::process::{Command, Stdio};
    use std::thread::sleep;
    use std::time::{Duration, Instant};

    /// Not linear, so that there is something to sample.
    const BIAS: &str = "larkfield.near.first.bias={ normal = [2.1, 0.1] }";

    fn stopped_by(signal: &str) {
        let folder = Folder::with("{ normal = [0.0, 0.3] }", 1_000_000_000);
        let child = folder
            .oddwell(&["fit", "study.toml", "--out", "runs/long", "--set", BIAS])
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("the program starts");
        // The hidden folder of an unfinished run appears once signals are listened to.
        let started = Instant::now();
        while !folder.path("runs").is_dir() || names(&folder.path("runs")).is_empty() {
            assert!(started.elapsed() < Duration::from_secs(60), "the fit does not start");
            sleep(Duration::from_millis(20));
        }
        // Peak and warm-up of two parameters take some 20 ms; fiftyfold for a machine that is busy.
        sleep(Duration::from_secs(1));
        let sent = Command::new("kill").args([&format!("-{signal}"), &child.id().to_string()]).status();
        assert!(sent.is_ok_and(|status| status.success()));
        let ran = common::Ran::of(child.wait_with_output().expect("it ends"));
        assert_eq!(ran.status, Some(130), "{}", ran.err);
        assert!(ran.err.contains("\nstopping, and writing what has been sampled"), "{}", ran.err);
        assert!(ran.out.contains("\nNOT CONVERGED: "), "{}", ran.out);
        assert_eq!(names(&folder.path("runs")), [".long.unfinished", "long"]);
        let summary = json_file(&folder.path("runs/long/summary.json"));
        assert_eq!(summary["converged"], false);
        assert!(summary["parameters"]["departure.tau"]["sd"].as_f64().is_some_and(|sd| sd > 0.0));
        let chain = fs::read_to_string(folder.path("runs/long/chain.csv")).expect("a chain");
        let width = chain.lines().next().map(|header| header.split(',').count());
        assert!(
            chain.lines().count() > 1 && chain.lines().all(|line| Some(line.split(',').count()) == width)
        );
        json_file(&folder.path("runs/long/manifest.json"));
    }

    #[test]
    fn an_interrupt_keeps_what_was_sampled() {
        stopped_by("INT");
    }

    #[test]
    fn a_termination_keeps_what_was_sampled() {
        stopped_by("TERM");
    }
}
