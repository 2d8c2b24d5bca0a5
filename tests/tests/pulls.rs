//! Over many simulated studies the departure's error bars mean what they say.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod drawing;

use drawing::Drawing;
use oddwell_sampler::{Control, EnsembleSettings, sample};
use oddwell_study::Study;
use oddwell_study::assemble::Posterior;
use std::path::Path;

const STUDIES: usize = 100;

/// Kolmogorov's statistic exceeds 1.95/√n with probability 0.001 (common tables; Kolmogorov 1933): the seed is fixed, and
/// of a thousand other seeds about one would fail. Pulls that are 30 % too narrow or too wide, or off by 0.3, exceed it.
fn threshold(n: usize) -> f64 {
    1.95 / (n as f64).sqrt()
}

fn kolmogorov(pulls: &mut [f64]) -> f64 {
    use statrs::distribution::{ContinuousCDF, Normal};
    let normal = Normal::standard();
    pulls.sort_by(f64::total_cmp);
    let n = pulls.len() as f64;
    pulls
        .iter()
        .enumerate()
        .map(|(index, &pull)| {
            let expected = normal.cdf(pull);
            (expected - index as f64 / n).abs().max(((index + 1) as f64 / n - expected).abs())
        })
        .fold(0.0, f64::max)
}

#[test]
fn pulls_of_the_departure_are_standard_normal() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("reference/known/known-1/study.toml");
    let study = Study::read(path, &[]).unwrap();
    let hypothesis = study.hypothesis(Some("constant")).unwrap();
    let mut drawing = Drawing::new(&study, hypothesis, 90_210);
    let tau = hypothesis.watched()[0];
    let mut pulls = Vec::with_capacity(STUDIES);
    for index in 0..STUDIES {
        let (truth, drawn) = drawing.draw();
        let posterior = Posterior::new(&study, hypothesis, &drawn).unwrap();
        let settings = EnsembleSettings {
            seed: index as u64,
            effective_samples: 1000.0,
            watched: vec![tau],
            ..EnsembleSettings::default()
        };
        let chain = sample(&posterior, &posterior.priors, &settings, &mut |_| Control::Continue).unwrap();
        assert!(chain.outcome.converged, "study {index}");
        let diagnostics = &chain.diagnostics[tau];
        pulls.push((diagnostics.mean - truth[tau]) / diagnostics.sd);
    }
    let statistic = kolmogorov(&mut pulls);
    assert!(statistic < threshold(STUDIES), "{statistic}");
    // The check can fail: error bars too small by 1.6, and a bias of 0.4 standard deviations, are seen.
    let mut narrow: Vec<f64> = pulls.iter().map(|pull| 1.6 * pull).collect();
    let mut biased: Vec<f64> = pulls.iter().map(|pull| pull + 0.4).collect();
    assert!(kolmogorov(&mut narrow).max(kolmogorov(&mut biased)) > threshold(STUDIES));
}
