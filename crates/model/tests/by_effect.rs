//! What each effect contributes adds up to the prediction.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stdout,
    reason = "a test stops at the first surprise"
)]

mod common;

use common::{predict, row, rows, set, setup, values, worst};
use oddwell_cosmology::Background;
use oddwell_model::{
    EffectName, Effects, FeltBy, Model, ModelSetup, Pair, Row, SightLine, Space, Workspace, departures,
};
use proptest::prelude::*;

fn all_rows() -> Vec<Row> {
    let mut all = rows(Space::Separation, &[0, 1, 2, 3, 4], &[26.0, 60.0, 110.0]);
    all.extend(rows(Space::Fourier, &[0, 1, 2, 3, 4], &[0.04, 0.12]));
    all.extend([Pair::FirstFirst, Pair::SecondSecond].map(|pair| row(pair, 2, Space::Separation, 40.0)));
    all.push(Row { edges: Some((36.0, 44.0)), ..row(Pair::FirstSecond, 1, Space::Separation, 40.0) });
    all
}

#[test]
fn names_are_one_each_and_the_columns_come_in_their_order() {
    let names: Vec<&str> = EffectName::ALL.iter().map(|effect| effect.name()).collect();
    assert_eq!(
        names,
        [
            "standard",
            "doppler",
            "acceleration",
            "gravitational_redshift",
            "offset",
            "wide_angle",
            "light_cone",
            "lensing"
        ]
    );
    let model = Model::new(setup(0.6, all_rows())).unwrap();
    let columns = model.by_effect(&values(&model), &mut Workspace::new()).unwrap();
    assert_eq!(columns.iter().map(|(effect, _)| *effect).collect::<Vec<_>>(), EffectName::ALL);
    for (effect, column) in &columns {
        for (value, row) in column.iter().zip(&model.setup().rows) {
            let here = (*effect == EffectName::Standard) == (row.multipole % 2 == 0);
            // (Acceleration and gravitational redshift are the same for both tracers: no octupole.)
            assert!(here || *value == 0.0, "{effect} {row:?}");
            assert!(!here || row.multipole == 3 || *value != 0.0, "{effect} {row:?}");
        }
    }
}

/// An effect's column is what changes when it is switched off; and its size is known where it is off.
#[test]
fn a_column_is_what_switching_it_off_takes_away() {
    let full = Model::new(setup(0.6, all_rows())).unwrap();
    let values = values(&full);
    let with = predict(&full, &values);
    for (effect, switch) in [
        (EffectName::Doppler, (|effects| effects.doppler = false) as fn(&mut Effects)),
        (EffectName::Acceleration, |effects| effects.acceleration = false),
        (EffectName::GravitationalRedshift, |effects| effects.gravitational_redshift = false),
        (EffectName::Offset, |effects| effects.offset = false),
        (EffectName::WideAngle, |effects| effects.wide_angle = false),
        (EffectName::LightCone, |effects| effects.light_cone = false),
        (EffectName::Lensing, |effects| effects.lensing = false),
    ] {
        let mut effects = Effects::default();
        switch(&mut effects);
        let model = Model::new(ModelSetup { effects, ..setup(0.6, all_rows()) }).unwrap();
        let mut workspace = Workspace::new();
        let without = predict(&model, &values);
        let columns = model.by_effect(&values, &mut workspace).unwrap();
        for (name, column) in &columns {
            assert!(*name != effect || column.iter().all(|value| *value == 0.0), "{effect} is off");
        }
        let mut left_out = vec![0.0; without.len()];
        model.contribution(effect, &values, &mut workspace, &mut left_out).unwrap();
        let sum: Vec<f64> = without.iter().zip(&left_out).map(|(one, other)| one + other).collect();
        assert!(worst(&sum, &with, &full.setup().rows) < 1e-12, "{effect}");
        assert!(worst(&without, &with, &full.setup().rows) > 1e-3, "{effect} is something");
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 32, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn the_columns_add_up(
        redshift in 0.2..1.3f64, line in 0..3usize, shape in 0..4usize, remapped: bool, switches in 0..128u32,
        bias in 0.8..2.5f64, offset in -20.0..20.0f64, evolution in -2.0..2.0f64, omega_m in 0.25..0.4f64
    ) {
        let on = |bit: u32| switches & (1 << bit) != 0;
        let effects = Effects {
            doppler: on(0),
            acceleration: on(1),
            gravitational_redshift: on(2),
            offset: on(3),
            wide_angle: on(4),
            light_cone: on(5),
            lensing: on(6),
        };
        let (departure, felt_by, parameters) = [
            ("none", FeltBy::Light, &[][..]),
            ("constant", FeltBy::Light, &[0.7]),
            ("finite-range", FeltBy::Light, &[0.7, 20.0]),
            ("f-of-r", FeltBy::Everything, &[-5.0]),
        ][shape];
        let mut definition = setup(redshift, all_rows());
        definition.bins[0].sight_line = SightLine::ALL[line];
        definition.bins[0].fiducial = remapped.then(|| Background::new(0.3, 0.0, -0.95, 0.0).unwrap());
        definition.effects = effects;
        definition.departure = departures::find(departure).unwrap();
        definition.felt_by = felt_by;
        let model = Model::new(definition).unwrap();
        let mut values = values(&model);
        for (name, value) in [
            ("background.omega_m", omega_m),
            ("s.q.offset", offset),
            ("s.q.first.bias", bias),
            ("s.q.second.evolution", evolution),
        ] {
            set(&model, &mut values, name, value);
        }
        let slots = model.layout().departure_slots();
        values[slots].copy_from_slice(parameters);
        let mut workspace = Workspace::new();
        let columns = model.by_effect(&values, &mut workspace).unwrap();
        let expected = predict(&model, &values);
        for (index, row) in model.setup().rows.iter().enumerate() {
            let sum: f64 = columns.iter().map(|(_, column)| column[index]).sum();
            let largest = columns.iter().map(|(_, column)| column[index].abs()).fold(0.0, f64::max);
            // Terms may cancel: of the largest of them.
            prop_assert!((sum - expected[index]).abs() <= 1e-12 * largest, "{row:?}: {sum} {}", expected[index]);
            if !effects.doppler && !effects.acceleration && !remapped && row.multipole % 2 == 1 {
                prop_assert_eq!(columns[1].1[index], 0.0);
            }
        }
    }
}
