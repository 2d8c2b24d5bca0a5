//! `check` on clean simulations: each kind of warning as often as its stated threshold implies, or more rarely where the
//! manual says so.
//!
//! Full size (200 studies): `cargo test --release -p oddwell-tests --test false_alarms -- --ignored --nocapture`

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stdout,
    reason = "a test stops at the first surprise, and says what it counted"
)]

mod drawing;

use drawing::Drawing;
use oddwell_study::Study;
use oddwell_study::check::{ALARM, KINDS, Kind, Rate, check_measurements};
use statrs::distribution::{Binomial, DiscreteCDF};
use std::collections::BTreeMap;
use std::path::Path;

/// A threshold at which a few hundred studies show whether it is kept.
const COARSE: f64 = 0.05;

/// Of sound tests, so many fail whatever the seed.
const FAILURES: f64 = 1e-3;

/// In how many of `studies` clean studies each kind of warning arises, at a threshold. General relativity, everything else
/// drawn from its prior.
fn count(studies: usize, alarm: f64, seed: u64) -> BTreeMap<String, u64> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("../data-demo/study.toml");
    let study = Study::read(path, &[]).unwrap();
    let mut drawing = Drawing::new(&study, study.hypothesis(Some("gr")).unwrap(), seed);
    let hypothesis = study.hypothesis(Some("constant")).unwrap();
    let mut counts = BTreeMap::new();
    for _ in 0..studies {
        let (_, drawn) = drawing.draw();
        let report = check_measurements(&study, hypothesis, &drawn, alarm).unwrap();
        let mut codes: Vec<String> = report.warnings.into_iter().map(|warning| warning.code).collect();
        codes.sort_unstable();
        codes.dedup();
        for code in codes {
            *counts.entry(code).or_insert(0) += 1;
        }
    }
    counts
}

/// The kind's count in clean studies lies where binomial chance leaves it, all but once in a thousand sound tests.
fn judge(kind: &Kind, count: u64, studies: usize, alarm: f64) {
    let binomial = Binomial::new(alarm, studies as u64).unwrap();
    let most = binomial.inverse_cdf(1.0 - FAILURES);
    let kept = match kind.rate {
        Rate::Never => count == 0,
        Rate::Below | Rate::Threshold => count <= most,
    };
    assert!(kept, "{}: {count} of {studies} at {alarm}, where at most {most} are chance", kind.code);
    // Not shared out over places that have much in common: as often as it says.
    if matches!(kind.code, "covariance-scale" | "not-normal") {
        let least = binomial.inverse_cdf(FAILURES);
        assert!(count >= least, "{}: {count} of {studies} at {alarm}, at least {least} expected", kind.code);
    }
}

fn judge_all(studies: usize, seed: u64) {
    let counts = count(studies, COARSE, seed);
    println!("{studies} clean studies, threshold {COARSE}: {counts:?}");
    for code in counts.keys() {
        assert!(KINDS.iter().any(|kind| kind.code == code), "{code}");
    }
    for kind in KINDS {
        judge(kind, counts.get(kind.code).copied().unwrap_or(0), studies, COARSE);
    }
}

#[test]
fn clean_studies_are_warned_of_no_more_than_thresholds_say() {
    judge_all(6, 40);
}

#[test]
#[ignore = "a few minutes: two checks of each of 200 studies"]
fn two_hundred_clean_studies_are_warned_of_as_often_as_thresholds_say() {
    const STUDIES: usize = 200;
    judge_all(STUDIES, 41);
    // And as `oddwell check` has them: so rarely that only their sum can be judged.
    let counts = count(STUDIES, ALARM, 42);
    println!("{STUDIES} clean studies, threshold {ALARM}: {counts:?}");
    let by_chance = KINDS.iter().filter(|kind| kind.rate != Rate::Never).count();
    let most = Binomial::new(ALARM, (STUDIES * by_chance) as u64).unwrap().inverse_cdf(1.0 - FAILURES);
    let all: u64 = counts.values().sum();
    assert!(all <= most, "{counts:?}: {all}, where at most {most} are chance");
}
