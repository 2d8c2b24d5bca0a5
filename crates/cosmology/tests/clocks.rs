//! The clock contrast.

// A panic is how a test fails; the lint's own exception covers the test functions, not their helpers.
#![allow(clippy::unwrap_used, clippy::panic)]

mod common;

use common::{close, near, rows};
use oddwell_cosmology::{
    Background, ClockSetting, CosmologyError, LinearPower, PowerShape, SECONDS_PER_YEAR, clock_contrast,
    growth_states,
};

fn universe() -> (Background, LinearPower) {
    (
        Background::new(0.31, 0.0, -1.0, 0.0).unwrap(),
        LinearPower::new(&PowerShape::EisensteinHu, 0.31, 0.049, 0.68, 0.965, 0.81).unwrap(),
    )
}

fn growth(background: &Background, redshift: f64) -> f64 {
    growth_states(background, &|_| 1.0, &[1.0 / (1.0 + redshift)]).unwrap()[0].growth
}

/// Values worked out independently, in another language, with Ωm 0.31, Ωb 0.049, h 0.68, n_s 0.965, σ8 0.81, damping
/// 0.5 Mpc/h, T = 1; given to seven digits, of which the last but one is good: 1e-6.
#[test]
fn worked_values() {
    let (background, power) = universe();
    for (distance, redshift, expected) in
        [(50.0, 0.5, 1.281150e-5), (50.0, 0.0, 1.108758e-5), (34.0, 1.0, 1.000510e-5)]
    {
        let amplitude = growth(&background, redshift);
        let setting = ClockSetting { redshift, distance, damping: 0.5, reached: (0.01, 0.2) };
        let contrast = clock_contrast(&background, &power, &setting, &|_| 1.0, &|_| amplitude).unwrap();
        close(contrast.ratio, expected, 1e-6, (distance, redshift));
    }
    assert_eq!(SECONDS_PER_YEAR, 31_557_600.0);
    let setting = ClockSetting { redshift: 0.5, distance: 50.0, damping: 0.5, reached: (0.01, 0.2) };
    let amplitude = growth(&background, 0.5);
    let contrast = clock_contrast(&background, &power, &setting, &|_| 1.0, &|_| amplitude).unwrap();
    near(contrast.seconds_per_year(), 404.3, 0.05, "seconds a year");
}

/// Source: SciPy 1.17.1's adaptive quadrature on pieces, relative tolerance 1e-11 (tests/reference/README.md). Growth
/// there is the closed form's, which differs by less than 1e-9.
#[test]
fn against_adaptive_quadrature() {
    let (background, power) = universe();
    for row in rows(include_str!("reference/clocks.csv")) {
        let [distance, redshift, low, high, ratio, share] = row[..] else { panic!("six columns") };
        let amplitude = growth(&background, redshift);
        let setting = ClockSetting { redshift, distance, damping: 0.5, reached: (low, high) };
        let contrast = clock_contrast(&background, &power, &setting, &|_| 1.0, &|_| amplitude).unwrap();
        close(contrast.ratio, ratio, 2e-9, ("ratio", &row));
        close(contrast.share, share, 2e-9, ("share", &row));
    }
}

#[test]
fn scales_as_it_should() {
    let (background, power) = universe();
    let setting = ClockSetting { redshift: 0.5, distance: 50.0, damping: 0.5, reached: (0.01, 0.2) };
    let contrast = |setting: &ClockSetting, distortion: f64, growth: f64| {
        clock_contrast(&background, &power, setting, &|_| distortion, &|_| growth).unwrap()
    };
    let plain = contrast(&setting, 1.0, 1.0);
    close(contrast(&setting, -2.0, 1.0).ratio, 2.0 * plain.ratio, 1e-14, "T");
    close(contrast(&setting, 1.0, 0.5).ratio, 0.5 * plain.ratio, 1e-14, "D");
    assert_eq!(contrast(&setting, 0.0, 1.0).ratio, 0.0);
    // Shares of neighbouring ranges add up to one.
    let share = |low, high| contrast(&ClockSetting { reached: (low, high), ..setting }, 1.0, 1.0).share;
    close(share(0.0, 0.03) + share(0.03, 0.1) + share(0.1, f64::INFINITY), 1.0, 1e-9, "shares");
    // Close together clocks agree like the distance: c² → d² times a constant.
    let near_by = |distance| contrast(&ClockSetting { distance, damping: 5.0, ..setting }, 1.0, 1.0).ratio;
    close(near_by(1e-3) / near_by(1e-4), 10.0, 1e-6, "distance");
}

/// T and D that depend on the wavenumber stand inside the integral: a T that is 1 in a range and 0 elsewhere leaves
/// the share.
#[test]
fn functions_of_wavenumber() {
    let (background, power) = universe();
    let setting = ClockSetting { redshift: 0.5, distance: 50.0, damping: 0.5, reached: (0.02, 0.1) };
    let inside = |k: f64| if (0.02..=0.1).contains(&k) { 1.0 } else { 0.0 };
    let whole = clock_contrast(&background, &power, &setting, &|_| 1.0, &|_| 1.0).unwrap();
    for part in [
        clock_contrast(&background, &power, &setting, &inside, &|_| 1.0).unwrap(),
        clock_contrast(&background, &power, &setting, &|_| 1.0, &inside).unwrap(),
    ] {
        close(part.ratio.powi(2), whole.share * whole.ratio.powi(2), 1e-13, "part");
        close(part.share, 1.0, 1e-14, "share");
    }
}

#[test]
fn bad_settings_are_named() {
    let (background, power) = universe();
    let good = ClockSetting { redshift: 0.5, distance: 50.0, damping: 0.5, reached: (0.01, 0.2) };
    for (setting, expected) in [
        (ClockSetting { redshift: -0.1, ..good }, "redshift"),
        (ClockSetting { distance: 0.0, ..good }, "clock_distance"),
        (ClockSetting { damping: f64::NAN, ..good }, "damping"),
        (ClockSetting { reached: (0.2, 0.01), ..good }, "wavenumber"),
    ] {
        match clock_contrast(&background, &power, &setting, &|_| 1.0, &|_| 1.0) {
            Err(CosmologyError::OutOfRange { name, .. }) => assert_eq!(name, expected),
            other => panic!("{other:?}"),
        }
    }
}
