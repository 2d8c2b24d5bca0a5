//! A user's power table in place of a built-in spectrum.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stdout,
    reason = "a test stops at the first surprise"
)]

mod common;

use common::{background, predict, rows, setup, values, worst};
use oddwell_cosmology::{CosmologyError, LinearPower, PowerShape, PowerTable};
use oddwell_model::{Model, ModelError, ModelSetup, Row, Space, Workspace};
use std::sync::Arc;

/// Eisenstein & Hu's spectrum in a table, of an amplitude that must not matter.
fn table(low: f64, high: f64, step: f64) -> PowerShape {
    let power = LinearPower::new(&PowerShape::EisensteinHu, 0.31, 0.049, 0.68, 0.965, 0.5).unwrap();
    let count = ((high / low).ln() / step).ceil() as usize;
    let place = |i: usize| low * (high / low).powf(i as f64 / count as f64);
    let wavenumbers: Vec<f64> = (0..=count).map(place).collect();
    let powers = wavenumbers.iter().map(|&k| power.power(k)).collect();
    PowerShape::Table(Arc::new(PowerTable::new(wavenumbers, powers).unwrap()))
}

fn all_rows() -> Vec<Row> {
    let mut all = rows(Space::Separation, &[0, 1, 2, 3, 4], &[25.0, 60.0, 104.0]);
    all.push(Row { edges: Some((36.0, 44.0)), at: 40.0, ..all[3] });
    all.extend(rows(Space::Fourier, &[0, 1, 2, 3, 4], &[0.03, 0.1, 0.3]));
    all
}

/// A cubic spline with spacing h errs by h⁴/384 of the fourth derivative, which for the acoustic feature at k is (100 k)⁴/20:
/// with h = 0.004 and 0.01 that is 3e-9 and 1e-7 of P at k = 0.3 h/Mpc. Seen: 3e-8, which is what two sets of knots differ
/// by, and 8e-8.
#[test]
fn a_fine_table_of_a_spectrum_is_that_spectrum() {
    for (step, tolerance) in [(0.004, 1e-7), (0.01, 3e-7)] {
        for fiducial in [None, Some(oddwell_cosmology::Background::new(0.3, 0.0, -1.0, 0.0).unwrap())] {
            let build = |power| {
                let mut definition = ModelSetup { power, ..setup(0.6, all_rows()) };
                definition.bins[0].fiducial = fiducial;
                Model::new(definition).unwrap()
            };
            // σ² of a table is over its own range: it must be wide for σ8 to be the same.
            let (tabulated, plain) = (build(table(1e-6, 300.0, step)), build(PowerShape::EisensteinHu));
            let values = values(&plain);
            let (got, expected) = (predict(&tabulated, &values), predict(&plain, &values));
            let off = worst(&got, &expected, &all_rows());
            println!("{step} {} {off:.1e}", fiducial.is_some());
            assert!(off < tolerance, "{step}: {off:e}");
            let mut long = vec![0.0; got.len()];
            tabulated.predict_by_integration(&values, &mut Workspace::new(), &mut long).unwrap();
            assert!(worst(&got, &long, &all_rows()) < 1e-12);
        }
    }
}

/// Rows in Fourier space ask for no more of a table than they see, unless they are remapped.
#[test]
fn a_table_must_reach_as_far_as_the_rows() {
    let fourier = rows(Space::Fourier, &[0, 1], &[0.05, 0.1, 0.2]);
    let build = |power: PowerShape, rows: Vec<Row>, remapped: bool| {
        let mut definition = ModelSetup { power, ..setup(0.6, rows) };
        definition.bins[0].fiducial = remapped.then(background);
        let model = Model::new(definition).unwrap();
        let mut out = vec![0.0; model.setup().rows.len()];
        model.predict(&values(&model), &mut Workspace::new(), &mut out).map(|()| out)
    };
    build(table(0.05, 0.2, 0.01), fourier.clone(), false).unwrap();
    build(table(0.03, 0.33, 0.01), fourier.clone(), true).unwrap();
    let separations = rows(Space::Separation, &[0], &[40.0]);
    for (power, rows, remapped) in [
        (table(0.06, 0.3, 0.01), fourier.clone(), false),
        (table(0.05, 0.19, 0.01), fourier.clone(), false),
        (table(0.05, 0.2, 0.01), fourier, true),
        (table(1e-3, 20.0, 0.01), separations.clone(), false),
        (table(1e-5, 2.0, 0.01), separations, false),
    ] {
        let error = build(power, rows, remapped).unwrap_err();
        let outside = matches!(error, ModelError::Cosmology(CosmologyError::OutsideTable { .. }));
        assert!(outside, "{error}");
        assert!(error.to_string().contains("is needed; give a table that covers that range"), "{error}");
    }
}
