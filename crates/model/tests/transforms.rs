//! Transforms against SciPy's, and Fourier space against separation space for whole predictions.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stdout,
    reason = "a test stops at the first surprise"
)]

mod common;

use common::{predict, rows, set, setup, values, worst};
use oddwell_cosmology::{composite, spherical_bessel};
use oddwell_model::{Effects, FeltBy, Model, ModelSetup, Pair, SightLine, Space, Workspace, departures};
use std::f64::consts::PI;

/// Kaiser's even multipoles and the odd ones of Doppler, acceleration and gravitational redshift are one transform each,
/// which SciPy's FFTLog gives (reference/README.md). FFTLog is good to 1e-11 of each transform's largest value, and this
/// crate promises 1e-7 of it.
#[test]
fn scipys_fast_hankel_transform() {
    let table = include_str!("reference/hankel.csv");
    let table: Vec<Vec<f64>> = table
        .lines()
        .skip(1)
        .map(|line| line.split(',').map(|cell| cell.parse().unwrap()).collect())
        .collect();
    assert_eq!(table.len(), 70);
    for order in 0..=4_u8 {
        let lines: Vec<&Vec<f64>> = table.iter().filter(|line| line[1] == f64::from(order)).collect();
        let separations: Vec<f64> = lines.iter().map(|line| line[2]).collect();
        let rows = rows(Space::Separation, &[order], &separations);
        let effects =
            Effects { doppler: true, acceleration: true, gravitational_redshift: true, ..Effects::NONE };
        let model =
            Model::new(ModelSetup { effects, smallest_damping: 1.0, ..setup(0.6, rows.clone()) }).unwrap();
        let mut values = values(&model);
        set(&model, &mut values, "prediction.damping", 1.0);
        let state = model.bin_state(&values, &mut Workspace::new(), 0, 0, 0.1).unwrap();
        let pair = state.pair(Pair::FirstSecond, &effects);
        let ([b1, b2], [r1, r2], f) = (pair.bias, pair.response, pair.rate);
        let weight = match order {
            0 => b1 * b2 + (b1 + b2) * f / 3.0 + f * f / 5.0,
            1 => pair.hubble * (r1 * b2 - r2 * b1 + 0.6 * f * (r1 - r2)),
            2 => -(2.0 / 3.0 * f * (b1 + b2) + 4.0 / 7.0 * f * f),
            3 => -0.4 * pair.hubble * f * (r1 - r2),
            _ => 8.0 / 35.0 * f * f,
        };
        let scale = weight * state.growth.growth.powi(2);
        let expected: Vec<f64> = lines.iter().map(|line| scale * line[3]).collect();
        let off = worst(&predict(&model, &values), &expected, &rows);
        println!("order {order}: {off:.1e}");
        assert!(off < 1e-7, "order {order}: {off:e}");
    }
}

/// ξ₁ = ⟦Im P₁⟧₁, ξ₃ = −⟦Im P₃⟧₃ and the even ones alike, with every effect: wide angle and light cone are a factor s in one
/// space and a derivative in the other, so that nothing but the physics is common to the two.
#[test]
fn fourier_and_separation_space_agree_by_transform() {
    // Sixteen points on panels over which 120 Mpc/h turns by no more than 6 radians.
    let mut edges = vec![1e-5_f64];
    let end = 4.3_f64 / 0.5;
    while edges[edges.len() - 1] < end {
        let last = edges[edges.len() - 1];
        edges.push((last + (0.5 * last).min(0.05)).min(end));
    }
    let rule = composite(&edges, 16);
    let separations = [22.0, 35.0, 60.0, 90.0, 104.0, 120.0];
    for (sight_line, departure, felt_by, parameters) in [
        (SightLine::First, "constant", FeltBy::Light, &[0.5][..]),
        (SightLine::Midpoint, "constant", FeltBy::Light, &[0.5]),
        (SightLine::Second, "constant", FeltBy::Everything, &[0.2]),
        (SightLine::First, "f-of-r", FeltBy::Everything, &[-5.0]),
        (SightLine::Second, "finite-range", FeltBy::Light, &[0.7, 15.0]),
    ] {
        let build = |rows| {
            let mut definition = setup(0.6, rows);
            definition.bins[0].sight_line = sight_line;
            definition.departure = departures::find(departure).unwrap();
            definition.felt_by = felt_by;
            let model = Model::new(definition).unwrap();
            let mut values = values(&model);
            let slots = model.layout().departure_slots();
            values[slots].copy_from_slice(parameters);
            predict(&model, &values)
        };
        for multipole in 0..=4_u8 {
            let wanted = rows(Space::Separation, &[multipole], &separations);
            let direct = build(wanted.clone());
            let spectrum = build(rows(Space::Fourier, &[multipole], &rule.nodes));
            let sign = if matches!(multipole, 2 | 3) { -1.0 } else { 1.0 };
            let transformed: Vec<f64> = separations
                .iter()
                .map(|s| {
                    let points = rule.nodes.iter().zip(&rule.weights).zip(&spectrum);
                    let sum: f64 = points
                        .map(|((k, weight), power)| {
                            weight * k * k * power * spherical_bessel(usize::from(multipole), k * s)
                        })
                        .sum();
                    sign * sum / (2.0 * PI * PI)
                })
                .collect();
            let off = worst(&transformed, &direct, &wanted);
            println!("{departure} {sight_line:?} {multipole}: {off:.1e}");
            assert!(off < 1e-6, "{departure} {sight_line:?}, multipole {multipole}: {off:e}");
        }
    }
}
