//! `weigh` on whole studies: evidences that are known in closed form, records, refusals, resumption.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_report::{Style, weigh_text};
use oddwell_study::record::{HypothesisRecord, Summary, WeighRecord};
use oddwell_study::{Override, RunError, Study, StudyFile, WeighOptions, WeighWatch, read_summary, weigh};
use serde_json::Value;
use std::path::{Path, PathBuf};

fn reference() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("reference/known")
}

fn known(name: &str, set: &[&str]) -> Study {
    let overrides: Vec<Override> = set.iter().map(|text| Override::parse(text).unwrap()).collect();
    Study::read(reference().join(name).join("study.toml"), &overrides).unwrap()
}

/// A known study with a piece of its text replaced.
fn changed(name: &str, from: &str, to: &str) -> Study {
    let folder = reference().join(name);
    let text = std::fs::read_to_string(folder.join("study.toml")).unwrap();
    assert!(text.contains(from), "{from}");
    Study::resolve(StudyFile::parse("study.toml", text.replacen(from, to, 1), folder).unwrap(), &[]).unwrap()
}

fn options(out: &Path) -> WeighOptions {
    WeighOptions {
        out: out.to_owned(),
        replace: false,
        resume: false,
        seed: None,
        command: vec![],
        threads: 2,
    }
}

fn weighed(study: &Study) -> WeighRecord {
    let folder = tempfile::tempdir().unwrap();
    weigh(study, &options(&folder.path().join("run")), &WeighWatch::new(study)).unwrap().record
}

fn hypothesis<'a>(record: &'a WeighRecord, name: &str) -> &'a HypothesisRecord {
    record.hypotheses.iter().find(|hypothesis| hypothesis.name == name).unwrap()
}

/// The limit that scripts hold `weigh` to; three or more error bars of every estimator.
const LIMIT: f64 = 0.15;

fn compare(study: &str) -> WeighRecord {
    let answers: Value =
        serde_json::from_str(&std::fs::read_to_string(reference().join("answers.json")).unwrap()).unwrap();
    let record = weighed(&known(study, &[]));
    assert!(record.agree);
    for found in &record.hypotheses {
        let expected = answers[study][&found.name]["log_evidence"].as_f64().unwrap();
        assert!((found.log_evidence.unwrap() - expected).abs() < LIMIT, "{study} {}", found.name);
        for (name, estimate) in &found.estimators {
            let Some(estimate) = estimate else { continue };
            let off = estimate.log_evidence - expected;
            assert!(off.abs() < LIMIT, "{study} {} {name}: {off}", found.name);
            assert!(off.abs() < 4.0 * estimate.error + 1e-4, "{study} {} {name}: {off}", found.name);
        }
        let closed = found.estimators["closed_form"].as_ref().unwrap();
        // Two implementations of the prediction that agree to 1e-8 of a multipole leave 1e-5 of an evidence of several hundred.
        assert!((closed.log_evidence - expected).abs() < 1e-3);
        // The check can fail.
        assert!((closed.log_evidence + 0.2 - expected).abs() > LIMIT);
    }
    record
}

#[test]
fn evidences_known_in_closed_form() {
    let record = compare("known-1");
    let found = hypothesis(&record, "constant");
    // Every route is there, but general relativity contains nothing.
    assert!(found.estimators.values().all(Option::is_some));
    assert!(hypothesis(&record, "gr").estimators["density_ratio"].is_none());
    let odds = (found.log_evidence.unwrap() - hypothesis(&record, "gr").log_evidence.unwrap()).exp();
    assert!((found.odds.unwrap() / odds - 1.0).abs() < 1e-9);
    assert!((found.probability.unwrap() - odds / (1.0 + odds)).abs() < 1e-9);
    // One bin: nothing to be consistent with.
    assert!(record.consistency.is_empty());
}

#[test]
fn two_surveys_and_one_departure_each() {
    let record = compare("known-2");
    let [bins] = &record.consistency[..] else { panic!("{:?}", record.consistency) };
    assert_eq!(bins.of, "bins");
    let ratio = hypothesis(&record, "constant").log_evidence.unwrap()
        - hypothesis(&record, "free").log_evidence.unwrap();
    assert!((bins.consistency.log_evidence_ratio - ratio).abs() < 1e-9);
    // One departure was drawn for all.
    assert!(bins.consistency.tail_probability.unwrap() > 0.01);
    assert!(record.best_of.iter().any(|entry| entry.of == "shapes" && entry.tail.global >= entry.tail.local));
    assert_eq!(record.average.len(), 3);
}

/// With normal noise and priors the posterior of τ for one prior tells the evidence for any other: the curve must go through
/// what a study with that prior gives in closed form.
#[test]
fn the_width_curve_is_what_other_priors_give() {
    let record = weighed(&known("known-1", &[]));
    let curve = hypothesis(&record, "constant").sensitivity.clone().unwrap();
    let (factor, sd) = (10.0, 30.0);
    let other = weighed(&known("known-1", &[&format!("departure.tau={{ normal = [0.0, {sd}] }}")]));
    let expected =
        hypothesis(&other, "constant").log_evidence.unwrap() - hypothesis(&other, "gr").log_evidence.unwrap();
    let at =
        curve.widths.iter().position(|width| (width / curve.width / factor - 1.0f64).abs() < 1e-6).unwrap();
    // The quadratic in τ is exact here; its differences are good to 1e-9.
    assert!((curve.log_ratios[at] - expected).abs() < 1e-5, "{factor}: {} {expected}", curve.log_ratios[at]);
}

/// A flat prior, an estimated covariance, and prior odds.
#[test]
fn flat_priors_estimated_covariances_and_weights() {
    let flat =
        changed("known-1", "tau = { normal = [0.0, 3.0] }", "tau = { uniform = [-3.0, 2.0] }\nweight = 3.0");
    let record = weighed(&flat);
    assert!(record.agree);
    let found = hypothesis(&record, "constant");
    let closed = found.estimators["closed_form"].as_ref().unwrap().log_evidence;
    for (name, estimate) in &found.estimators {
        // Laplace takes the prior as if it had no ends, and says so.
        let Some(estimate) = estimate.as_ref().filter(|estimate| estimate.votes) else { continue };
        assert!((estimate.log_evidence - closed).abs() < LIMIT, "{name}");
    }
    let ratio = (closed - hypothesis(&record, "gr").log_evidence.unwrap()).exp();
    assert!((found.odds.unwrap() / ratio - 3.0).abs() < 1e-6);

    let estimated = changed("known-1", "noise = \"gaussian\"", "noise = \"t\"\nmock_count = 90");
    let record = weighed(&estimated);
    assert!(record.agree);
    for found in &record.hypotheses {
        assert!(found.estimators["closed_form"].is_none());
        assert!(found.not_applicable["closed_form"].contains("quadratic"), "{:?}", found.not_applicable);
        let (nested, stepping) =
            (found.estimators["nested"].as_ref().unwrap(), found.estimators["stepping"].as_ref().unwrap());
        assert!((nested.log_evidence - stepping.log_evidence).abs() < 2.0 * LIMIT);
    }
}

/// Noise `percival` counts what a hypothesis determines; weighed, all hypotheses share the count, so that a hypothesis with no more
/// to say than another has the same evidence but for its prior.
#[test]
fn one_exponent_for_all_hypotheses() {
    let study = changed("known-1", "noise = \"gaussian\"", "noise = \"percival\"\nmock_count = 90");
    let record = weighed(&study);
    assert!(record.agree);
    let (gr, constant) = (hypothesis(&record, "gr"), hypothesis(&record, "constant"));
    let ratio = constant.estimators["density_ratio"].as_ref();
    // The density ratio lives within one noise; had general relativity another exponent, it would be off by the difference of two
    // normalisations, some tenths.
    let (by_ratio, by_nested) = match (ratio, &constant.estimators["nested"]) {
        (Some(ratio), Some(nested)) => (ratio, nested),
        other => panic!("{other:?}"),
    };
    assert!((by_ratio.log_evidence - by_nested.log_evidence).abs() < 2.0 * LIMIT);
    // With 90 mocks for 30 rows the exponent makes a density or not, for all alike.
    assert_eq!(gr.log_evidence.is_none(), record.relative);
    assert_eq!(constant.log_evidence.is_none(), record.relative);
    assert!(constant.odds.is_some());
}

/// Felt by everything, a departure leaves odd multipoles as they are but for growth; and a prior that allows next to nothing is
/// not tested by anything.
#[test]
fn a_departure_that_the_data_do_not_test_has_no_odds() {
    for (felt_by, sd) in [("everything", "0.5"), ("light", "0.01")] {
        let tau = format!("felt_by = \"{felt_by}\"\ntau = {{ normal = [0.0, {sd}] }}");
        let record = weighed(&changed("known-1", "felt_by = \"light\"\ntau = { normal = [0.0, 3.0] }", &tau));
        let found = hypothesis(&record, "constant");
        assert_eq!(found.tested, Some(false), "{felt_by}");
        assert!(found.odds.is_none() && found.probability.is_none() && found.sensitivity.is_none());
        assert!(found.log_evidence.is_some());
        assert!(
            record.notes.iter().any(|note| note.contains("do not test `constant`")),
            "{:?}",
            record.notes
        );
        let text = weigh_text(&record, Style::Plain);
        assert!(text.contains("`constant`: untested"), "{text}");
    }
}

#[test]
fn the_run_directory_and_what_it_refuses() {
    let study = known("known-1", &[]);
    let folder = tempfile::tempdir().unwrap();
    let out = folder.path().join("run");
    let weighed = weigh(&study, &options(&out), &WeighWatch::new(&study)).unwrap();
    let text = std::fs::read_to_string(out.join("weigh.json")).unwrap();
    let read: WeighRecord = serde_json::from_str(&text).unwrap();
    assert_eq!(read, weighed.record);
    let json: Value = serde_json::from_str(&text).unwrap();
    assert_eq!(json["agree"], Value::Bool(true));
    assert!(json["hypotheses"][0]["estimators"]["density_ratio"].is_null());
    assert!(json["hypotheses"][1]["estimators"]["nested"]["error"].as_f64().unwrap() > 0.0);
    for name in ["gr", "constant"] {
        let summary: Summary = read_summary(&out.join(name)).unwrap();
        assert!(summary.converged && summary.hypothesis == name);
        assert!(out.join(name).join("chain.csv").is_file());
    }
    // Nothing that only an unfinished run needs.
    let mut names: Vec<String> = std::fs::read_dir(&out)
        .unwrap()
        .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
        .collect();
    names.sort();
    assert_eq!(names, ["constant", "gr", "manifest.json", "weigh.json"]);
    assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 1);
    // Never overwritten, unless asked.
    let again = weigh(&study, &options(&out), &WeighWatch::new(&study));
    assert!(matches!(again, Err(RunError::Exists { .. })));
    let replaced = WeighOptions { replace: true, ..options(&out) };
    let second = weigh(&study, &replaced, &WeighWatch::new(&study)).unwrap();
    let without_times = |record: &WeighRecord| {
        let mut record = record.clone();
        record.wall_seconds = 0.0;
        record.hypotheses.iter_mut().for_each(|hypothesis| hypothesis.seconds = 0.0);
        record
    };
    // The same study and seed give the same numbers.
    assert_eq!(without_times(&second.record), without_times(&weighed.record));
}

/// Stopped at once, nothing is there but what can be resumed; and what was kept is not made again.
#[test]
fn a_stopped_weighing_resumes_with_what_it_has() {
    let study = known("known-1", &[]);
    let folder = tempfile::tempdir().unwrap();
    let out = folder.path().join("run");
    let resumed = WeighOptions { resume: true, ..options(&out) };
    let nothing = weigh(&study, &resumed, &WeighWatch::new(&study));
    assert!(matches!(nothing, Err(RunError::NotResumable { .. })), "{nothing:?}");

    let watch = WeighWatch::new(&study);
    std::thread::scope(|scope| {
        let running = scope.spawn(|| weigh(&study, &options(&out), &watch));
        // Both posteriors and a part of the rest.
        while watch.hypotheses.iter().map(|each| each.parts().0).sum::<usize>() < 3 && !running.is_finished()
        {
            std::thread::sleep(std::time::Duration::from_millis(1));
        }
        watch.stop();
        let stopped = running.join().unwrap();
        assert!(stopped.as_ref().is_err_and(RunError::is_stopped_weighing), "{stopped:?}");
    });
    assert!(!out.exists());
    let watch = WeighWatch::new(&study);
    let finished = weigh(&study, &resumed, &watch).unwrap();
    let again: u64 = watch.hypotheses.iter().map(|each| each.watch.evaluations()).sum();
    assert!(again < finished.record.evaluations, "{again} of {}", finished.record.evaluations);
    let mut whole = weighed(&study);
    let mut finished = finished.record;
    for record in [&mut whole, &mut finished] {
        record.wall_seconds = 0.0;
        record.hypotheses.iter_mut().for_each(|hypothesis| hypothesis.seconds = 0.0);
    }
    assert_eq!(whole, finished);
    // With another seed, what was kept is of no use.
    let other = WeighOptions { seed: Some(99), resume: true, ..options(&folder.path().join("other")) };
    assert!(matches!(weigh(&study, &other, &WeighWatch::new(&study)), Err(RunError::NotResumable { .. })));
}

#[test]
fn a_blinded_study_is_not_weighed() {
    let folder = tempfile::tempdir().unwrap();
    let phrase = folder.path().join("phrase.txt");
    std::fs::write(&phrase, "twelve invented words").unwrap();
    let blinded = folder.path().join("blinded");
    oddwell_study::blinding::blind(&known("known-1", &[]), &phrase, &blinded).unwrap();
    let study = Study::read(blinded.join("study.toml"), &[]).unwrap();
    let refused = weigh(&study, &options(&folder.path().join("run")), &WeighWatch::new(&study));
    let error = refused.unwrap_err();
    assert!(matches!(error, RunError::Blinded { .. }), "{error}");
    assert!(!folder.path().join("run").exists());
}
