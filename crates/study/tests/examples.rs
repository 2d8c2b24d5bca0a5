//! Studies that must be read: the documented example, the studies with closed-form answers, every way to write a quantity.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_cosmology::PowerShape;
use oddwell_model::{BinSetup, Effects, Model, ModelSetup, Pair, Row, Space};
use oddwell_study::{ParameterMap, Quantity, State, Study, StudyError, StudyFile, Warning};

/// The example of the study file's documentation, with the notes that show optional lines.
const DOCUMENTED: &str = r#"
title = "Two invented surveys"

[background]
omega_m = 0.31
omega_b = 0.049
h = 0.68
n_s = 0.965
sigma8 = { normal = [0.81, 0.01] }
omega_k = 0.0
w0 = -1.0
wa = 0.0
power = "eisenstein-hu"          # or "eisenstein-hu-smooth", or the path of a table: wavenumber,power

[prediction]                     # all optional; these are the defaults: every effect that is known
wide_angle = true
light_cone = true
lensing = true
damping = 0.5                    # Mpc/h
clock_distance = 50.0            # Mpc/h: how far apart the clocks of the derived clock contrast stand
# growth_index = 0.55            # or a prior; in place of the growth equation

[[survey]]
name = "larkfield"
multipoles = "larkfield-multipoles.csv"
covariance = "larkfield-covariance.csv"      # .csv, .npy or .fits, square; or:
# covariance_rows = "larkfield-rows.csv"     # bin,pair,multipole,separation: names its rows; may hold more than the table
# mock_count = 600                           # the covariance file was estimated from this many
noise = "gaussian"                           # "hartlap", "t", "percival" need mock_count or mocks
sight_line = "midpoint"                      # "first", "second"
keep = [{ separation = [24.0, 144.0], multipoles = [1, 3] }]   # rows that pass any entry; also wavenumber, bins, pairs; ends included; a shell counts if it lies inside

  [[survey.bin]]
  name = "near"
  redshift = 0.35                            # pair-weighted mean; or nodes = [[0.30, 0.4], [0.38, 0.6]] (redshift, weight)
  offset = { normal = [0.0, 10.0] }          # km/s, second minus first; default 0
  # growth_rate, growth_slope                # f and df/dln a of this bin, in place of the growth equation
  first  = { label = "bright", bias = { normal = [2.1, 0.05] }, magnification = { normal = [0.5, 0.05] }, evolution = { normal = [0.0, 0.3] }, bias_slope = 0.0 }
  second = { label = "faint", bias = 1.2, magnification = 0.2, evolution = 0.0 }   # or observed_density_slope in place of evolution

[[systematic]]                   # one error that moves several quantities together: quantity += by · amplitude
name = "luminosity-function"
amplitude = { normal = [0.0, 1.0] }
moves = [{ quantity = "larkfield.*.first.evolution", by = 0.3 }]

[[hypothesis]]
name = "gr"
departure = "none"

[[hypothesis]]
name = "constant"
departure = "constant"           # none, constant, dark-energy, power-law, step, per-bin, per-survey, finite-range, braneworld, f-of-r
felt_by = "light"                # light, matter, everything
tau = { uniform = [-30.0, 30.0] }   # power-law also slope; step also redshift, width; finite-range also range;
                                    # braneworld crossover; f-of-r log10_f_r0; per-bin, per-survey: one tau each, same prior

[sampling]                       # optional
effective_samples = 4000         # stop once the departure has this many, and every parameter passes
seed = 1
"#;

fn study(text: &str) -> Study {
    Study::resolve(StudyFile::parse("study.toml", text, "").unwrap(), &[]).unwrap()
}

#[test]
fn the_documented_example_is_read_as_documented() {
    let study = study(DOCUMENTED);
    let hypothesis = study.default_hypothesis();
    assert_eq!(hypothesis.name, "constant");
    let names: Vec<&str> = hypothesis.free.iter().map(|parameter| parameter.name.as_str()).collect();
    assert_eq!(
        names,
        [
            "background.sigma8",
            "larkfield.near.offset",
            "larkfield.near.first.bias",
            "larkfield.near.first.magnification",
            "larkfield.near.first.evolution",
            "systematic.luminosity-function",
            "departure.tau"
        ]
    );
    let survey = &study.file.surveys[0];
    assert_eq!(survey.bins[0].second.label.value, "faint");
    assert_eq!(survey.keep[0].separation.as_ref().unwrap().value, (24.0, 144.0));
    assert_eq!(survey.keep[0].multipoles.as_ref().unwrap().value, [1, 3]);
    assert_eq!(study.file.title.value, "Two invented surveys");
}

/// The part that the studies with closed-form answers share.
const KNOWN: &str = r#"title = "known"

[background]
omega_m = 0.31
omega_b = 0.049
h = 0.68
n_s = 0.965
sigma8 = 0.81

[prediction]
wide_angle = true
light_cone = false
lensing = true
damping = 0.5
"#;

fn known_survey(name: &str, noise: &str, bins: &[(&str, f64, f64, f64)]) -> String {
    let mut text = format!(
        "\n[[survey]]\nname = \"{name}\"\nmultipoles = \"{name}.csv\"\ncovariance = \"{name}-covariance.csv\"\n{noise}\nsight_line = \"midpoint\"\n"
    );
    for (bin, redshift, first, second) in bins {
        text.push_str(&format!(
            "\n[[survey.bin]]\nname = \"{bin}\"\nredshift = {redshift:?}\noffset = {{ normal = [0.0, 10.0] }}\n\
             first = {{ bias = {first:?}, magnification = {{ normal = [0.55, 0.05] }}, evolution = {{ normal = [0.3, 0.3] }} }}\n\
             second = {{ bias = {second:?}, magnification = {{ normal = [0.2, 0.04] }}, evolution = {{ normal = [-0.2, 0.3] }} }}\n"
        ));
    }
    text
}

fn known_hypothesis(name: &str, departure: &str) -> String {
    let rest = if departure == "none" { "" } else { "felt_by = \"light\"\ntau = { normal = [0.0, 3.0] }\n" };
    format!("\n[[hypothesis]]\nname = \"{name}\"\ndeparture = \"{departure}\"\n{rest}")
}

const P: (&str, f64, f64, f64) = ("p", 0.3, 2.1, 1.25);
const Q: (&str, f64, f64, f64) = ("q", 0.6, 2.25, 1.35);
const R: (&str, f64, f64, f64) = ("r", 0.95, 2.4, 1.45);

#[test]
fn the_studies_with_closed_form_answers_are_read() {
    let gaussian = "noise = \"gaussian\"";
    let (gr, constant) = (known_hypothesis("gr", "none"), known_hypothesis("constant", "constant"));
    let sampling = "\n[sampling]\neffective_samples = 4000\nseed = 11\n";
    let one = [KNOWN, &known_survey("alpha", gaussian, &[P]), &gr, &constant, sampling].concat();
    let two = [
        KNOWN,
        &known_survey("alpha", gaussian, &[P, Q]),
        &known_survey("beta", gaussian, &[R]),
        &gr,
        &constant,
        &known_hypothesis("tracking", "dark-energy"),
        &known_hypothesis("free", "per-bin"),
        sampling,
    ]
    .concat();
    let three = [
        KNOWN,
        &known_survey("alpha", "noise = \"hartlap\"\nmock_count = 300", &[P, Q, R]),
        &gr,
        &constant,
        sampling,
    ]
    .concat();
    let four = [
        KNOWN,
        &known_survey("alpha", "noise = \"t\"\nmock_count = 200", &[P, Q, R]),
        &gr,
        &constant,
        sampling,
    ]
    .concat();
    // Five nuisances a bin.
    for (text, bins, hypotheses) in [(&one, 1, 2), (&two, 3, 4), (&three, 3, 2), (&four, 3, 2)] {
        let study = study(text);
        assert_eq!(study.hypotheses.len(), hypotheses);
        assert_eq!(study.hypothesis(Some("gr")).unwrap().free.len(), 5 * bins);
        assert_eq!(study.default_hypothesis().free.len(), 5 * bins + 1);
        assert_eq!(study.file.sampling.seed.value, 11);
    }
    let free = study(&two);
    let free = free.hypothesis(Some("free")).unwrap();
    let taus: Vec<&str> = free.watched().into_iter().map(|index| free.free[index].name.as_str()).collect();
    assert_eq!(taus, ["departure.tau.alpha.p", "departure.tau.alpha.q", "departure.tau.beta.r"]);
    assert_eq!(study(&three).file.surveys[0].mock_count.as_ref().unwrap().value, 300);
    assert_eq!(study(&four).file.surveys[0].noise.value, "t");
}

/// Every departure with all its parameters held, every sight-line, growth given either way, as a table of predictions has them.
#[test]
fn a_study_with_everything_held_is_read_for_every_departure() {
    let departures = [
        "departure = \"none\"",
        "departure = \"constant\"\ntau = 0.7\nfelt_by = \"light\"",
        "departure = \"constant\"\ntau = 0.2\nfelt_by = \"matter\"",
        "departure = \"dark-energy\"\ntau = 0.2\nfelt_by = \"everything\"",
        "departure = \"power-law\"\ntau = 0.2\nslope = 3\nfelt_by = \"light\"",
        "departure = \"step\"\ntau = 0.2\nredshift = 0.5\nwidth = 0.1\nfelt_by = \"light\"",
        "departure = \"per-survey\"\ntau = 0.2",
        "departure = \"finite-range\"\ntau = 0.5\nrange = 30.0\nfelt_by = \"matter\"",
        "departure = \"braneworld\"\ncrossover = 0.9",
        "departure = \"f-of-r\"\nlog10_f_r0 = -4.5",
    ];
    for departure in departures {
        for (sight_line, growth) in
            [("first", ""), ("midpoint", ""), ("second", "growth_rate = 0.83\ngrowth_slope = -0.35\n")]
        {
            let light = !departure.contains("matter") && !departure.contains("everything");
            if !growth.is_empty()
                && (!light || departure.contains("braneworld") || departure.contains("f-of-r"))
            {
                continue;
            }
            let text = format!(
                "title = \"case\"\n\n[background]\nomega_m = 0.302\nomega_b = 0.0441\nh = 0.671\nn_s = 0.95\nsigma8 = 0.775\nomega_k = 0.0\nw0 = -1.0\nwa = 0.0\npower = \"eisenstein-hu-smooth\"\n\n[prediction]\nwide_angle = true\nlight_cone = false\nlensing = false\ndamping = 1.0\n\n[[survey]]\nname = \"s\"\nmultipoles = \"measured.csv\"\nsight_line = \"{sight_line}\"\n\n[[survey.bin]]\nname = \"q\"\nredshift = 1.09\noffset = 12.0\n{growth}first = {{ bias = 1.79, magnification = 0.33, evolution = -0.81, bias_slope = -0.7 }}\nsecond = {{ bias = 1.43, magnification = 0.28, evolution = 1.08, bias_slope = -0.1 }}\n\n[[hypothesis]]\nname = \"h\"\n{departure}\n"
            );
            let study = study(&text);
            let hypothesis = study.hypothesis(Some("h")).unwrap();
            assert!(hypothesis.free.is_empty());
            let setup = ModelSetup {
                bins: vec![BinSetup {
                    survey: "s".into(),
                    name: "q".into(),
                    nodes: vec![(1.09, 1.0)],
                    sight_line: study.file.surveys[0].sight_line.value,
                    growth_given: !growth.is_empty(),
                    observed_slopes: [false; 2],
                    fiducial: None,
                }],
                rows: vec![Row {
                    bin: 0,
                    pair: Pair::FirstSecond,
                    multipole: 1,
                    space: Space::Separation,
                    at: 50.0,
                    edges: None,
                }],
                power: PowerShape::EisensteinHuSmooth,
                effects: Effects { light_cone: false, lensing: false, ..Effects::default() },
                growth_index: false,
                smallest_damping: 1.0,
                departure: hypothesis.shape.0,
                felt_by: hypothesis.felt_by,
            };
            let model = Model::new(setup).unwrap();
            let layout = model.layout();
            let map = ParameterMap::new(hypothesis, layout.names()).unwrap();
            let mut values = layout.zeros();
            map.fill(&[], &mut values);
            assert_eq!(values[layout.index("s.q.first.bias").unwrap()], 1.79);
            assert_eq!(values[layout.index("s.q.offset").unwrap()], 12.0);
            let rate = if growth.is_empty() { 0.0 } else { 0.83 };
            assert_eq!(values[layout.index("s.q.growth_rate").unwrap()], rate);
            assert_eq!(values[layout.departure_slots()].len(), hypothesis.shape.parameters().len());
        }
    }
}

#[test]
fn every_way_to_write_a_quantity_reads_back_as_itself() {
    let ways = [
        "0.31",
        "1",
        "1e-3",
        "{ normal = [0.0, 10.0] }",
        "{ uniform = [-30, 30] }",
        "{ log_uniform = [0.1, 10.0] }",
        "{ half_normal = 2.0 }",
        "{ half_normal = [2.0] }",
        "{ beta = [2.0, 3.0] }",
        "{ gamma = [2.0, 0.5] }",
        "{ student_t = [0.0, 1.0, 4.0] }",
        "{ normal = [0.0, 10.0], within = [-5.0, 5.0] }",
        "{ within = [0.5, 1.0], beta = [2.0, 3.0] }",
        "{ same_as = \"larkfield.near.first.bias\" }",
    ];
    let read = |text: &str| {
        let study = DOCUMENTED.replace("offset = { normal = [0.0, 10.0] }", &format!("offset = {text}"));
        StudyFile::parse("study.toml", study, "").unwrap().surveys[0].bins[0].offset.value.clone()
    };
    for text in ways {
        let quantity = read(text);
        assert_eq!(read(&quantity.to_string()), quantity, "{text} became {quantity}");
        if let Quantity::Prior(spec) = &quantity {
            assert_eq!(spec.build().unwrap().arguments(), spec.numbers, "{text}");
        }
    }
    // Opened as tables of their own, or with dots, they mean the same.
    let dotted = DOCUMENTED.replace(
        "  second = { label = \"faint\", bias = 1.2, magnification = 0.2, evolution = 0.0 }",
        "  second.bias = 1.2\n  second.magnification = 0.2\n  second.evolution.normal = [0.0, 0.3]\n",
    );
    let study = study(&dotted);
    let quantity = study.default_hypothesis().quantity("larkfield.near.second.evolution").unwrap();
    assert!(matches!(quantity.state, State::Free(_)));
    let line = dotted.lines().position(|line| line.contains("second.evolution.normal")).unwrap() + 1;
    assert_eq!(quantity.given.origin.line(), Some(line));
}

#[test]
fn a_file_that_cannot_be_read_is_named() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("study.toml");
    let said = |path: &std::path::Path| match Study::read(path, &[]) {
        Err(error @ StudyError::Unreadable { .. }) => error.to_string(),
        other => panic!("{other:?}"),
    };
    let way_out = "give the path of a study file (`oddwell new DIR` writes one)";
    let (file, dir) = (path.display(), folder.path().display());
    assert_eq!(
        said(&path),
        format!("{file}: the study file cannot be read: there is no such file; {way_out}")
    );
    assert_eq!(
        said(folder.path()),
        format!("{dir}: the study file cannot be read: it is a folder; {way_out}")
    );
    std::fs::write(&path, b"title = \"\xff\"").unwrap();
    assert_eq!(
        said(&path),
        format!("{file}: the study file cannot be read: it is not UTF-8 text; {way_out}")
    );
    std::fs::write(&path, DOCUMENTED).unwrap();
    let study = Study::read(&path, &[]).unwrap();
    assert_eq!(study.file.path_of("a/b.csv"), folder.path().join("a/b.csv"));
}

#[test]
fn warnings_are_written_with_code_text_and_where() {
    let warning = Warning::PriorEdge { parameter: "departure.tau".into(), edge: 30.0 };
    assert_eq!(
        serde_json::to_value(&warning).unwrap(),
        serde_json::json!({
            "code": "prior-edge",
            "text": "the posterior of `departure.tau` piles up at the end of its prior, 30; widen the prior, or say why nothing lies beyond",
            "where": "departure.tau"
        })
    );
}
