//! Quantities that enter linearly: the coefficients are affine in all of them together, and the slopes are theirs.
#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{row, rows, setup, values};
use oddwell_cosmology::Background;
use oddwell_model::{
    FeltBy, Model, ModelError, ModelSetup, Pair, Row, SightLine, Space, Workspace, departures,
};
use proptest::prelude::*;

fn all_rows() -> Vec<Row> {
    let mut all = rows(Space::Separation, &[0, 1, 2, 3, 4], &[26.0, 60.0]);
    all.extend(rows(Space::Fourier, &[0, 1, 2, 3, 4], &[0.04, 0.12]));
    all.extend([Pair::FirstFirst, Pair::SecondSecond].map(|pair| row(pair, 2, Space::Separation, 40.0)));
    all
}

fn coefficients(model: &Model, values: &[f64], workspace: &mut Workspace) -> Vec<f64> {
    let mut out = vec![0.0; model.coefficient_count()];
    model.coefficients(values, workspace, &mut out).unwrap();
    out
}

fn setups() -> Vec<ModelSetup> {
    let mut all = Vec::new();
    for (sight_line, growth_given, nodes, fiducial) in [
        (SightLine::First, true, vec![(0.6, 1.0)], None),
        (SightLine::Midpoint, false, vec![(0.5, 0.4), (0.7, 0.6)], None),
        (SightLine::Second, false, vec![(0.6, 1.0)], Some(Background::new(0.3, 0.0, -1.0, 0.0).unwrap())),
    ] {
        let mut made = setup(0.6, all_rows());
        made.bins[0].sight_line = sight_line;
        made.bins[0].growth_given = growth_given;
        made.bins[0].nodes = nodes;
        made.bins[0].fiducial = fiducial;
        made.departure = departures::find("power-law").unwrap();
        all.push(made);
    }
    all
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 24, failure_persistence: None, ..ProptestConfig::default() })]

    /// c(v + Σ xᵢeᵢ) = c(v) + Σ xᵢ ∂c/∂vᵢ for steps of order one in all linear quantities at once, which no product of two
    /// of them would survive. Rounding is of the size of the terms that are added, which may cancel: 1e-12 of them is allowed.
    #[test]
    fn coefficients_are_affine_in_all_linear_quantities_together(
        steps in prop::collection::vec(-3.0..3.0, 12),
        bias in 0.6..3.0,
    ) {
        for setup in setups() {
            let model = Model::new(setup).unwrap();
            let mut values = values(&model);
            values[model.layout().index("s.q.second.bias").unwrap()] = bias;
            if model.setup().bins[0].growth_given {
                values[model.layout().index("s.q.growth_rate").unwrap()] = 0.7;
            }
            values[model.layout().index("departure.slope").unwrap()] = 1.5;
            let linear: Vec<usize> =
                (0..model.layout().len()).filter(|slot| model.enters_linearly(*slot)).collect();
            prop_assert_eq!(linear.len(), if model.setup().bins[0].growth_given { 9 } else { 8 });
            let slots = model.linear_slots(&linear).unwrap();
            let mut workspace = Workspace::new();
            let at = coefficients(&model, &values, &mut workspace);
            let mut slopes = vec![0.0; slots.len()];
            let before = values.clone();
            model.coefficient_slopes(&mut values, &workspace, &slots, &mut slopes);
            prop_assert_eq!(&before, &values);
            let mut expected = at.clone();
            let mut sizes: Vec<f64> = at.iter().map(|at| at.abs().max(1e-3)).collect();
            for (place, (slot, step)) in linear.iter().zip(&steps).enumerate() {
                values[*slot] += step;
                for (within, of) in slots.pattern()[place].iter().enumerate() {
                    let term = step * slopes[slots.start(place) + within];
                    expected[*of] += term;
                    sizes[*of] += term.abs();
                }
            }
            let found = coefficients(&model, &values, &mut workspace);
            for ((found, expected), size) in found.iter().zip(&expected).zip(&sizes) {
                prop_assert!((found - expected).abs() <= 1e-12 * size, "{} {} {}", found, expected, size);
            }
            // The check can fail: the quantities matter.
            let moved = steps[..linear.len()].iter().all(|step| step.abs() > 0.5);
            prop_assert!(!moved || found.iter().zip(&at).any(|(one, other)| (one - other).abs() > 1e-3 * at[0].abs()));
        }
    }
}

/// Of every shape, `tau` is linear where light alone feels it and k does not matter; no other parameter of any shape is.
#[test]
fn of_departures_only_an_amplitude_felt_by_light_is_linear() {
    for shape in departures::registry() {
        for felt_by in shape.allowed() {
            let mut setup = setup(0.6, rows(Space::Separation, &[1, 3], &[40.0]));
            (setup.departure, setup.felt_by) = (*shape, *felt_by);
            let model = Model::new(setup).unwrap();
            for slot in model.layout().departure_slots() {
                let name = &model.layout().names()[slot];
                let wanted = name.starts_with("departure.tau")
                    && *felt_by == FeltBy::Light
                    && !shape.scale_dependent();
                assert_eq!(model.enters_linearly(slot), wanted, "{} {felt_by} {name}", shape.name());
            }
        }
    }
}

#[test]
fn a_bias_is_refused() {
    let model = Model::new(setup(0.6, rows(Space::Separation, &[1], &[40.0]))).unwrap();
    let bias = model.layout().index("s.q.first.bias").unwrap();
    assert_eq!(
        model.linear_slots(&[bias]).unwrap_err(),
        ModelError::NotLinear { name: "s.q.first.bias".to_owned() }
    );
}
