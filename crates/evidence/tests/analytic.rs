//! Evidences that are known from a formula or by quadrature.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]
#![allow(clippy::print_stdout, reason = "the table of what came out is the point of the full size")]

mod common;

use common::{Boxed, bimodal, egg_box, estimate, heavy_tailed, normal, shells};
use oddwell_evidence::{ClosedForm, Estimator, Laplace, Nested, SteppingStones};

/// Within three of its own error bars, and bars that mean something: below half a nat.
fn check(target: &Boxed, estimator: &dyn Estimator<Boxed>) {
    let found = estimate(target, estimator, 1);
    let off = (found.log_evidence - target.log_evidence) / found.error;
    println!(
        "{:<13} {:>2} {:<9} {:>9.3} (exact {:>9.3}) ± {:.3}: {off:+.2}, {} evaluations, insertion {:?}",
        target.name,
        target.priors.dimension(),
        estimator.family().name,
        found.log_evidence,
        target.log_evidence,
        found.error,
        found.evaluations,
        found.insertion_p_value
    );
    assert!(off.abs() < 3.0, "{}: off by {off:.2} error bars", target.name);
    assert!(found.error < 0.5 && found.votes, "{}: {found:?}", target.name);
    // The test can fail: half a nat more is seen.
    assert!(((found.log_evidence + 0.5 - target.log_evidence) / found.error).abs() > 1.0);
}

/// Fewer points than by default: a third of the price, √3 of the error bar.
fn nested() -> Nested {
    Nested { live_points: 400, runs: 2, ..Nested::default() }
}

fn stepping() -> SteppingStones {
    SteppingStones { draws: 400, runs: 4, ..SteppingStones::default() }
}

#[test]
fn normal_densities_in_two_and_ten_dimensions() {
    for dimension in [2, 10] {
        check(&normal(dimension), &nested());
        check(&normal(dimension), &stepping());
    }
}

#[test]
fn normal_densities_in_closed_form_and_by_laplace() {
    for dimension in [2, 10, 30] {
        let target = normal(dimension);
        for estimator in [&ClosedForm as &dyn Estimator<Boxed>, &Laplace::default()] {
            let found = estimate(&target, estimator, 1);
            // Differences over a scale of the box lose 1e-11 of 1e4; the Hessian at the peak is good to 1 %, but exact here.
            assert!(
                (found.log_evidence - target.log_evidence).abs() < 2e-3,
                "{} {dimension}: {found:?}",
                estimator.family().name
            );
            assert!(found.votes);
        }
    }
}

/// The published analytic values: −1.75, −5.67, −14.59, −36.09, −60.13 in 2, 5, 10, 20, 30 dimensions (Feroz, Hobson & Bridges
/// 2009, table 1; from memory).
#[test]
fn the_shells_integrate_to_the_published_values() {
    for (dimension, published) in [(2, -1.75), (5, -5.67), (10, -14.59), (20, -36.09), (30, -60.13)] {
        let quadrature = shells(dimension).log_evidence;
        assert!((quadrature - published).abs() < 0.006, "{dimension}: {quadrature}");
    }
}

#[test]
fn gaussian_shells() {
    for dimension in [2, 5] {
        check(&shells(dimension), &nested());
        check(&shells(dimension), &stepping());
    }
}

#[test]
fn two_modes() {
    for dimension in [2, 6] {
        check(&bimodal(dimension), &nested());
        check(&bimodal(dimension), &stepping());
    }
}

#[test]
fn heavy_tails() {
    for dimension in [2, 5] {
        check(&heavy_tailed(dimension), &nested());
        check(&heavy_tailed(dimension), &stepping());
    }
}

#[test]
fn the_egg_box() {
    let target = egg_box();
    check(&target, &nested());
    check(&target, &stepping());
}

/// Full size: default settings, and the shells and normal densities in up to thirty dimensions. Seen to pass in 4 minutes on two busy cores.
///
/// `cargo test --release -p oddwell-evidence --test analytic -- --ignored --nocapture`
#[test]
#[ignore = "a minute; reduced sizes run above"]
fn everything_with_default_settings() {
    let mut targets = vec![egg_box(), heavy_tailed(2), heavy_tailed(5), bimodal(2), bimodal(10)];
    targets.extend([2, 10, 30].map(normal));
    targets.extend([2, 5, 10, 20, 30].map(shells));
    for target in &targets {
        check(target, &Nested::default());
        check(target, &SteppingStones::default());
    }
}
