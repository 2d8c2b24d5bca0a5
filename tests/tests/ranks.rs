//! Simulate, fit, and see where the truth lies among the draws: the ranks of every parameter are uniform where priors,
//! predictions, noise, likelihood and sampler are all consistent (Talts et al. 2018, arXiv:1804.06788).
//!
//! Full size (200 studies): `cargo test --release -p oddwell-tests --test ranks -- --ignored --nocapture`

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stdout,
    reason = "a test stops at the first surprise, and says what it found"
)]

use oddwell_study::{Control, Draw, FitOptions, Study, Truth, fit, simulate_study, write_new_study};
use statrs::distribution::{ChiSquared, ContinuousCDF};
use std::path::Path;

/// Draws of each posterior that the truth is ranked among, evenly through the chain. With 400 effective samples or more of
/// every parameter, 31 are about 13 autocorrelation times of the slowest walker apart on average: independent enough.
const DRAWS: usize = 31;
/// Bins of ranks: 32 ranks, 4 a bin.
const BINS: usize = 8;
/// Of sound tests, so many fail whatever the seed, all parameters together.
const FAILURES: f64 = 1e-3;

/// The columns of a chain: names, and rows of numbers.
fn read_chain(path: &Path) -> (Vec<String>, Vec<Vec<f64>>) {
    let text = std::fs::read_to_string(path).unwrap();
    let mut lines = text.lines();
    let names = lines.next().unwrap().split(',').map(str::to_owned).collect();
    let rows = lines.map(|line| line.split(',').map(|field| field.parse().unwrap_or(f64::NAN)).collect());
    (names, rows.collect())
}

/// By parameter: the rank of the truth in each of `studies` fits, 0 to [`DRAWS`].
fn ranks(studies: usize, seed: u64) -> Vec<(String, Vec<usize>)> {
    let folder = tempfile::tempdir().unwrap();
    let files = write_new_study(&folder.path().join("plan")).unwrap();
    let plan = Study::read(&files[0], &[]).unwrap();
    let hypothesis = plan.hypothesis(None).unwrap();
    let mut ranks: Vec<(String, Vec<usize>)> = Vec::new();
    for index in 0..studies {
        let here = folder.path().join(format!("{index}"));
        let draw = Draw { truth: Truth::Prior, seed: seed + index as u64, mocks: 0 };
        let drawn = simulate_study(&plan, hypothesis, draw, &here).unwrap();
        let study = Study::read(&drawn.study, &[]).unwrap();
        let options = FitOptions {
            out: here.join("run"),
            existing: oddwell_study::Existing::Refuse,
            seed: Some(seed + 1_000_000 + index as u64),
            maximum_evaluations: None,
            command: vec!["test".into()],
            threads: 2,
        };
        let fitted =
            fit(&study, study.hypothesis(None).unwrap(), &options, &mut |_, _| Control::Continue).unwrap();
        assert!(fitted.summary.converged, "study {index}");
        let (names, rows) = read_chain(&options.out.join("chain.csv"));
        for (position, (name, truth)) in drawn.truth.iter().enumerate() {
            let column = names.iter().position(|known| known == name).unwrap();
            let rank = (0..DRAWS)
                .filter(|draw| {
                    // The middle of each of as many stretches of the chain.
                    let row = (2 * draw + 1) * rows.len() / (2 * DRAWS);
                    rows[row][column] < *truth
                })
                .count();
            if index == 0 {
                ranks.push((name.clone(), Vec::new()));
            }
            ranks[position].1.push(rank);
        }
        std::fs::remove_dir_all(&here).unwrap();
    }
    ranks
}

/// The probability of ranks at least as uneven: χ² over bins of equal expectation.
fn p_value(ranks: &[usize]) -> f64 {
    let mut counts = [0_usize; BINS];
    for rank in ranks {
        counts[rank * BINS / (DRAWS + 1)] += 1;
    }
    let expected = ranks.len() as f64 / BINS as f64;
    let statistic: f64 = counts.iter().map(|&count| (count as f64 - expected).powi(2) / expected).sum();
    ChiSquared::new((BINS - 1) as f64).unwrap().sf(statistic)
}

/// The mean rank in units of its error about the middle: what a bias shifts before a histogram shows it.
fn shift(ranks: &[usize]) -> f64 {
    let count = ranks.len() as f64;
    let mean = ranks.iter().sum::<usize>() as f64 / count;
    let ranks = (DRAWS + 1) as f64;
    (mean - 0.5 * DRAWS as f64) / ((ranks * ranks - 1.0) / 12.0 / count).sqrt()
}

fn judge(studies: usize, seed: u64) {
    let ranks = ranks(studies, seed);
    assert!(ranks.len() > 10 && ranks.iter().any(|(name, _)| name == "departure.tau"));
    let threshold = FAILURES / ranks.len() as f64;
    for (name, ranks) in &ranks {
        let (p_value, shift) = (p_value(ranks), shift(ranks));
        println!("{name}: p {p_value:.3}, mean rank {shift:+.2} errors from the middle");
        assert!(p_value > 0.5 * threshold, "{name}: {ranks:?}");
        // 4.3 errors: 1.7e-5 two-sided, half of the threshold of twenty parameters.
        assert!(shift.abs() < 4.3, "{name}: {shift}");
    }
}

#[test]
fn ranks_of_a_few_studies_are_not_uneven() {
    judge(10, 7_000);
}

#[test]
#[ignore = "some minutes: simulates and fits 200 studies"]
fn ranks_of_two_hundred_studies_are_uniform() {
    judge(200, 8_000);
}

/// Posteriors that are 1.5 times too narrow, and truths that lie half a standard deviation off, would be seen with 200 studies.
#[test]
fn uneven_ranks_are_seen() {
    use statrs::distribution::Normal;
    let normal = Normal::standard();
    let quantile = |index: usize| normal.inverse_cdf((index as f64 + 0.5) / 200.0);
    let rank = |pull: f64| (normal.cdf(pull) * (DRAWS + 1) as f64) as usize;
    let fair: Vec<usize> = (0..200).map(|index| rank(quantile(index))).collect();
    assert!(p_value(&fair) > 0.99 && shift(&fair).abs() < 0.1);
    let narrow: Vec<usize> = (0..200).map(|index| rank(1.5 * quantile(index))).collect();
    assert!(p_value(&narrow) < FAILURES / 40.0, "{}", p_value(&narrow));
    let off: Vec<usize> = (0..200).map(|index| rank(quantile(index) + 0.5)).collect();
    assert!(shift(&off) > 4.3, "{}", shift(&off));
}
