//! The worked predictions of an independent implementation (`reference/README.md`), feature by feature.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stdout,
    reason = "a test stops at the first surprise"
)]

use oddwell_cosmology::{Background, PowerShape};
use oddwell_model::{
    BinSetup, Effects, FeltBy, Model, ModelSetup, Pair, Row, SightLine, Space, Workspace, departures,
};
use serde_json::Value;

/// Of a multipole's largest value: the reference is good to some 1e-9, and so is this crate's grid (the worst case seen is
/// 9e-9, where lensing nearly cancels the rest).
const TOLERANCE: f64 = 3e-8;
/// Where growth depends on scale. Halving the spacing of the growth table moves no value by more than 3e-8, and growth
/// itself agrees with SciPy to twelve digits, so the 7e-6 seen for f(R) is the reference's.
const TOLERANCE_SCALE_DEPENDENT: f64 = 1e-5;

/// Where the reference remaps. It differs by 1.4e-7 from this crate in ξ₄ at the smallest separation and by some 1e-9 at the
/// larger ones, as the end of an interpolation in separation would; the plain projection of `remapping.rs` agrees with this
/// crate to 5e-8 there.
const TOLERANCE_REMAPPED: f64 = 3e-7;

fn number(case: &Value, key: &str, default: f64) -> f64 {
    case.get(key).map_or(default, |value| value.as_f64().unwrap())
}

fn flag(case: &Value, key: &str) -> bool {
    case.get(key).is_some_and(|value| value.as_bool().unwrap())
}

fn numbers(value: &Value) -> Vec<f64> {
    value.as_array().unwrap().iter().map(|entry| entry.as_f64().unwrap()).collect()
}

struct Case {
    model: Model,
    values: Vec<f64>,
    expected: Vec<(u8, Vec<f64>)>,
}

fn build(case: &Value) -> Case {
    let space = if case["space"] == "fourier" { Space::Fourier } else { Space::Separation };
    let pair = match case.get("auto").map(|auto| auto.as_str().unwrap()) {
        None => Pair::FirstSecond,
        Some("first") => Pair::FirstFirst,
        Some(_) => Pair::SecondSecond,
    };
    let places: Vec<(f64, Option<(f64, f64)>)> = match case.get("shells") {
        Some(shells) => shells
            .as_array()
            .unwrap()
            .iter()
            .map(|shell| (shell[0].as_f64().unwrap(), shell[1].as_f64().unwrap()))
            .map(|(low, high)| (0.5 * (low + high), Some((low, high))))
            .collect(),
        None => numbers(&case[if space == Space::Fourier { "wavenumber" } else { "separation" }])
            .into_iter()
            .map(|at| (at, None))
            .collect(),
    };
    let expected: Vec<(u8, Vec<f64>)> = case["multipoles"]
        .as_object()
        .unwrap()
        .iter()
        .map(|(multipole, values)| (multipole.parse().unwrap(), numbers(values)))
        .collect();
    let rows = expected
        .iter()
        .flat_map(|&(multipole, _)| {
            places.iter().map(move |&(at, edges)| Row { bin: 0, pair, multipole, space, at, edges })
        })
        .collect();
    let form = &case["departure"];
    let felt_by =
        form.get("felt_by").map_or(FeltBy::Light, |who| FeltBy::parse(who.as_str().unwrap()).unwrap());
    let background = &case["background"];
    let wiggles = background.get("wiggles").is_none_or(|value| value.as_bool().unwrap());
    let damping = number(case, "damping", 0.5);
    let setup = ModelSetup {
        bins: vec![BinSetup {
            survey: "s".into(),
            name: "q".into(),
            nodes: vec![(number(case, "redshift", 0.0), 1.0)],
            sight_line: [SightLine::First, SightLine::Midpoint, SightLine::Second]
                [(2.0 * number(case, "sight_line", 0.5)) as usize],
            growth_given: case.get("growth_rate").is_some(),
            observed_slopes: [false; 2],
            fiducial: case.get("fiducial").map(|fiducial| {
                let number = |key: &str| fiducial[key].as_f64().unwrap();
                Background::new(number("omega_m"), number("omega_k"), number("w0"), number("wa")).unwrap()
            }),
        }],
        rows,
        power: if wiggles { PowerShape::EisensteinHu } else { PowerShape::EisensteinHuSmooth },
        effects: Effects {
            wide_angle: flag(case, "wide_angle"),
            light_cone: flag(case, "light_cone"),
            lensing: flag(case, "lensing"),
            ..Effects::default()
        },
        growth_index: case.get("growth_index").is_some(),
        smallest_damping: damping,
        departure: departures::find(form["form"].as_str().unwrap()).unwrap(),
        felt_by,
    };
    let model = Model::new(setup).unwrap();
    let mut values = model.layout().zeros();
    let mut set = |name: &str, value: f64| {
        let index = model.layout().index(name).unwrap_or_else(|| panic!("no slot {name}"));
        values[index] = value;
    };
    for key in ["omega_m", "omega_b", "h", "n_s", "sigma8", "omega_k", "w0", "wa"] {
        set(&format!("background.{key}"), number(background, key, 0.0));
    }
    set("prediction.damping", damping);
    set("prediction.growth_index", number(case, "growth_index", 0.0));
    for key in ["offset", "growth_rate", "growth_slope"] {
        set(&format!("s.q.{key}"), number(case, key, 0.0));
    }
    for tracer in ["first", "second"] {
        for key in ["bias", "magnification", "evolution", "bias_slope"] {
            set(&format!("s.q.{tracer}.{key}"), number(&case[tracer], key, 0.0));
        }
    }
    for (key, value) in form.as_object().unwrap() {
        match key.as_str() {
            "form" | "felt_by" => {}
            "f_r0" => set("departure.log10_f_r0", value.as_f64().unwrap().log10()),
            key => set(&format!("departure.{key}"), value.as_f64().unwrap()),
        }
    }
    Case { model, values, expected }
}

/// Worst difference from `expected`, in units of the multipole's largest value.
fn worst(got: &[f64], expected: &[(u8, Vec<f64>)]) -> f64 {
    let mut start = 0;
    let mut worst = 0.0_f64;
    for (_, values) in expected {
        let scale = values.iter().fold(0.0_f64, |scale, value| scale.max(value.abs()));
        for (offset, value) in values.iter().enumerate() {
            let off = (got[start + offset] - value).abs() / if scale > 0.0 { scale } else { 1.0 };
            worst = worst.max(off);
        }
        start += values.len();
    }
    worst
}

fn cases() -> Vec<Value> {
    serde_json::from_str(include_str!("reference/worked-multipoles.json")).unwrap()
}

#[test]
fn every_worked_case_is_reproduced() {
    let mut run = 0;
    for case in cases() {
        let name = case["name"].as_str().unwrap();
        let Case { model, values, expected } = build(&case);
        let mut got = vec![0.0; model.setup().rows.len()];
        model.predict(&values, &mut Workspace::new(), &mut got).unwrap();
        let off = worst(&got, &expected);
        let tolerance = match () {
            () if case.get("fiducial").is_some() => TOLERANCE_REMAPPED,
            () if model.has_kernels() => TOLERANCE,
            () => TOLERANCE_SCALE_DEPENDENT,
        };
        println!("{name:60} {off:.1e}");
        assert!(off < tolerance, "{name}: {off:e} of the largest value, above {tolerance:e}");
        // The comparison can fail: a prediction off by ten tolerances is caught.
        got[0] +=
            10.0 * tolerance * expected[0].1.iter().fold(1e-12_f64, |scale, value| scale.max(value.abs()));
        assert!(worst(&got, &expected) > tolerance, "{name}: the check does not see a wrong value");
        run += 1;
    }
    assert_eq!(run, 37);
}

#[test]
fn kernels_times_coefficients_are_the_plain_prediction() {
    for case in cases() {
        let Case { model, values, .. } = build(&case);
        if !model.has_kernels() {
            continue;
        }
        let mut workspace = Workspace::new();
        let (mut short, mut long) =
            (vec![0.0; model.setup().rows.len()], vec![0.0; model.setup().rows.len()]);
        model.predict(&values, &mut workspace, &mut short).unwrap();
        model.predict_by_integration(&values, &mut workspace, &mut long).unwrap();
        let mut coefficients = vec![0.0; model.coefficient_count()];
        model.coefficients(&values, &mut workspace, &mut coefficients).unwrap();
        let matrix = model.kernels(&values, &mut workspace).unwrap().matrix;
        let product = matrix * nalgebra::DVector::from_vec(coefficients);
        let scale = long.iter().fold(0.0_f64, |scale, value| scale.max(value.abs()));
        for row in 0..long.len() {
            // 1e-12 is some thousand roundings of sums of a thousand terms.
            assert!((product[row] - long[row]).abs() < 1e-12 * scale, "{} row {row}", case["name"]);
            assert!((short[row] - long[row]).abs() < 1e-12 * scale, "{} row {row}", case["name"]);
        }
    }
}
