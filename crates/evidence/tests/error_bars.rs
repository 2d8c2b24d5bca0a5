//! Error bars are as wide as the scatter of repeated runs.

#![allow(clippy::unwrap_used, reason = "a test stops at the first surprise")]
#![allow(clippy::print_stdout, reason = "the table of what came out is the point of the full size")]

mod common;

use common::{Boxed, estimate, normal, shells};
use oddwell_evidence::{Estimator, Nested, SteppingStones};
use rayon::prelude::*;

/// Runs with other seeds, and what their scatter and their mean say of the error bars.
///
/// Of n runs, the ratio of scatter to rms error bar is known to 1/√(2(n − 1)), and the mean of the pulls to 1/√n. The bars may
/// be too wide by a fifth (each is the larger of two that agree on average); beyond that, three standard errors of each are
/// allowed: n = 100 sees a bar off by 21 %, n = 24 by 44 %.
fn check(target: &Boxed, estimator: &dyn Estimator<Boxed>, runs: u64) {
    let found: Vec<_> =
        (0..runs).into_par_iter().map(|seed| estimate(target, estimator, 1000 + seed)).collect();
    let count = runs as f64;
    let off: Vec<f64> = found.iter().map(|found| found.log_evidence - target.log_evidence).collect();
    let mean = off.iter().sum::<f64>() / count;
    let scatter = (off.iter().map(|off| (off - mean).powi(2)).sum::<f64>() / (count - 1.0)).sqrt();
    let bar = (found.iter().map(|found| found.error.powi(2)).sum::<f64>() / count).sqrt();
    let pull = off.iter().zip(&found).map(|(off, found)| off / found.error).sum::<f64>() / count;
    let insertion = found.iter().filter_map(|found| found.insertion_p_value).fold(1.0, f64::min);
    println!(
        "{:<7} {:>2} {:<9} {runs} runs: scatter {scatter:.4}, error bar {bar:.4}, ratio {:.3} ± {:.3}; mean pull {pull:+.2} ± \
         {:.2}; least insertion probability {insertion:.4}",
        target.name,
        target.priors.dimension(),
        estimator.family().name,
        scatter / bar,
        1.0 / (2.0 * (count - 1.0)).sqrt(),
        count.sqrt().recip()
    );
    let allowed = 3.0 / (2.0 * (count - 1.0)).sqrt();
    let ratio = scatter / bar;
    assert!(ratio < 1.0 + allowed && ratio > 0.8 - allowed, "{}: {ratio}", target.name);
    assert!(pull.abs() < 3.0 / count.sqrt(), "{}: mean pull {pull}", target.name);
}

/// Reduced: small runs, few of them.
#[test]
fn error_bars_are_honest_over_a_few_runs() {
    let nested = Nested { live_points: 160, runs: 2, ..Nested::default() };
    let stepping = SteppingStones { draws: 100, runs: 4, ..SteppingStones::default() };
    let target = normal(4);
    check(&target, &nested, 24);
    check(&target, &stepping, 24);
}

/// Full size: default settings, a hundred seeds.
///
/// `cargo test --release -p oddwell-evidence --test error_bars -- --ignored --nocapture`
#[test]
#[ignore = "minutes; a reduced size runs above"]
fn error_bars_are_honest_over_a_hundred_runs() {
    for target in [normal(6), shells(2)] {
        check(&target, &Nested::default(), 100);
        check(&target, &SteppingStones::default(), 100);
    }
}
