//! The slope of the density that a catalogue shows, in place of the evolution bias.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{predict, rows, set, setup, values};
use oddwell_cosmology::{Background, SPEED_OF_LIGHT};
use oddwell_model::{Model, Space, Workspace};

/// e = slope − 5 s (1 + 1/(r̃ H)) with a distance and a Hubble rate of this test's own: Simpson's rule over dz/E.
fn by_hand(slope: f64, s: f64, redshift: f64) -> f64 {
    let expansion = |z: f64| (0.31 * f64::powi(1.0 + z, 3) + 0.69).sqrt();
    let steps = 2000;
    let width = redshift / f64::from(steps);
    let weight = |step: i32| match step {
        0 => 1.0,
        step if step == steps => 1.0,
        step => f64::from(2 + 2 * (step % 2)),
    };
    let sum: f64 = (0..=steps).map(|step| weight(step) / expansion(width * f64::from(step))).sum();
    let distance = 2997.92458 * sum * width / 3.0;
    let hubble = expansion(redshift) / (1.0 + redshift) / 2997.92458;
    slope - 5.0 * s * (1.0 + 1.0 / (distance * hubble))
}

#[test]
fn a_slope_is_an_evolution_bias_of_its_own_redshift() {
    assert!((SPEED_OF_LIGHT - 299_792.458).abs() < 1e-9);
    let places = [30.0, 60.0, 110.0];
    for space in [Space::Separation, Space::Fourier] {
        let at: Vec<f64> =
            places.iter().map(|s| if space == Space::Fourier { 3.0 / s } else { *s }).collect();
        let rows = rows(space, &[0, 1, 2, 3], &at);
        for redshift in [0.2, 0.35, 0.9] {
            let plain = Model::new(setup(redshift, rows.clone())).unwrap();
            let mut sloped = setup(redshift, rows.clone());
            sloped.bins[0].observed_slopes = [true, false];
            let sloped = Model::new(sloped).unwrap();
            assert_eq!(plain.layout().len(), sloped.layout().len());
            assert_eq!(sloped.layout().index("s.q.first.evolution"), None);
            let (slope, s) = (2.4, 0.7);
            let mut with_slope = values_of(&sloped);
            set(&sloped, &mut with_slope, "s.q.first.observed_density_slope", slope);
            set(&sloped, &mut with_slope, "s.q.second.evolution", 0.8);
            let mut with_evolution = values(&plain);
            let evolution = by_hand(slope, s, redshift);
            set(&plain, &mut with_evolution, "s.q.first.evolution", evolution);
            let (found, expected) = (predict(&sloped, &with_slope), predict(&plain, &with_evolution));
            for (found, expected) in found.iter().zip(&expected) {
                assert!((found - expected).abs() < 1e-11 * expected.abs().max(1e-6), "{found} {expected}");
            }
            let state = sloped.bin_state(&with_slope, &mut Workspace::new(), 0, 0, 0.1).unwrap();
            assert!((state.first.evolution_bias / evolution - 1.0).abs() < 1e-11);
            assert_eq!(state.second.evolution_bias, 0.8);
        }
    }
}

/// Magnification and background move the evolution bias that a slope comes to; kernels and coefficients go along.
#[test]
fn it_follows_magnification_and_background() {
    let rows = rows(Space::Separation, &[1, 3], &[30.0, 60.0]);
    let mut wide = setup(0.4, rows);
    wide.bins[0].observed_slopes = [true, true];
    wide.bins[0].nodes = vec![(0.3, 0.25), (0.42, 0.5), (0.55, 0.25)];
    let model = Model::new(wide).unwrap();
    let mut at = values_of(&model);
    set(&model, &mut at, "s.q.first.observed_density_slope", 2.0);
    set(&model, &mut at, "s.q.second.observed_density_slope", 1.0);
    for (name, value) in
        [("s.q.first.magnification", 0.9), ("background.omega_m", 0.27), ("background.w0", -0.9)]
    {
        set(&model, &mut at, name, value);
        let mut workspace = Workspace::new();
        let kernels = model.kernels(&at, &mut workspace).unwrap();
        let mut coefficients = vec![0.0; model.coefficient_count()];
        model.coefficients(&at, &mut workspace, &mut coefficients).unwrap();
        let product = &kernels.matrix * nalgebra::DVector::from_vec(coefficients);
        let mut inside = vec![0.0; product.len()];
        model.predict_by_integration(&at, &mut workspace, &mut inside).unwrap();
        for ((product, plain), inside) in product.iter().zip(predict(&model, &at)).zip(inside) {
            assert!((product / plain - 1.0).abs() < 1e-12, "{product} {plain}");
            assert!((product / inside - 1.0).abs() < 1e-10, "{product} {inside}");
        }
        let value = |name: &str| at[model.layout().index(name).unwrap()];
        let background =
            Background::new(value("background.omega_m"), 0.0, value("background.w0"), 0.0).unwrap();
        for (node, redshift) in [0.3, 0.42, 0.55].into_iter().enumerate() {
            let epoch = background.epoch(redshift).unwrap();
            let state = model.bin_state(&at, &mut workspace, 0, node, 0.1).unwrap();
            let factor = 1.0 + 1.0 / (epoch.reduced_distance * epoch.conformal_hubble);
            let expected = 2.0 - 5.0 * value("s.q.first.magnification") * factor;
            assert!((state.first.evolution_bias / expected - 1.0).abs() < 1e-13);
        }
    }
}

/// Those of the common values that a model with slopes has.
fn values_of(model: &Model) -> Vec<f64> {
    let plain = Model::new(setup(0.4, Vec::new())).unwrap();
    let common = values(&plain);
    let mut values = model.layout().zeros();
    for (name, value) in plain.layout().names().iter().zip(common) {
        if let Some(slot) = model.layout().index(name) {
            values[slot] = value;
        }
    }
    values
}
