//! What a study means: defaults, ties, systematics, joint priors, departures, overrides.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{BASE, changed, resolve};
use oddwell_model::FeltBy;
use oddwell_study::{
    FreePrior, Hypothesis, Kind, Origin, Override, ParameterMap, Quantity, State, Study, StudyFile, describe,
};

fn names(hypothesis: &Hypothesis) -> Vec<&str> {
    hypothesis.free.iter().map(|parameter| parameter.name.as_str()).collect()
}

fn study(text: &str) -> Study {
    resolve(text, &[]).unwrap()
}

/// The value of a quantity at a point.
fn value(hypothesis: &Hypothesis, name: &str, theta: &[f64]) -> f64 {
    hypothesis.quantity(name).unwrap().form.value(theta)
}

#[test]
fn quantities_follow_the_order_of_the_study() {
    let study = study(BASE);
    let all: Vec<&str> =
        study.default_hypothesis().quantities.iter().map(|each| each.name.as_str()).collect();
    let tracer =
        |path: &str| ["bias", "magnification", "evolution", "bias_slope"].map(|key| format!("{path}.{key}"));
    let mut expected: Vec<String> = ["omega_m", "omega_b", "h", "n_s", "sigma8", "omega_k", "w0", "wa"]
        .iter()
        .map(|key| format!("background.{key}"))
        .collect();
    expected.extend(["damping", "smearing", "clock_distance"].map(|key| format!("prediction.{key}")));
    for bin in ["larkfield.near", "larkfield.far"] {
        expected.push(format!("{bin}.offset"));
        expected.extend(tracer(&format!("{bin}.first")));
        expected.extend(tracer(&format!("{bin}.second")));
    }
    expected.extend(["systematic.luminosity-function".to_owned(), "departure.tau".to_owned()]);
    assert_eq!(all, expected);
}

#[test]
fn defaults_are_those_of_the_interface() {
    let study = study(BASE);
    let hypothesis = study.default_hypothesis();
    for (name, expected) in [
        ("background.omega_k", 0.0),
        ("background.w0", -1.0),
        ("background.wa", 0.0),
        ("prediction.smearing", 0.0),
        ("prediction.clock_distance", 50.0),
        ("larkfield.far.offset", 0.0),
        ("larkfield.near.first.bias_slope", 0.0),
    ] {
        let quantity = hypothesis.quantity(name).unwrap();
        assert_eq!(quantity.state, State::Held(expected), "{name}");
        assert_eq!(quantity.given.origin, Origin::Default, "{name}");
    }
    let text = BASE
        .replace("[prediction]\ndamping = 0.5\n", "")
        .replace("[sampling]\neffective_samples = 4000\nseed = 1\n", "");
    let file =
        StudyFile::parse("study.toml", text.replace("title = \"Two invented surveys\"", ""), "").unwrap();
    assert_eq!(file.title.value, "study");
    let effects = &file.prediction;
    assert!(effects.wide_angle.value && effects.light_cone.value && effects.lensing.value);
    assert_eq!(effects.damping.value, Quantity::Held(0.5));
    let sampling = &file.sampling;
    assert_eq!(
        (sampling.effective_samples.value, sampling.seed.value, sampling.ensembles.value),
        (4000, 1, 4)
    );
    let survey = &file.surveys[0];
    assert_eq!(survey.noise.value, "gaussian");
    assert_eq!(survey.sight_line.value, oddwell_model::SightLine::Midpoint);
    assert_eq!(survey.unit.value, oddwell_likelihood::LengthUnit::MegaparsecPerH);
    assert_eq!(survey.bins[1].first.label.value, "first");
}

#[test]
fn the_default_hypothesis_is_the_first_with_an_inferred_departure() {
    assert_eq!(study(BASE).default_hypothesis().name, "constant");
    let held = changed("tau = { uniform = [-30.0, 30.0] }", "tau = 0.3");
    assert_eq!(study(&held).default_hypothesis().name, "gr");
    // What is set on the command line does not change which hypothesis is meant.
    let set = resolve(BASE, &["departure.tau=0.5"]).unwrap();
    let hypothesis = set.hypothesis(None).unwrap();
    assert_eq!(hypothesis.name, "constant");
    assert_eq!(hypothesis.quantity("departure.tau").unwrap().state, State::Held(0.5));
    assert!(hypothesis.watched().is_empty());
}

#[test]
fn free_parameters_know_their_prior_and_their_line() {
    let study = study(BASE);
    let constant = study.hypothesis(Some("constant")).unwrap();
    assert_eq!(
        names(constant),
        [
            "background.sigma8",
            "larkfield.near.offset",
            "larkfield.near.first.evolution",
            "systematic.luminosity-function",
            "departure.tau"
        ]
    );
    assert_eq!(constant.watched(), [4]);
    assert_eq!(constant.felt_by, FeltBy::Light);
    let line = BASE.lines().position(|line| line.starts_with("tau")).unwrap() + 1;
    assert_eq!(constant.free[4].origin.line(), Some(line));
    let FreePrior::Own(spec) = &constant.free[4].prior else { panic!("tau has a prior of its own") };
    assert_eq!((spec.family, spec.numbers.as_slice()), ("uniform", &[-30.0, 30.0][..]));
    assert_eq!(constant.start(), [0.81, 0.0, 0.0, 0.0, 0.0]);
    let gr = study.hypothesis(Some("gr")).unwrap();
    assert_eq!(names(gr), &names(constant)[..4]);
    assert!(gr.watched().is_empty());
    let priors = constant.priors().unwrap();
    assert_eq!(priors.dimension(), 5);
    assert_eq!((priors.mean(0), priors.standard_deviation(1)), (0.81, 10.0));
    assert_eq!(priors.support(4), (-30.0, 30.0));
}

#[test]
fn ties_follow_chains_and_their_source_after_systematics() {
    // far.second follows far.first, which follows near.first; a systematic moves near.first and, by its star, all three.
    let text = changed(
        "evolution = 0.0 }\n\n[[systematic]]",
        "evolution = { same_as = \"larkfield.far.first.evolution\" } }\n\n[[systematic]]",
    )
    .replace("larkfield.*.second.evolution", "larkfield.*.first.evolution");
    let study = study(&text);
    let hypothesis = study.hypothesis(Some("gr")).unwrap();
    let (evolution, amplitude) = (
        hypothesis.free_index("larkfield.near.first.evolution").unwrap(),
        hypothesis.free_index("systematic.luminosity-function").unwrap(),
    );
    let mut theta = vec![0.0; hypothesis.free.len()];
    (theta[evolution], theta[amplitude]) = (0.1, 2.0);
    let expected = 0.1 + 0.3 * 2.0;
    for name in ["near.first", "far.first", "far.second"] {
        assert_eq!(value(hypothesis, &format!("larkfield.{name}.evolution"), &theta), expected, "{name}");
    }
    assert_eq!(value(hypothesis, "larkfield.near.second.evolution", &theta), 0.0);
    let far = hypothesis.quantity("larkfield.far.second.evolution").unwrap();
    let State::Tied(source) = far.state else { panic!("it is tied") };
    assert_eq!(hypothesis.quantities[source].name, "larkfield.far.first.evolution");
    assert!(far.moves.is_empty());
}

#[test]
fn systematics_add_up_and_stars_match_one_part() {
    let more = "[[systematic]]\nname = \"depth\"\namplitude = 2.0\nmoves = [{ quantity = \"*.*.second.evolution\", by = -0.5 }, { quantity = \"larkfield.near.second.magnification\", by = 0.01 }]\n\n[[hypothesis]]\nname = \"gr\"";
    let study = study(&changed("[[hypothesis]]\nname = \"gr\"", more));
    let hypothesis = study.hypothesis(Some("gr")).unwrap();
    let mut theta = vec![0.0; hypothesis.free.len()];
    theta[hypothesis.free_index("systematic.luminosity-function").unwrap()] = 1.0;
    for bin in ["near", "far"] {
        let quantity = hypothesis.quantity(&format!("larkfield.{bin}.second.evolution")).unwrap();
        assert_eq!(quantity.form.value(&theta), 0.3 - 0.5 * 2.0, "{bin}");
        assert_eq!(quantity.moves.len(), 2);
    }
    assert_eq!(value(hypothesis, "larkfield.near.second.magnification", &theta), 0.2 + 0.01 * 2.0);
    assert_eq!(value(hypothesis, "larkfield.far.second.magnification", &theta), 0.2);
    assert_eq!(value(hypothesis, "larkfield.near.first.evolution", &theta), 0.0);
}

const JOINT: &str = "[[joint_prior]]\nof = [\"departure.tau\", \"larkfield.near.first.bias\", \"larkfield.near.second.bias\"]\nmean = [0.1, 2.0, 1.0]\ncovariance = [[4.0, 0.2, 0.0], [0.2, 0.09, 0.01], [0.0, 0.01, 0.04]]\n\n[sampling]";

#[test]
fn a_joint_prior_infers_what_it_names_and_starts_at_the_number_given() {
    let text = changed("[sampling]", JOINT).replace("tau = { uniform = [-30.0, 30.0] }", "tau = 0.5");
    let study = study(&text);
    assert_eq!(study.default_hypothesis().name, "constant");
    let constant = study.default_hypothesis();
    let index = |name: &str| constant.free_index(name).unwrap();
    let (tau, first, second) =
        (index("departure.tau"), index("larkfield.near.first.bias"), index("larkfield.near.second.bias"));
    assert_eq!(constant.joint[0].of, [tau, first, second]);
    let start = constant.start();
    assert_eq!((start[tau], start[first], start[second]), (0.5, 2.1, 1.2));
    let priors = constant.priors().unwrap();
    assert_eq!((priors.mean(tau), priors.standard_deviation(first)), (0.1, 0.3));
    // General relativity has no tau: the marginal over the other two is left.
    let gr = study.hypothesis(Some("gr")).unwrap();
    let block = &gr.joint[0];
    assert_eq!(
        block.of,
        [
            gr.free_index("larkfield.near.first.bias").unwrap(),
            gr.free_index("larkfield.near.second.bias").unwrap()
        ]
    );
    assert_eq!(
        (block.mean.as_slice(), block.covariance.as_slice()),
        (&[2.0, 1.0][..], &[vec![0.09, 0.01], vec![0.01, 0.04]][..])
    );
    let FreePrior::Joint { block, position, .. } = gr.free[gr.joint[0].of[1]].prior else {
        panic!("it is joint")
    };
    assert_eq!((block, position), (0, 1));
}

#[test]
fn a_departure_of_each_bin_or_survey_has_one_parameter_for_each() {
    let more = "name = \"free\"\ndeparture = \"per-bin\"\ntau = { normal = [0.0, 3.0] }\n\n[[hypothesis]]\nname = \"fields\"\ndeparture = \"per-survey\"\nfelt_by = \"light\"\ntau = { normal = [0.0, 3.0] }\n\n[[hypothesis]]\nname = \"constant\"";
    let text = changed("name = \"constant\"", more);
    let study = study(&text);
    let free = study.hypothesis(Some("free")).unwrap();
    assert_eq!(names(free)[4..], ["departure.tau.larkfield.near", "departure.tau.larkfield.far"]);
    assert_eq!((free.watched(), free.felt_by), (vec![4, 5], FeltBy::Light));
    let fields = study.hypothesis(Some("fields")).unwrap();
    assert_eq!(names(fields)[4..], ["departure.tau.larkfield"]);

    let set = ["departure.tau=0.2", "departure.tau.larkfield.far=-1"];
    let set = resolve(&text, &set).unwrap();
    let free = set.hypothesis(Some("free")).unwrap();
    assert_eq!(free.quantity("departure.tau.larkfield.near").unwrap().state, State::Held(0.2));
    assert_eq!(free.quantity("departure.tau.larkfield.far").unwrap().state, State::Held(-1.0));
    let error = set.hypothesis(Some("constant")).unwrap_err().to_string();
    assert_eq!(
        error,
        "--set departure.tau.larkfield.far=-1: hypothesis `constant` has no quantity `departure.tau.larkfield.far`; the nearest known name is `departure.tau`"
    );
}

#[test]
fn who_feels_it_defaults_where_only_one_answer_is_possible() {
    let text = changed(
        "departure = \"constant\"\nfelt_by = \"light\"\ntau = { uniform = [-30.0, 30.0] }",
        "departure = \"braneworld\"\ncrossover = { log_uniform = [0.1, 10.0] }",
    );
    let study = study(&text);
    assert_eq!(study.default_hypothesis().felt_by, FeltBy::Everything);
    assert_eq!(study.hypothesis(Some("gr")).unwrap().felt_by, FeltBy::Light);
}

#[test]
fn what_is_set_takes_the_place_of_what_the_file_says() {
    let set = [
        "background.h = 0.7",
        "larkfield.near.second.bias={ normal = [1.2, 0.05], within = [1.0, 1.4] }",
        "prediction.growth_index=0.55",
        "larkfield.far.first.evolution=0.2",
        "systematic.luminosity-function=0",
        "background.h=0.71",
    ];
    let study = resolve(BASE, &set).unwrap();
    let hypothesis = study.hypothesis(None).unwrap();
    assert_eq!(hypothesis.quantity("background.h").unwrap().state, State::Held(0.71));
    assert_eq!(hypothesis.quantity("background.h").unwrap().given.origin, Origin::Set);
    assert_eq!(hypothesis.quantity("prediction.growth_index").unwrap().state, State::Held(0.55));
    assert_eq!(hypothesis.quantity("larkfield.far.first.evolution").unwrap().state, State::Held(0.2));
    assert_eq!(
        names(hypothesis),
        [
            "background.sigma8",
            "larkfield.near.offset",
            "larkfield.near.first.evolution",
            "larkfield.near.second.bias",
            "departure.tau"
        ]
    );
    let shown = describe(&study, hypothesis);
    let bias = shown.iter().find(|row| row.name == "larkfield.near.second.bias").unwrap();
    assert_eq!(
        (bias.value.as_str(), bias.origin.as_str(), bias.line),
        ("{ normal = [1.2, 0.05], within = [1.0, 1.4] }", "--set", None)
    );
}

#[test]
fn an_unknown_hypothesis_is_named_with_the_nearest() {
    let error = study(BASE).hypothesis(Some("constnat")).unwrap_err().to_string();
    assert_eq!(error, "study.toml: the study has no hypothesis `constnat`; did you mean `constant`?");
}

#[test]
fn a_hypothesis_is_described_row_by_row() {
    let text = changed("[sampling]", JOINT).replace("tau = { uniform = [-30.0, 30.0] }", "tau = 0.5");
    let study = study(&text);
    let rows = describe(&study, study.default_hypothesis());
    let row = |name: &str| {
        let row = rows.iter().find(|row| row.name == name).unwrap();
        (row.kind, row.value.clone(), row.origin.clone())
    };
    assert_eq!(
        row("background.sigma8"),
        (Kind::Inferred, "{ normal = [0.81, 0.01] }".into(), "line 8".into())
    );
    assert_eq!(row("background.wa"), (Kind::Held, "0.0".into(), "default".into()));
    assert_eq!(
        row("larkfield.far.first.evolution"),
        (Kind::Tied, "same as larkfield.near.first.evolution".into(), "line 29".into())
    );
    assert_eq!(
        row("larkfield.far.second.evolution"),
        (Kind::Held, "0.0 + 0.3 * systematic.luminosity-function".into(), "line 30".into())
    );
    assert_eq!(
        row("departure.tau"),
        (Kind::Inferred, "joint normal on line 48, mean 0.1, sd 2.0".into(), "line 45".into())
    );
    let json = serde_json::to_value(&rows[4]).unwrap();
    assert_eq!(
        json,
        serde_json::json!({"name": "background.sigma8", "kind": "inferred", "value": "{ normal = [0.81, 0.01] }", "line": 8, "origin": "line 8"})
    );
}

#[test]
fn the_parameter_map_fills_the_slots_of_a_model() {
    let text = changed("larkfield.*.second.evolution", "larkfield.*.first.evolution");
    let study = study(&text);
    let hypothesis = study.default_hypothesis();
    let slots = [
        "prediction.growth_index",
        "larkfield.far.first.evolution",
        "departure.tau",
        "larkfield.near.first.evolution",
        "background.omega_m",
    ];
    let error = ParameterMap::new(hypothesis, &slots).unwrap_err().to_string();
    assert_eq!(
        error,
        "`background.omega_b` is a quantity of the study but not of the model; this is a fault of oddwell, please report it"
    );
    let mut all: Vec<String> = slots.iter().map(ToString::to_string).collect();
    for quantity in &hypothesis.quantities {
        if !all.contains(&quantity.name) && !quantity.name.starts_with("systematic.") {
            all.push(quantity.name.clone());
        }
    }
    let map = ParameterMap::new(hypothesis, &all).unwrap();
    assert_eq!(map.names(), names(hypothesis));
    let theta = [0.8, 5.0, 0.1, 2.0, -3.0];
    let mut values = vec![f64::NAN; map.slots()];
    map.fill(&theta, &mut values);
    assert_eq!(values[..5], [0.0, 0.1 + 0.3 * 2.0, -3.0, 0.1 + 0.3 * 2.0, 0.31]);
    assert!(map.is_held(4) && !map.is_held(1));
    for (slot, name) in all.iter().enumerate().skip(5) {
        assert_eq!(values[slot], value(hypothesis, name, &theta), "{name}");
    }
    let error = ParameterMap::new(hypothesis, &[all, vec!["larkfield.near.first.colour".into()]].concat());
    assert_eq!(
        error.unwrap_err().to_string(),
        "`larkfield.near.first.colour` is a quantity of the model but not of the study; this is a fault of oddwell, please report it"
    );
}

#[test]
fn a_set_text_is_a_number_or_a_prior() {
    let parsed = Override::parse(" departure.tau = { student_t = [0, 1, 4] } ").unwrap();
    assert_eq!(parsed.name, "departure.tau");
    assert_eq!(parsed.quantity.value.to_string(), "{ student_t = [0.0, 1.0, 4.0] }");
    assert_eq!(Override::parse("background.h=1e-1").unwrap().quantity.value, Quantity::Held(0.1));
    for text in ["x=1\ny=2", "x=\"1\"", "x=", "=1", "x=1 # y"] {
        let parsed = Override::parse(text);
        assert_eq!(parsed.is_ok(), text == "x=1 # y", "{text}: {parsed:?}");
    }
}
