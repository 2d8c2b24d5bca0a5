//! Smearing of the acoustic peak: what it must do to the spectrum and to what is seen of it.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stdout,
    reason = "a test stops at the first surprise"
)]

mod common;

use common::{predict, rows, set, setup, values, worst};
use oddwell_cosmology::{LinearPower, PowerShape, PowerTable, RawPower};
use oddwell_model::{Model, ModelError, ModelSetup, Space, Workspace};
use std::sync::Arc;

const WAVENUMBERS: [f64; 6] = [1e-4, 2e-3, 0.03, 0.09, 0.17, 0.4];

fn with_smearing(model: &Model, smearing: f64) -> Vec<f64> {
    let mut values = values(model);
    set(model, &mut values, "prediction.smearing", smearing);
    values
}

/// The formula, from the two shapes themselves: P's amplitude stands before both.
#[test]
fn it_is_the_smooth_spectrum_and_what_is_left_of_the_wiggles() {
    let model = Model::new(setup(0.6, rows(Space::Fourier, &[0], &WAVENUMBERS))).unwrap();
    let power = LinearPower::new(&PowerShape::EisensteinHu, 0.31, 0.049, 0.68, 0.965, 0.81).unwrap();
    let smooth = RawPower::new(&PowerShape::EisensteinHuSmooth, 0.31, 0.049, 0.68, 0.965).unwrap();
    let state = |values: &[f64]| model.bin_state(values, &mut Workspace::new(), 0, 0, 0.1).unwrap();
    for smearing in [0.0, 3.0, 6.0, 12.0] {
        let values = with_smearing(&model, smearing);
        let spectrum = model.spectrum(&values, &WAVENUMBERS).unwrap();
        let prediction = predict(&model, &values);
        let growth = state(&values).growth;
        for (index, k) in WAVENUMBERS.into_iter().enumerate() {
            let smooth = power.raw().1 * smooth.power(k);
            let left = (-(k * smearing).powi(2)).exp();
            let expected = (smooth + (power.power(k) - smooth) * left) * (-(0.5 * k).powi(2)).exp();
            // Another rule for σ8: 2e-10.
            assert!((spectrum[index] / expected - 1.0).abs() < 1e-9, "{smearing} {k}");
            let (b1, b2, f) = (2.1, 1.2, growth.rate);
            let kaiser = b1 * b2 + (b1 + b2) * f / 3.0 + f * f / 5.0;
            let seen = kaiser * growth.growth.powi(2) * spectrum[index];
            // P between the knots: 1e-8.
            assert!(
                (prediction[index] / seen - 1.0).abs() < 3e-8,
                "{smearing} {k}: {}",
                prediction[index] / seen
            );
        }
    }
}

/// Both shapes have T → 1: at k = 1e-4 they differ by 4e-5, and however much is smeared nothing is seen there.
#[test]
fn the_largest_scales_are_left_alone() {
    let model = Model::new(setup(0.6, rows(Space::Separation, &[0], &[40.0]))).unwrap();
    let at = |smearing: f64| model.spectrum(&with_smearing(&model, smearing), &[1e-4, 1e-3]).unwrap();
    let (without, all) = (at(0.0), at(1e6));
    assert!((all[0] / without[0] - 1.0).abs() < 1e-4, "{}", all[0] / without[0] - 1.0);
    assert!((all[1] / without[1] - 1.0).abs() < 1e-2, "{}", all[1] / without[1] - 1.0);
    assert!(all[0] != without[0]);
}

/// The peak of s²ξ₀ stands out of its neighbourhood less and less; ξ₀ away from it moves by as much as the two fits differ
/// without their wiggles, some per cent.
#[test]
fn the_peak_sinks() {
    let separations: Vec<f64> = (0..60).map(|i| 70.0 + f64::from(i)).collect();
    let model = Model::new(setup(0.6, rows(Space::Separation, &[0], &separations))).unwrap();
    let contrast = |smearing: f64| {
        let correlation = predict(&model, &with_smearing(&model, smearing));
        let weighted: Vec<f64> = correlation.iter().zip(&separations).map(|(xi, s)| xi * s * s).collect();
        let peak = weighted[20..].iter().fold(0.0_f64, |peak, value| peak.max(*value));
        let trough = weighted[..25].iter().fold(f64::INFINITY, |trough, value| trough.min(*value));
        (peak - trough, correlation[0])
    };
    let mut before = contrast(0.0);
    let start = before;
    for smearing in [2.0, 4.0, 6.0, 8.0] {
        let now = contrast(smearing);
        assert!(now.0 < before.0, "{smearing}: {now:?} after {before:?}");
        before = now;
    }
    assert!(before.0 < 0.7 * start.0, "{before:?} {start:?}");
    assert!((before.1 / start.1 - 1.0).abs() < 0.1, "{before:?} {start:?}");
}

#[test]
fn a_spectrum_without_wiggles_has_nothing_to_smear() {
    let rows = rows(Space::Separation, &[0, 1, 2, 3, 4], &[30.0, 100.0]);
    let definition = ModelSetup { power: PowerShape::EisensteinHuSmooth, ..setup(0.6, rows.clone()) };
    let model = Model::new(definition).unwrap();
    let (without, with) =
        (predict(&model, &with_smearing(&model, 0.0)), predict(&model, &with_smearing(&model, 5.0)));
    assert!(worst(&with, &without, &rows) < 1e-13);
}

/// With the kernels and without them, and where growth depends on scale.
#[test]
fn every_path_is_smeared() {
    let rows = rows(Space::Separation, &[0, 1, 2, 3, 4], &[30.0, 100.0]);
    let model = Model::new(setup(0.6, rows.clone())).unwrap();
    let values = with_smearing(&model, 5.0);
    let (short, mut long) = (predict(&model, &values), vec![0.0; rows.len()]);
    model.predict_by_integration(&values, &mut Workspace::new(), &mut long).unwrap();
    assert!(worst(&short, &long, &rows) < 1e-12);
    let without = predict(&model, &with_smearing(&model, 0.0));
    assert!(worst(&short, &without, &rows) > 1e-3);
}

#[test]
fn a_table_is_refused() {
    let k: Vec<f64> = (0..200).map(|i| 5e-5 * (0.068 * f64::from(i)).exp()).collect();
    let power = k.iter().map(|k| k / (1.0 + (k / 0.02).powi(3))).collect();
    let table = PowerShape::Table(Arc::new(PowerTable::new(k, power).unwrap()));
    let definition = ModelSetup { power: table, ..setup(0.6, rows(Space::Separation, &[0], &[40.0])) };
    let model = Model::new(definition).unwrap();
    let mut out = [0.0];
    model.predict(&with_smearing(&model, 0.0), &mut Workspace::new(), &mut out).unwrap();
    let error = model.predict(&with_smearing(&model, 5.0), &mut Workspace::new(), &mut out).unwrap_err();
    assert!(matches!(&error, ModelError::Setup { what, .. } if what == "prediction.smearing"));
    assert!(!error.is_recoverable());
    assert_eq!(
        error.to_string(),
        "prediction.smearing = 5: only the built-in spectra can be smeared: the smooth part of a power table is not known; \
         remove it and give a table that is smeared already, or `power = \"eisenstein-hu\"`"
    );
}
