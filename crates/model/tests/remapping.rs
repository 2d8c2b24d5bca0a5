//! Geometric remapping against a plain projection of predictions at the true separations.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stdout,
    reason = "a test stops at the first surprise"
)]

use oddwell_cosmology::{Background, PowerShape, composite, gauss_legendre, legendre};
use oddwell_model::{
    BinSetup, Effects, FeltBy, Model, ModelError, ModelSetup, Pair, Row, SightLine, Space, Workspace,
    departures,
};
use proptest::prelude::*;

const REDSHIFTS: [f64; 2] = [0.6, 0.8];

/// What one test case needs beyond the defaults.
#[derive(Clone)]
struct Case {
    truth: Background,
    departure: &'static str,
    parameters: Vec<f64>,
    felt_by: FeltBy,
    weights: [f64; 2],
    bias: [f64; 2],
}

fn case(truth: Background) -> Case {
    let (departure, parameters) = ("constant", vec![0.4]);
    Case { truth, departure, parameters, felt_by: FeltBy::Light, weights: [0.3, 0.7], bias: [2.1, 1.2] }
}

fn build(
    case: &Case,
    rows: Vec<Row>,
    nodes: &[(f64, f64)],
    fiducial: Option<Background>,
) -> (Model, Vec<f64>) {
    let setup = ModelSetup {
        bins: vec![BinSetup {
            survey: "s".into(),
            name: "q".into(),
            nodes: nodes.to_vec(),
            sight_line: SightLine::Midpoint,
            growth_given: false,
            observed_slopes: [false; 2],
            fiducial,
        }],
        rows,
        power: PowerShape::EisensteinHu,
        effects: Effects::default(),
        growth_index: false,
        smallest_damping: 1.0,
        departure: departures::find(case.departure).unwrap(),
        felt_by: case.felt_by,
    };
    let model = Model::new(setup).unwrap();
    let mut values = model.layout().zeros();
    for (name, value) in [
        ("background.omega_m", case.truth.omega_m),
        ("background.omega_b", 0.049),
        ("background.h", 0.68),
        ("background.n_s", 0.965),
        ("background.sigma8", 0.81),
        ("background.omega_k", case.truth.omega_k),
        ("background.w0", case.truth.w0),
        ("background.wa", case.truth.wa),
        ("prediction.damping", 1.0),
        ("s.q.offset", 6.0),
        ("s.q.first.bias", case.bias[0]),
        ("s.q.first.magnification", 0.7),
        ("s.q.first.evolution", -1.3),
        ("s.q.first.bias_slope", -0.4),
        ("s.q.second.bias", case.bias[1]),
        ("s.q.second.magnification", 0.2),
        ("s.q.second.evolution", 0.8),
        ("s.q.second.bias_slope", 0.3),
    ] {
        values[model.layout().index(name).unwrap()] = value;
    }
    let slots = model.layout().departure_slots();
    values[slots].copy_from_slice(&case.parameters);
    (model, values)
}

fn predict(case: &Case, rows: Vec<Row>, nodes: &[(f64, f64)], fiducial: Option<Background>) -> Vec<f64> {
    let (model, values) = build(case, rows, nodes, fiducial);
    let mut out = vec![0.0; model.setup().rows.len()];
    model.predict(&values, &mut Workspace::new(), &mut out).unwrap();
    out
}

fn row(pair: Pair, multipole: u8, space: Space, at: f64, edges: Option<(f64, f64)>) -> Row {
    Row { bin: 0, pair, multipole, space, at, edges }
}

/// All multipoles of the cross pair and the even ones of an auto pair, at points and over shells.
fn rows(space: Space) -> Vec<Row> {
    let places = match space {
        Space::Separation => [(22.0, None), (75.0, None), (104.0, None), (34.0, Some((30.0, 38.0)))],
        Space::Fourier => [(0.03, None), (0.11, None), (0.3, None), (0.07, Some((0.06, 0.08)))],
    };
    let all =
        [(Pair::FirstSecond, 0), (Pair::FirstSecond, 1), (Pair::FirstSecond, 2), (Pair::FirstSecond, 3)];
    let pairs = all.into_iter().chain([(Pair::FirstSecond, 4), (Pair::SecondSecond, 2)]);
    let at_place =
        |(pair, multipole)| places.into_iter().map(move |(at, edges)| row(pair, multipole, space, at, edges));
    pairs.flat_map(at_place).collect()
}

/// The multipoles of ξ(s̃, ν̃) or P(k̃, ν̃), from predictions without remapping at many true separations.
fn projected(case: &Case, wanted: &[Row], node: f64, fiducial: Background) -> Vec<f64> {
    let (assumed, truth) = (fiducial.epoch(node).unwrap(), case.truth.epoch(node).unwrap());
    let along = assumed.conformal_hubble / truth.conformal_hubble;
    let across = truth.transverse_distance / assumed.transverse_distance;
    // Forty points each way: ten times as many as the prediction takes.
    let rule = gauss_legendre(40);
    let (mut rows, mut weights, mut owners) = (Vec::new(), Vec::new(), Vec::new());
    for (owner, row) in wanted.iter().enumerate() {
        let shell = match row.edges {
            None => vec![(row.at, 1.0)],
            Some((low, high)) => {
                let rule = composite(&[low, high], 10);
                let norm = 3.0 / (high.powi(3) - low.powi(3));
                rule.nodes.iter().zip(&rule.weights).map(|(s, w)| (*s, norm * w * s * s)).collect()
            }
        };
        let l = usize::from(row.multipole);
        for (place, share) in shell {
            for (&nu, weight) in rule.nodes.iter().zip(&rule.weights) {
                let (parallel, transverse) = (nu * place, (1.0 - nu * nu).sqrt() * place);
                let (parallel, transverse, front) = match row.space {
                    Space::Separation => (along * parallel, across * transverse, 1.0),
                    Space::Fourier => {
                        (parallel / along, transverse / across, 1.0 / (along * across * across))
                    }
                };
                let at = parallel.hypot(transverse);
                for from in (row.multipole % 2..=4).step_by(2) {
                    rows.push(Row { at, multipole: from, edges: None, ..*row });
                    let angles = legendre(l, nu) * legendre(usize::from(from), parallel / at);
                    weights.push(share * front * (l as f64 + 0.5) * weight * angles);
                    owners.push(owner);
                }
            }
        }
    }
    let mut sums = vec![0.0; wanted.len()];
    for ((value, weight), owner) in predict(case, rows, &[(node, 1.0)], None).iter().zip(weights).zip(owners)
    {
        sums[owner] += weight * value;
    }
    sums
}

/// Worst difference, in units of the largest value of the pair's multipole in its space.
fn worst(got: &[f64], expected: &[f64], rows: &[Row]) -> f64 {
    let scale = |like: &Row| {
        let same = rows.iter().zip(expected).filter(|(row, _)| {
            (row.space, row.pair, row.multipole) == (like.space, like.pair, like.multipole)
        });
        same.fold(0.0, |scale: f64, (_, value)| scale.max(value.abs()))
    };
    let off = |((got, expected), row): ((&f64, &f64), &Row)| (got - expected).abs() / scale(row);
    got.iter().zip(expected).zip(rows).map(off).fold(0.0, f64::max)
}

fn backgrounds() -> [(Background, Background); 4] {
    let new = |omega_m, omega_k, w0, wa| Background::new(omega_m, omega_k, w0, wa).unwrap();
    [
        (new(0.27, 0.0, -0.85, 0.0), new(0.31, 0.0, -1.0, 0.0)),
        (new(0.34, 0.05, -1.1, 0.2), new(0.29, 0.0, -1.0, 0.0)),
        // α∥/α⊥ of 1.09 and 0.82: far beyond what a survey would publish.
        (new(0.2, 0.0, -0.6, 0.0), new(0.4, 0.0, -1.0, 0.0)),
        (new(0.6, 0.0, -1.0, 0.0), new(0.2, 0.0, -1.3, 0.0)),
    ]
}

#[test]
fn it_is_the_projection_of_the_prediction_at_true_separations() {
    for (truth, fiducial) in backgrounds() {
        for space in [Space::Separation, Space::Fourier] {
            let (case, rows) = (case(truth), rows(space));
            let nodes = [(REDSHIFTS[0], case.weights[0]), (REDSHIFTS[1], case.weights[1])];
            let got = predict(&case, rows.clone(), &nodes, Some(fiducial));
            let mut expected = vec![0.0; rows.len()];
            for (node, weight) in nodes {
                for (sum, value) in expected.iter_mut().zip(projected(&case, &rows, node, fiducial)) {
                    *sum += weight * value;
                }
            }
            let off = worst(&got, &expected, &rows);
            println!("{truth:?} {space:?} {off:.1e}");
            // Both interpolate the spectrum between the same knots, at different places: 1e-7 to 1e-6 of it.
            assert!(off < 5e-7, "{truth:?} {space:?}: {off:e}");
            let plain = predict(&case, rows.clone(), &nodes, None);
            assert!(worst(&plain, &expected, &rows) > 1e-3, "there must be something to remap");
        }
    }
}

/// Growth, and who feels what, as functions of the true wavenumber.
#[test]
fn where_growth_depends_on_scale() {
    let new = |omega_m, w0| Background::new(omega_m, 0.0, w0, 0.0).unwrap();
    for (departure, parameters, felt_by) in [
        ("f-of-r", vec![-5.0], FeltBy::Everything),
        ("finite-range", vec![0.5, 30.0], FeltBy::Light),
        ("finite-range", vec![0.5, 30.0], FeltBy::Matter),
    ] {
        let case = Case { departure, parameters, felt_by, ..case(new(0.27, -1.0)) };
        for space in [Space::Separation, Space::Fourier] {
            let rows = rows(space);
            let got = predict(&case, rows.clone(), &[(0.8, 1.0)], Some(new(0.33, -0.9)));
            let expected = projected(&case, &rows, 0.8, new(0.33, -0.9));
            let off = worst(&got, &expected, &rows);
            println!("{departure} {felt_by} {space:?} {off:.1e}");
            assert!(off < 5e-7, "{departure} {space:?}: {off:e}");
        }
    }
}

#[test]
fn kernels_times_coefficients_and_the_plain_path_agree() {
    let mut all = rows(Space::Separation);
    all.extend(rows(Space::Fourier));
    for (truth, fiducial) in backgrounds() {
        let case = case(truth);
        let nodes = [(REDSHIFTS[0], case.weights[0]), (REDSHIFTS[1], case.weights[1])];
        let (model, values) = build(&case, all.clone(), &nodes, Some(fiducial));
        let mut workspace = Workspace::new();
        let (mut short, mut long) = (vec![0.0; all.len()], vec![0.0; all.len()]);
        model.predict_by_integration(&values, &mut workspace, &mut long).unwrap();
        model.predict(&values, &mut workspace, &mut short).unwrap();
        let mut coefficients = vec![0.0; model.coefficient_count()];
        model.coefficients(&values, &mut workspace, &mut coefficients).unwrap();
        // From scratch: kernels must bring the background up to date themselves.
        let kernels = model.kernels(&values, &mut Workspace::new()).unwrap();
        let product: Vec<f64> =
            (kernels.matrix * nalgebra::DVector::from_vec(coefficients)).iter().copied().collect();
        // Some thousand roundings, and cancellation between multipoles.
        assert!(worst(&short, &long, &all) < 1e-12, "{:e}", worst(&short, &long, &all));
        assert!(worst(&product, &long, &all) < 1e-12, "{:e}", worst(&product, &long, &all));
    }
}

/// A workspace that has seen another background, another growth, another spectrum gives the same as a new one.
#[test]
fn nothing_is_left_of_the_prediction_before() {
    let rows = rows(Space::Separation);
    let fiducial = Background::new(0.31, 0.0, -1.0, 0.0).unwrap();
    let (model, reference) = build(&case(fiducial), rows.clone(), &[(0.8, 1.0)], Some(fiducial));
    let mut workspace = Workspace::new();
    let (mut first, mut again) = (vec![0.0; rows.len()], vec![0.0; rows.len()]);
    model.predict(&reference, &mut Workspace::new(), &mut first).unwrap();
    for (index, name) in model.layout().names().iter().enumerate() {
        let mut moved = reference.clone();
        moved[index] += 0.01;
        model.predict(&moved, &mut workspace, &mut again).unwrap();
        let mut fresh = vec![0.0; rows.len()];
        model.predict(&moved, &mut Workspace::new(), &mut fresh).unwrap();
        assert_eq!(again, fresh, "{name}");
        let unused = ["growth_rate", "growth_slope", "growth_index"].iter().any(|it| name.ends_with(it));
        assert_eq!(first == again, unused, "{name}");
        model.predict(&reference, &mut workspace, &mut again).unwrap();
        assert_eq!(first, again, "back from {name}");
    }
}

#[test]
fn only_where_a_bin_is_remapped_do_distances_enter_the_kernels() {
    let fiducial = Background::new(0.31, 0.0, -1.0, 0.0).unwrap();
    for (remapped, fiducial) in [(false, None), (true, Some(fiducial))] {
        let case = case(Background::new(0.3, 0.0, -0.9, 0.0).unwrap());
        let (model, values) = build(&case, rows(Space::Separation), &[(0.8, 1.0)], fiducial);
        for (name, changes) in [
            ("background.w0", remapped),
            ("background.wa", remapped),
            ("background.omega_k", remapped),
            ("background.omega_m", true),
            ("background.h", true),
            ("prediction.smearing", true),
            ("background.sigma8", false),
            ("s.q.first.bias", false),
            ("departure.tau", false),
        ] {
            let index = model.layout().index(name).unwrap();
            assert_eq!(model.layout().changes_kernels(index), changes, "{name}");
            let mut moved = values.clone();
            moved[index] += 0.02;
            let kernels = |values: &[f64]| model.kernels(values, &mut Workspace::new()).unwrap().matrix;
            assert_eq!(kernels(&values) != kernels(&moved), changes, "{name}");
        }
    }
}

#[test]
fn what_cannot_be_remapped_is_said() {
    let truth = Background::new(0.3, 0.0, -1.0, 0.0).unwrap();
    // Bounces at z = 2.5, but not before 0.8; and one that has no past at 0.8.
    let odd = Background::new(0.01, -1.2, -1.0, 0.0).unwrap();
    let (model, values) = build(
        &case(truth),
        rows(Space::Fourier),
        &[(0.8, 1.0)],
        Some(Background::new(5.0, 0.0, -1.0, 0.0).unwrap()),
    );
    let mut out = vec![0.0; model.setup().rows.len()];
    let error = model.predict(&values, &mut Workspace::new(), &mut out).unwrap_err();
    assert!(error.is_recoverable());
    assert!(matches!(&error, ModelError::Remapping { bin, .. } if bin == "s.q"), "{error}");
    assert!(error.to_string().contains("give a fiducial nearer to it"), "{error}");
    let setup = ModelSetup {
        bins: vec![BinSetup {
            survey: "s".into(),
            name: "q".into(),
            nodes: vec![(0.8, 1.0)],
            sight_line: SightLine::Midpoint,
            growth_given: false,
            observed_slopes: [false; 2],
            fiducial: Some(odd),
        }],
        rows: rows(Space::Separation),
        power: PowerShape::EisensteinHu,
        effects: Effects::default(),
        growth_index: false,
        smallest_damping: 1.0,
        departure: departures::find("none").unwrap(),
        felt_by: FeltBy::Light,
    };
    assert!(matches!(Model::new(setup), Err(ModelError::Cosmology(_))));
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 24, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn a_fiducial_background_that_is_the_true_one_changes_nothing(
        omega_m in 0.2..0.5f64, omega_k in -0.1..0.1f64, w0 in -1.3..-0.7f64, wa in -0.3..0.3f64,
        first in 0.8..2.5f64, second in 0.8..2.5f64, near in 0.1..0.6f64
    ) {
        let truth = Background::new(omega_m, omega_k, w0, wa).unwrap();
        let case = Case { bias: [first, second], ..case(truth) };
        let nodes = [(near, case.weights[0]), (REDSHIFTS[1], case.weights[1])];
        let mut all = rows(Space::Separation);
        all.extend(rows(Space::Fourier));
        let remapped = predict(&case, all.clone(), &nodes, Some(truth));
        let plain = predict(&case, all.clone(), &nodes, None);
        prop_assert!(worst(&remapped, &plain, &all) < 1e-12, "{:e}", worst(&remapped, &plain, &all));
    }
}
