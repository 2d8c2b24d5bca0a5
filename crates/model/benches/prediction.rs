//! One prediction, by what moves between two of them: nuisances alone, the background too, growth that depends on scale.
//!
//! Three bins, fifteen shells of 8 Mpc/h from 24 to 144 Mpc/h. Every iteration moves every quantity that it says moves,
//! so that nothing is kept from the one before.

#![allow(missing_docs, clippy::unwrap_used, reason = "a benchmark stops at the first surprise")]

use criterion::{Criterion, criterion_group, criterion_main};
use oddwell_cosmology::{Background, PowerShape};
use oddwell_model::{
    BinSetup, Effects, FeltBy, Model, ModelSetup, Pair, Row, SightLine, Space, Workspace, departures,
};
use std::hint::black_box;

const REDSHIFTS: [f64; 3] = [0.35, 0.7, 1.1];
const SHELLS: usize = 15;

fn model(
    multipoles: &[u8],
    departure: &str,
    felt_by: FeltBy,
    fiducial: Option<Background>,
) -> (Model, Vec<f64>) {
    let bins = REDSHIFTS.iter().enumerate().map(|(index, &redshift)| BinSetup {
        survey: "s".into(),
        name: format!("q{index}"),
        nodes: vec![(redshift, 1.0)],
        sight_line: SightLine::Midpoint,
        growth_given: false,
        observed_slopes: [false; 2],
        fiducial,
    });
    let mut rows = Vec::new();
    for bin in 0..REDSHIFTS.len() {
        for &multipole in multipoles {
            for shell in 0..SHELLS {
                let low = 24.0 + 8.0 * shell as f64;
                let edges = Some((low, low + 8.0));
                let (pair, space) = (Pair::FirstSecond, Space::Separation);
                rows.push(Row { bin, pair, multipole, space, at: low + 4.0, edges });
            }
        }
    }
    let setup = ModelSetup {
        bins: bins.collect(),
        rows,
        power: PowerShape::EisensteinHu,
        effects: Effects::default(),
        growth_index: false,
        smallest_damping: 0.5,
        departure: departures::find(departure).unwrap(),
        felt_by,
    };
    let model = Model::new(setup).unwrap();
    let mut values = model.layout().zeros();
    let mut set = |name: &str, value| values[model.layout().index(name).unwrap()] = value;
    for (name, value) in [
        ("background.omega_m", 0.31),
        ("background.omega_b", 0.049),
        ("background.h", 0.68),
        ("background.n_s", 0.965),
        ("background.sigma8", 0.81),
        ("background.w0", -1.0),
        ("prediction.damping", 0.5),
    ] {
        set(name, value);
    }
    for bin in 0..REDSHIFTS.len() {
        for (name, value) in [
            ("offset", 3.0),
            ("first.bias", 2.1),
            ("first.magnification", 0.6),
            ("first.evolution", -1.0),
            ("first.bias_slope", -0.3),
            ("second.bias", 1.2),
            ("second.magnification", 0.2),
            ("second.evolution", 0.5),
            ("second.bias_slope", -0.2),
        ] {
            set(&format!("s.q{bin}.{name}"), value);
        }
    }
    (model, values)
}

/// Moves slots by parts in a thousand, back and forth, never to the same place twice.
struct Walk {
    slots: Vec<(usize, f64)>,
    step: f64,
}

impl Walk {
    fn new(model: &Model, values: &[f64], names: &[&str]) -> Walk {
        let slots = names.iter().map(|name| model.layout().index(name).unwrap());
        Walk { slots: slots.map(|slot| (slot, values[slot])).collect(), step: 0.0 }
    }

    fn next(&mut self, values: &mut [f64]) {
        self.step += 1.0;
        for (index, &(slot, centre)) in self.slots.iter().enumerate() {
            values[slot] = centre * (1.0 + 1e-3 * (0.7 * self.step + index as f64).sin());
        }
    }
}

const BACKGROUND: [&str; 5] =
    ["background.omega_m", "background.h", "background.n_s", "background.sigma8", "background.w0"];
const NUISANCES: [&str; 6] = [
    "s.q0.first.bias",
    "s.q0.first.evolution",
    "s.q1.second.bias",
    "s.q1.offset",
    "s.q2.second.magnification",
    "departure.tau",
];

fn predictions(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("three bins, fifteen shells");
    for (name, multipoles) in [("dipole and octupole", &[1, 3][..]), ("five multipoles", &[0, 1, 2, 3, 4])] {
        let (model, mut values) = model(multipoles, "constant", FeltBy::Light, None);
        let mut walk = Walk::new(&model, &values, &NUISANCES);
        let mut workspace = Workspace::new();
        let mut coefficients = vec![0.0; model.coefficient_count()];
        group.bench_function(format!("{name}, background held, coefficients"), |bencher| {
            bencher.iter(|| {
                walk.next(&mut values);
                model.coefficients(black_box(&values), &mut workspace, &mut coefficients).unwrap();
                black_box(coefficients[0])
            });
        });
    }
    for (name, departure, felt_by, parameters) in [
        ("background free", "constant", FeltBy::Light, &[("tau", 0.3)][..]),
        ("background free, remapped", "constant", FeltBy::Light, &[("tau", 0.3)]),
        ("background and growth free", "constant", FeltBy::Everything, &[("tau", 0.1)]),
        (
            "background free, finite range felt by light",
            "finite-range",
            FeltBy::Light,
            &[("tau", 0.3), ("range", 20.0)],
        ),
        (
            "background free, finite range felt by matter",
            "finite-range",
            FeltBy::Matter,
            &[("tau", 0.1), ("range", 20.0)],
        ),
        ("background free, f-of-r", "f-of-r", FeltBy::Everything, &[("log10_f_r0", -5.0)]),
    ] {
        let fiducial = name.ends_with("remapped").then(|| Background::new(0.3, 0.0, -1.0, 0.0).unwrap());
        let (model, mut values) = model(&[0, 1, 2, 3, 4], departure, felt_by, fiducial);
        let mut moving: Vec<String> = BACKGROUND.map(String::from).to_vec();
        if departure == "f-of-r" {
            moving.pop(); // it needs w0 = −1
        }
        for (parameter, value) in parameters {
            let name = format!("departure.{parameter}");
            values[model.layout().index(&name).unwrap()] = *value;
            moving.push(name);
        }
        let moving: Vec<&str> = moving.iter().map(String::as_str).collect();
        let mut walk = Walk::new(&model, &values, &moving);
        let mut workspace = Workspace::new();
        let mut prediction = vec![0.0; model.setup().rows.len()];
        group.bench_function(format!("five multipoles, {name}"), |bencher| {
            bencher.iter(|| {
                walk.next(&mut values);
                model.predict(black_box(&values), &mut workspace, &mut prediction).unwrap();
                black_box(prediction[0])
            });
        });
    }
    group.finish();
}

criterion_group! {
    name = benches;
    config = Criterion::default().sample_size(30);
    targets = predictions
}
criterion_main!(benches);
