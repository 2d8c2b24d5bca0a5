//! Posteriors that are known in closed form: everything but linear quantities with normal priors is held.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_sampler::Control;
use oddwell_study::record::Summary;
use oddwell_study::{Existing, FitOptions, Study, fit};
use serde_json::Value;
use std::path::{Path, PathBuf};

fn reference() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("reference/known")
}

fn run(study: &str, hypothesis: &str) -> Summary {
    let study = Study::read(reference().join(study).join("study.toml"), &[]).unwrap();
    let folder = tempfile::tempdir().unwrap();
    let options = FitOptions {
        out: folder.path().join("run"),
        existing: Existing::Refuse,
        seed: None,
        maximum_evaluations: None,
        command: Vec::new(),
        threads: 1,
    };
    let hypothesis = study.hypothesis(Some(hypothesis)).unwrap();
    fit(&study, hypothesis, &options, &mut |_, _| Control::Continue).unwrap().summary
}

/// Largest |z| that the differences may reach: 4 Monte Carlo standard errors. Sixty comparisons of two kinds exceed that
/// by chance once in some 130 runs of other seeds; the seed is fixed.
const STANDARD_ERRORS: f64 = 4.0;

fn compare(study: &str, hypothesis: &str) {
    let answers: Value =
        serde_json::from_str(&std::fs::read_to_string(reference().join("answers.json")).unwrap()).unwrap();
    let expected = answers[study][hypothesis]["parameters"].as_object().unwrap();
    let summary = run(study, hypothesis);
    assert!(summary.converged);
    let inferred = summary.parameters.keys().filter(|name| !name.starts_with("derived.")).count();
    assert_eq!(inferred, expected.len());
    for (name, expected) in expected {
        let got = &summary.parameters[name];
        let (mean, sd) = (expected["mean"].as_f64().unwrap(), expected["sd"].as_f64().unwrap());
        let off = (got.mean.unwrap() - mean) / got.mcse.unwrap();
        assert!(
            off.abs() < STANDARD_ERRORS,
            "{study} {hypothesis} {name}: mean off by {off:.2} standard errors"
        );
        // A standard deviation from n effective draws of a normal is known to sd/√(2n).
        let error = sd / (2.0 * got.ess.unwrap()).sqrt();
        let off = (got.sd.unwrap() - sd) / error;
        assert!(
            off.abs() < STANDARD_ERRORS,
            "{study} {hypothesis} {name}: sd off by {off:.2} standard errors"
        );
        // The check can fail: a mean off by a fifth of a standard deviation is seen.
        assert!(0.2 * sd / got.mcse.unwrap() > STANDARD_ERRORS);
    }
}

#[test]
fn one_bin() {
    compare("known-1", "gr");
    compare("known-1", "constant");
}

#[test]
fn three_bins_of_two_surveys() {
    compare("known-2", "constant");
    compare("known-2", "tracking");
    compare("known-2", "free");
}
