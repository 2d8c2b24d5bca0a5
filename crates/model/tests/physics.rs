//! Identities, limits and signs that the prediction must have, over random backgrounds and tracers, each with its source.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stdout,
    reason = "a test stops at the first surprise"
)]

use oddwell_cosmology::PowerShape;
use oddwell_model::{
    BinSetup, BinState, Effects, FeltBy, Model, ModelSetup, Pair, Row, SightLine, Space, Tracer, Workspace,
    degeneracy, departures,
};
use proptest::prelude::*;

const SEPARATIONS: [f64; 4] = [24.0, 40.0, 72.0, 120.0];

fn setup(redshift: f64, sight_line: SightLine, departure: &str, felt_by: FeltBy, pair: Pair) -> ModelSetup {
    let row = |multipole, space, at| Row { bin: 0, pair, multipole, space, at, edges: None };
    let separations =
        (0..=4).flat_map(|l| SEPARATIONS.into_iter().map(move |s| row(l, Space::Separation, s)));
    let wavenumbers = (0..=4).flat_map(|l| [0.03, 0.09].into_iter().map(move |k| row(l, Space::Fourier, k)));
    ModelSetup {
        bins: vec![BinSetup {
            survey: "s".into(),
            name: "q".into(),
            nodes: vec![(redshift, 1.0)],
            sight_line,
            growth_given: false,
            observed_slopes: [false; 2],
            fiducial: None,
        }],
        rows: separations.chain(wavenumbers).collect(),
        power: PowerShape::EisensteinHu,
        effects: Effects::default(),
        growth_index: false,
        smallest_damping: 1.0,
        departure: departures::find(departure).unwrap(),
        felt_by,
    }
}

/// Ωm, b₁, b₂, s₁, s₂, e₁, e₂, slopes, offset.
type Draw = (f64, [f64; 2], [f64; 2], [f64; 2], [f64; 2], f64);

fn draws() -> impl Strategy<Value = Draw> {
    let two = |low: f64, high: f64| [low..high, low..high];
    (0.25..0.37f64, two(0.9, 2.6), two(0.0, 0.9), two(-1.5, 1.5), two(-0.9, 0.9), -20.0..20.0f64)
}

fn values(model: &Model, draw: &Draw, swapped: bool, departure: &[f64]) -> Vec<f64> {
    let (omega_m, bias, magnification, evolution, slope, offset) = draw;
    let mut values = model.layout().zeros();
    let mut set = |name: &str, value: f64| values[model.layout().index(name).unwrap()] = value;
    for (key, value) in [
        ("omega_m", *omega_m),
        ("omega_b", 0.048),
        ("h", 0.68),
        ("n_s", 0.96),
        ("sigma8", 0.81),
        ("w0", -1.0),
    ] {
        set(&format!("background.{key}"), value);
    }
    set("prediction.damping", 1.0);
    set("s.q.offset", if swapped { -offset } else { *offset });
    for (index, tracer) in [(0, "first"), (1, "second")] {
        let from = if swapped { 1 - index } else { index };
        set(&format!("s.q.{tracer}.bias"), bias[from]);
        set(&format!("s.q.{tracer}.magnification"), magnification[from]);
        set(&format!("s.q.{tracer}.evolution"), evolution[from]);
        set(&format!("s.q.{tracer}.bias_slope"), slope[from]);
    }
    let slots = model.layout().departure_slots();
    values[slots].copy_from_slice(departure);
    values
}

fn predict(model: &Model, values: &[f64]) -> Vec<f64> {
    let mut out = vec![0.0; model.setup().rows.len()];
    model.predict(values, &mut Workspace::new(), &mut out).unwrap();
    out
}

fn largest(values: &[f64], rows: &[Row], like: &Row) -> f64 {
    let same = values.iter().zip(rows).filter(|(_, row)| row.space == like.space);
    same.fold(0.0, |scale: f64, (value, _)| scale.max(value.abs()))
}

fn state(model: &Model, values: &[f64]) -> BinState {
    model.bin_state(values, &mut Workspace::new(), 0, 0, 0.1).unwrap()
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    #[test]
    fn swapping_the_tracers_and_their_sight_line_flips_odd_multipoles(draw in draws(), z in 0.15..1.4f64) {
        for (there, back) in [
            (SightLine::First, SightLine::Second),
            (SightLine::Midpoint, SightLine::Midpoint),
            (SightLine::Second, SightLine::First),
        ] {
            let one = Model::new(setup(z, there, "constant", FeltBy::Light, Pair::FirstSecond)).unwrap();
            let other = Model::new(setup(z, back, "constant", FeltBy::Light, Pair::FirstSecond)).unwrap();
            let forward = predict(&one, &values(&one, &draw, false, &[0.7]));
            let swapped = predict(&other, &values(&other, &draw, true, &[0.7]));
            for (index, row) in one.setup().rows.iter().enumerate() {
                let sign = if row.multipole % 2 == 1 { -1.0 } else { 1.0 };
                let scale = largest(&forward, &one.setup().rows, row);
                prop_assert!((forward[index] - sign * swapped[index]).abs() < 1e-12 * scale, "{row:?}");
            }
        }
    }

    #[test]
    fn equal_tracers_have_no_odd_multipole_at_the_midpoint(draw in draws(), z in 0.15..1.4f64) {
        let model = Model::new(setup(z, SightLine::Midpoint, "constant", FeltBy::Light, Pair::FirstSecond)).unwrap();
        let (omega_m, b, s, e, slope, _) = draw;
        let same = (omega_m, [b[0]; 2], [s[0]; 2], [e[0]; 2], [slope[0]; 2], 0.0);
        let prediction = predict(&model, &values(&model, &same, false, &[0.7]));
        for (value, row) in prediction.iter().zip(&model.setup().rows) {
            if row.multipole % 2 == 1 {
                prop_assert!(value.abs() < 1e-14 * largest(&prediction, &model.setup().rows, row), "{row:?} {value}");
            }
        }
    }

    /// The same error δe in both tracers is δτ = −δe f/(1.5 Ωm(a)), at every separation: from R of Challinor & Lewis
    /// 2011, PRD 84, 043516.
    #[test]
    fn a_common_evolution_bias_is_a_departure_felt_by_light(draw in draws(), z in 0.15..1.4f64, delta in -2.0..2.0f64) {
        let model = Model::new(setup(z, SightLine::Midpoint, "constant", FeltBy::Light, Pair::FirstSecond)).unwrap();
        let mut moved = draw;
        moved.3 = [moved.3[0] + delta, moved.3[1] + delta];
        let reference = values(&model, &draw, false, &[0.0]);
        let tau = degeneracy::tau_of_evolution_bias(&state(&model, &reference), delta);
        let by_evolution = predict(&model, &values(&model, &moved, false, &[0.0]));
        let by_tau = predict(&model, &values(&model, &draw, false, &[tau]));
        for ((one, other), row) in by_evolution.iter().zip(&by_tau).zip(&model.setup().rows) {
            prop_assert!((one - other).abs() < 1e-12 * largest(&by_tau, &model.setup().rows, row));
        }
        let back = degeneracy::evolution_bias_of(&state(&model, &reference), tau);
        prop_assert!((back - delta).abs() < 1e-12);
    }

    /// R_X = f[−H′/H − (2−5s_X)/(r̃H) − 5s_X + e_X] + (3/2) Ωm(a) (G − T), whatever the growth equation's G: the
    /// acceleration terms of R and Euler's equation (Challinor & Lewis 2011, PRD 84, 043516).
    #[test]
    fn the_response_obeys_the_identity_for_each_of_who_feels_it(draw in draws(), z in 0.15..1.4f64, tau in -0.3..0.3f64) {
        for felt_by in FeltBy::ALL {
            let model = Model::new(setup(z, SightLine::Midpoint, "constant", felt_by, Pair::FirstSecond)).unwrap();
            let state = state(&model, &values(&model, &draw, false, &[tau]));
            let gravity = if felt_by.reaches_matter() { 1.0 + tau } else { 1.0 };
            let light = if felt_by.reaches_light() { 1.0 + tau } else { 1.0 };
            for Tracer { magnification_bias, evolution_bias, bias, bias_slope } in [state.first, state.second] {
                let tracer = Tracer { magnification_bias, evolution_bias, bias, bias_slope };
                let epoch = &state.epoch;
                let five_s = 5.0 * magnification_bias;
                let geometry = (2.0 - five_s) / (epoch.reduced_distance * epoch.conformal_hubble);
                let expected = state.growth.rate * (-epoch.conformal_hubble_slope - geometry - five_s + evolution_bias)
                    + 1.5 * epoch.matter_fraction * (gravity - light);
                let got = tracer.response(epoch, &state.growth, state.time_distortion, &Effects::default());
                // f′ comes from the equation itself, so the identity holds to rounding.
                prop_assert!((got - expected).abs() < 1e-11 * (1.0 + expected.abs()), "{felt_by}: {got} {expected}");
            }
        }
    }

    #[test]
    fn a_departure_of_zero_is_general_relativity(draw in draws(), z in 0.15..1.4f64) {
        let none = Model::new(setup(z, SightLine::First, "none", FeltBy::Light, Pair::FirstSecond)).unwrap();
        let expected = predict(&none, &values(&none, &draw, false, &[]));
        // What each limit leaves of τ: growth and T are off by no more than some τ.
        for (shape, felt_by, parameters, tolerance) in [
            ("constant", FeltBy::Everything, &[0.0][..], 1e-13_f64),
            ("constant", FeltBy::Matter, &[0.0][..], 1e-13),
            ("constant", FeltBy::Light, &[0.0][..], 1e-13),
            ("dark-energy", FeltBy::Everything, &[0.0][..], 1e-13),
            ("power-law", FeltBy::Matter, &[0.0, 2.0][..], 1e-13),
            ("braneworld", FeltBy::Everything, &[1e9][..], 1e-8),
            ("f-of-r", FeltBy::Everything, &[-16.0][..], 1e-8),
            ("finite-range", FeltBy::Everything, &[0.4, 1e-9][..], 1e-8),
        ] {
            let model = Model::new(setup(z, SightLine::First, shape, felt_by, Pair::FirstSecond)).unwrap();
            let got = predict(&model, &values(&model, &draw, false, parameters));
            for ((got, expected_value), row) in got.iter().zip(&expected).zip(&none.setup().rows) {
                let scale = largest(&expected, &none.setup().rows, row);
                // Interpolating growth in k, where there is a table, costs 1e-9 at most.
                let bound = tolerance.max(if model.has_kernels() { 0.0 } else { 1e-9 }) * scale;
                prop_assert!((got - expected_value).abs() < bound, "{shape} {felt_by} {row:?}");
            }
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 12, failure_persistence: None, ..ProptestConfig::default() })]

    /// A field whose range is far beyond every scale is felt everywhere: the constant shape, through growth, T and the k
    /// integrals alike. At the smallest wavenumber, 1e-4 h/Mpc, a²/(λk)² is 1e-16; what is left is the interpolation of a
    /// table in k of numbers that are all the same.
    #[test]
    fn an_infinite_range_is_the_constant(draw in draws(), z in 0.15..1.4f64, tau in -0.3..0.8f64, line in 0..3usize) {
        for felt_by in FeltBy::ALL {
            let sight_line = SightLine::ALL[line];
            let constant = Model::new(setup(z, sight_line, "constant", felt_by, Pair::FirstSecond)).unwrap();
            let range = Model::new(setup(z, sight_line, "finite-range", felt_by, Pair::FirstSecond)).unwrap();
            let expected = predict(&constant, &values(&constant, &draw, false, &[tau]));
            let got = predict(&range, &values(&range, &draw, false, &[tau, 1e12]));
            for ((got, expected_value), row) in got.iter().zip(&expected).zip(&constant.setup().rows) {
                let scale = largest(&expected, &constant.setup().rows, row);
                prop_assert!((got - expected_value).abs() < 1e-11 * scale, "{felt_by} {row:?}");
            }
            // And it is τ that does it.
            let none = predict(&constant, &values(&constant, &draw, false, &[0.0]));
            let moved = none.iter().zip(&expected).any(|(one, other)| one != other);
            prop_assert!(moved || tau == 0.0, "{felt_by}");
        }
    }
}

/// McDonald 2009 (JCAP 11, 026): the gravitational-redshift term alone gives |Im P| = (3/2) Ωm (H/k) |b₁ − b₂| P for the
/// coefficient of μ, with Ωm at the epoch, and P₃ none of it.
#[test]
fn gravitational_redshift_alone_is_mcdonalds() {
    let only = Effects {
        doppler: false,
        acceleration: false,
        gravitational_redshift: true,
        offset: false,
        wide_angle: false,
        light_cone: false,
        lensing: false,
    };
    let definition = ModelSetup {
        effects: only,
        ..setup(0.7, SightLine::Midpoint, "none", FeltBy::Light, Pair::FirstSecond)
    };
    let model = Model::new(definition).unwrap();
    let draw = (0.31, [2.2, 1.1], [0.5, 0.2], [0.3, -0.2], [0.0; 2], 0.0);
    let values = values(&model, &draw, false, &[]);
    let prediction = predict(&model, &values);
    let state = state(&model, &values);
    for (value, row) in prediction.iter().zip(&model.setup().rows) {
        if row.space == Space::Fourier && row.multipole == 1 {
            let power = model.spectrum(&values, &[row.at]).unwrap()[0] * state.growth.growth.powi(2);
            let hubble_over_k = state.epoch.conformal_hubble / row.at;
            let expected = 1.5 * state.epoch.matter_fraction * hubble_over_k * (2.2 - 1.1) * power;
            // P comes from between the knots: 1e-11 of itself.
            assert!((value.abs() / expected - 1.0).abs() < 1e-10, "{value} {expected}");
            // R₁ = R₂ = −(3/2) Ωm: R₁b₂ − R₂b₁ = (3/2) Ωm (b₁ − b₂).
            assert!(*value > 0.0);
        }
        if row.multipole == 3 {
            assert!(value.abs() < 1e-16 * largest(&prediction, &model.setup().rows, row));
        }
    }
}

/// Common practice, no source: light from the bottom of a well reaches us redder, and a source that approaches looks
/// bluer. One wave along the line of sight, δ = ε cos kx, matter falling towards its crests (v = −ε f (H/k) sin kx from
/// continuity) and wells at its crests (Ψ = −ε (3/2) Ωm (H/k)² cos kx): galaxies are moved to where their redshift puts
/// them, x + v/H − Ψ/H, and counted. Their Fourier amplitude must be b + f + i (H/k) R, sign included.
#[test]
fn light_from_a_well_is_redder_and_an_approaching_source_is_bluer() {
    let definition = ModelSetup {
        effects: Effects { doppler: false, acceleration: false, ..Effects::default() },
        ..setup(0.5, SightLine::Midpoint, "constant", FeltBy::Light, Pair::FirstSecond)
    };
    let model = Model::new(definition).unwrap();
    let draw = (0.31, [2.2, 1.1], [0.4, 0.4], [0.0; 2], [0.0; 2], 0.0);
    let state = state(&model, &values(&model, &draw, false, &[0.0]));
    let (f, hubble) = (state.growth.rate, state.epoch.conformal_hubble);
    // A wave long enough for H/k to show.
    let (k, epsilon, bias) = (2.0 * hubble, 1e-5, state.first.bias);
    let points = 4096;
    let (mut real, mut imaginary) = (0.0, 0.0);
    for i in 0..points {
        let x = std::f64::consts::TAU * (f64::from(i) + 0.5) / f64::from(points) / k;
        let velocity = -epsilon * f * hubble / k * (k * x).sin();
        let potential = -epsilon * 1.5 * state.epoch.matter_fraction * (hubble / k).powi(2) * (k * x).cos();
        let seen = x + velocity / hubble - potential / hubble;
        let count = 1.0 + bias * epsilon * (k * x).cos();
        real += count * (k * seen).cos();
        imaginary -= count * (k * seen).sin();
    }
    // δ has amplitude ε/2 at +k.
    let scale = 2.0 / epsilon / f64::from(points);
    let response =
        state.first.response(&state.epoch, &state.growth, state.time_distortion, &model.setup().effects);
    // Second order in ε = 1e-5.
    assert!((real * scale - (bias + f)).abs() < 1e-4, "{} {}", real * scale, bias + f);
    assert!((imaginary * scale - hubble / k * response).abs() < 1e-4, "{} {response}", imaginary * scale);
    assert!(response < -0.5, "gravitational redshift is a negative response");
}
