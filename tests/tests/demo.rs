//! The demo: its program still makes the same bytes, and a fit of it finds the truth that was put in.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_sampler::Control;
use oddwell_study::{Existing, FitOptions, Study, fit, read_summary};
use oddwell_tests::demo;
use std::path::{Path, PathBuf};

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../data-demo")
}

#[test]
fn the_program_makes_the_same_bytes() {
    for (name, made) in demo::files(&folder().join("study.toml")).unwrap() {
        let committed = std::fs::read_to_string(folder().join(&name)).unwrap();
        assert!(made == committed, "{name} differs: run `make-demo` and look at what changed");
    }
}

#[test]
fn a_fit_converges_and_covers_the_truth() {
    let study = Study::read(folder().join("study.toml"), &[]).unwrap();
    let out = tempfile::tempdir().unwrap();
    let options = FitOptions {
        out: out.path().join("run"),
        existing: Existing::Refuse,
        seed: None,
        maximum_evaluations: None,
        command: vec!["test".into()],
        threads: 2,
    };
    let hypothesis = study.hypothesis(None).unwrap();
    assert_eq!(hypothesis.name, demo::HYPOTHESIS);
    let fitted = fit(&study, hypothesis, &options, &mut |_, _| Control::Continue).unwrap();
    assert!(fitted.summary.converged);
    // What was written is what was returned, and nothing else stays behind.
    assert_eq!(read_summary(&options.out).unwrap(), fitted.summary);
    let entries: Vec<_> = std::fs::read_dir(out.path()).unwrap().collect();
    assert_eq!(entries.len(), 1);
    // With 38 parameters, two or three of them lie outside their 95 % intervals by chance; more than seven would be a
    // probability of 5e-4. The departure itself is inside.
    let mut outside = 0;
    for (name, summary) in &fitted.summary.parameters {
        let Some((_, truth)) = demo::TRUTH.iter().find(|(known, _)| known == name) else { continue };
        let [low, high] = summary.interval95.unwrap();
        let covered = (low..=high).contains(truth);
        outside += usize::from(!covered);
        assert!(covered || name != "departure.tau", "{truth} outside {low} … {high}");
    }
    assert!(outside <= 3, "{outside} of {} recorded values lie outside", demo::TRUTH.len());
    // About 2.5 standard deviations were put in; noise adds one.
    let tau = &fitted.summary.parameters["departure.tau"];
    let put_in = demo::TRUTH[0].1 / tau.sd.unwrap();
    assert!((2.2..2.8).contains(&put_in), "{put_in}");
    // The sentence that keeps a user honest is there for all three groups of nuisances.
    let groups: Vec<&str> = fitted.summary.mimics.iter().map(|mimic| mimic.nuisance.as_str()).collect();
    assert_eq!(groups, ["evolution", "magnification", "offset"]);
    assert!(fitted.summary.mimics[0].likeness > 0.99);
}
