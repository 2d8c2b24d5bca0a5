//! Error bars of evidences are as wide as the scatter of repeated runs, on a hypothesis of the demo.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]
#![allow(clippy::print_stdout, reason = "the table is the point of the full size")]

use oddwell_evidence::{Estimator, Nested, Problem, SteppingStones, Watch};
use oddwell_study::Study;
use oddwell_study::assemble::{IntegratedPosterior, Posterior, read_measurements};
use std::path::Path;

/// Scatter over error bar of n runs is known to 1/√(2(n − 1)); the bars may be a fifth too wide besides. Both routes must also
/// agree in the mean, within three of their standard errors.
fn check(nested: &Nested, stepping: &SteppingStones, runs: u64) {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("../data-demo/study.toml");
    let study = Study::read(path, &[]).unwrap();
    let measurements = read_measurements(&study).unwrap();
    let hypothesis = study.hypothesis(Some("constant")).unwrap();
    let posterior = Posterior::new(&study, hypothesis, &measurements).unwrap();
    let left = IntegratedPosterior::keeping(&posterior, &hypothesis.watched()).unwrap().unwrap();
    let estimators: [(&str, &dyn Estimator<IntegratedPosterior<'_>>); 2] =
        [("nested", nested), ("stepping", stepping)];
    let means = estimators.map(|(name, estimator)| {
        let found: Vec<(f64, f64)> = (0..runs)
            .map(|seed| {
                let problem = Problem {
                    target: &left,
                    priors: &left.priors,
                    seed: 5000 + seed,
                    peak: None,
                    chain: None,
                    contained: None,
                };
                let estimate = estimator.estimate(&problem, &Watch::new()).unwrap();
                (estimate.log_evidence, estimate.error)
            })
            .collect();
        let count = runs as f64;
        let mean = found.iter().map(|(value, _)| value).sum::<f64>() / count;
        let variance = found.iter().map(|(value, _)| (value - mean).powi(2)).sum::<f64>() / (count - 1.0);
        let bar = (found.iter().map(|(_, error)| error * error).sum::<f64>() / count).sqrt();
        let (ratio, known) = (variance.sqrt() / bar, 1.0 / (2.0 * (count - 1.0)).sqrt());
        println!(
            "{name:<9} {runs} runs: mean {mean:.4}, scatter {:.4}, error bar {bar:.4}, ratio {ratio:.3} ± {known:.3}",
            variance.sqrt()
        );
        assert!(ratio < 1.0 + 3.0 * known && ratio > 0.8 - 3.0 * known, "{name}: {ratio}");
        (mean, bar / count.sqrt())
    });
    let off = (means[0].0 - means[1].0) / means[0].1.hypot(means[1].1);
    println!("the means differ by {off:+.2} of their standard errors");
    assert!(off.abs() < 3.0, "{off}");
}

#[test]
fn the_demo_over_a_few_runs() {
    let nested = Nested { live_points: 100, runs: 2, ..Nested::default() };
    let stepping = SteppingStones { draws: 60, runs: 4, ..SteppingStones::default() };
    check(&nested, &stepping, 10);
}

/// Full size: default settings, sixty seeds.
///
/// `cargo test --release -p oddwell-tests --test weigh_error_bars -- --ignored --nocapture`
#[test]
#[ignore = "minutes; a reduced size runs above"]
fn the_demo_over_sixty_runs() {
    check(&Nested::default(), &SteppingStones::default(), 60);
}
