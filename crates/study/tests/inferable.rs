//! Every number of `[background]` and `[prediction]`, and the growth of a bin, may carry a prior.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::Folder;
use oddwell_sampler::{Control, EvaluationFailure, Target};
use oddwell_study::assemble::{Posterior, read_measurements};
use oddwell_study::{Existing, FitOptions, Study, fit};

const TABLE: &str = "bin,multipole,separation,low,high,value,error\nnear,0,30,26,34,0.09,2e-3\nnear,2,30,26,34,-0.05,2e-3\nnear,1,30,26,34,0.002,2e-4\nnear,1,60,56,64,0.001,2e-4\nnear,3,90,86,94,0.0001,2e-4\n";

/// A study in which one number stands as given and the others are held.
fn text(place: &str, given: &str) -> String {
    let mut background = vec![
        ("background.omega_m", "0.31"),
        ("background.omega_b", "0.049"),
        ("background.h", "0.68"),
        ("background.n_s", "0.965"),
        ("background.sigma8", "0.81"),
    ];
    let mut prediction: Vec<(&str, &str)> = Vec::new();
    let mut bin = Vec::new();
    match place.split('.').next() {
        Some("background") => background.retain(|(name, _)| *name != place),
        _ if place.starts_with("s.near.growth") => {
            let rate = ("s.near.growth_rate", "0.68");
            let slope = ("s.near.growth_slope", "-0.28");
            bin = [rate, slope].into_iter().filter(|(name, _)| *name != place).collect();
        }
        _ => {}
    }
    let list = match place.split('.').next() {
        Some("background") => &mut background,
        Some("prediction") => &mut prediction,
        _ => &mut bin,
    };
    list.push((place, given));
    let lines = |list: &[(&str, &str)]| -> String {
        list.iter().map(|(name, given)| format!("{} = {given}\n", name.rsplit('.').next().unwrap())).collect()
    };
    format!(
        "[background]\n{}\n[prediction]\n{}\n[[survey]]\nname = \"s\"\nmultipoles = \"s.csv\"\n\n[[survey.bin]]\nname = \"near\"\nredshift = 0.35\noffset = 4.0\n{}first = {{ bias = 2.1, magnification = 0.5, evolution = 0.1, bias_slope = -0.4 }}\nsecond = {{ bias = 1.2, magnification = 0.2, evolution = 0.0, bias_slope = 0.2 }}\n\n[[hypothesis]]\nname = \"constant\"\ndeparture = \"constant\"\nfelt_by = \"light\"\ntau = {{ normal = [0.0, 3.0] }}\n",
        lines(&background),
        lines(&prediction),
        lines(&bin)
    )
}

fn posterior(study: &Study) -> Posterior {
    Posterior::new(study, study.default_hypothesis(), &read_measurements(study).unwrap()).unwrap()
}

struct Case {
    place: &'static str,
    prior: &'static str,
    /// Where it is compared with a study that holds it there.
    values: [f64; 2],
    /// Whether moving it leaves the kernels as they are.
    fixed_kernels: bool,
    /// Outside its domain, and what is said there; none: every number is a universe.
    outside: Option<(f64, &'static str)>,
}

fn case(
    place: &'static str,
    prior: &'static str,
    values: [f64; 2],
    fixed_kernels: bool,
    outside: Option<(f64, &'static str)>,
) -> Case {
    Case { place, prior, values, fixed_kernels, outside }
}

fn cases() -> Vec<Case> {
    let baryons = "background.omega_b = 0.049: must be below background.omega_m; baryons are part of matter";
    let h = "background.h = -0.1: must be above 0 and below 10; it is H0 in 100 km/s/Mpc, as in 0.68";
    let sigma8 = "background.sigma8 = -0.81: must be above 0; it is the rms of matter in 8 Mpc/h, as in 0.81";
    let bounced = "the expansion rate squared is";
    let damping = "prediction.damping = -0.2: must be 0 or above; it is a length in Mpc/h, as in 0.5";
    vec![
        case("background.omega_m", "{ normal = [0.31, 0.2] }", [0.28, 0.35], false, Some((0.04, baryons))),
        case(
            "background.omega_b",
            "{ normal = [0.049, 0.1] }",
            [0.04, 0.06],
            false,
            Some((
                -0.01,
                "background.omega_b = -0.01: must be above 0; the transfer function needs baryons, as in 0.049",
            )),
        ),
        case("background.h", "{ normal = [0.68, 0.3] }", [0.6, 0.74], false, Some((-0.1, h))),
        case("background.n_s", "{ normal = [0.965, 0.02] }", [0.9, 1.0], false, None),
        case("background.sigma8", "{ normal = [0.81, 0.3] }", [0.7, 0.9], true, Some((-0.81, sigma8))),
        case("background.omega_k", "{ normal = [0.0, 0.5] }", [-0.1, 0.1], true, Some((-3.0, bounced))),
        case("background.w0", "{ normal = [-1.0, 0.3] }", [-1.2, -0.8], true, None),
        case("background.wa", "{ normal = [0.0, 0.5] }", [-0.4, 0.4], true, None),
        case("prediction.damping", "{ normal = [0.5, 0.3] }", [0.3, 1.0], false, Some((-0.2, damping))),
        case("prediction.smearing", "{ half_normal = 6.0 }", [3.0, 8.0], false, None),
        case("prediction.growth_index", "{ normal = [0.55, 0.1] }", [0.4, 0.7], true, None),
        case("s.near.growth_rate", "{ normal = [0.7, 0.1] }", [0.5, 0.9], true, None),
        case("s.near.growth_slope", "{ normal = [-0.3, 0.1] }", [-0.5, 0.1], true, None),
    ]
}

#[test]
fn an_inferred_number_gives_what_the_same_number_held_gives() {
    let folder = Folder::new();
    folder.write("s.csv", TABLE);
    for Case { place, prior, values, fixed_kernels, .. } in cases() {
        let free = posterior(&folder.study(&text(place, prior)));
        assert_eq!(free.has_fixed_kernels(), fixed_kernels, "{place}");
        assert_eq!(free.map.names(), [place, "departure.tau"]);
        let mut scratch = free.scratch();
        let mut seen = Vec::new();
        for value in values {
            let held = posterior(&folder.study(&text(place, &format!("{value:?}"))));
            let expected = held.predict(&[1.5], &mut held.scratch()).unwrap();
            let predicted = free.predict(&[value, 1.5], &mut scratch).unwrap();
            // Damping sets where the k integrals end; what lies beyond is 1e-8 of them. Else the sums are the same.
            let tolerance = if place == "prediction.damping" { 1e-7 } else { 1e-12 };
            for (one, other) in predicted.iter().zip(&expected) {
                assert!((one - other).abs() < tolerance * other.abs(), "{place} = {value}: {one} {other}");
            }
            let likelihood = free.log_likelihood(&[value, 1.5], &mut scratch).unwrap();
            let plain = held.plain_log_likelihood(&[1.5], &mut held.scratch()).unwrap();
            // Compression is exact to rounding of χ², here up to some 1e4; damping as above.
            let tolerance = if place == "prediction.damping" { 1e-5 } else { 1e-9 };
            assert!((likelihood - plain).abs() < tolerance * plain.abs(), "{place}: {likelihood} {plain}");
            seen.push(likelihood);
        }
        assert!((seen[0] - seen[1]).abs() > 1e-3, "{place} changes nothing");
    }
}

#[test]
fn where_a_prior_reaches_nonsense_the_step_is_rejected() {
    let folder = Folder::new();
    folder.write("s.csv", TABLE);
    for Case { place, prior, outside, .. } in cases() {
        let Some((value, said)) = outside else {
            continue;
        };
        let posterior = posterior(&folder.study(&text(place, prior)));
        let mut scratch = posterior.scratch();
        let centre = posterior.hypothesis.start();
        let before = posterior.log_likelihood(&centre, &mut scratch).unwrap();
        match posterior.log_likelihood(&[value, 0.0], &mut scratch) {
            Err(EvaluationFailure::Rejected { reason }) => {
                assert!(reason.starts_with(said), "{place}: {reason}");
            }
            other => panic!("{place} = {value}: {other:?}"),
        }
        assert!(posterior.log_prior(&[value, 0.0]) > f64::NEG_INFINITY);
        // And nothing of it stays behind in the working memory.
        assert_eq!(posterior.log_likelihood(&centre, &mut scratch).unwrap(), before, "{place}");
    }
}

#[test]
fn a_fit_with_a_free_universe_runs() {
    let folder = Folder::new();
    folder.write("s.csv", TABLE);
    let text = text("background.omega_m", "{ normal = [0.31, 0.1] }")
        .replace("h = 0.68", "h = { normal = [0.68, 0.05] }")
        .replace("sigma8 = 0.81", "sigma8 = { normal = [0.81, 0.1] }\nw0 = { normal = [-1.0, 0.2] }")
        .replace(
            "[prediction]",
            "[prediction]\ndamping = { half_normal = 0.5 }\ngrowth_index = { normal = [0.55, 0.1] }",
        );
    let study = folder.study(&text);
    let options = FitOptions {
        out: folder.0.path().join("run"),
        existing: Existing::Refuse,
        seed: None,
        maximum_evaluations: Some(10_000),
        command: Vec::new(),
        threads: 1,
    };
    let fitted = fit(&study, study.default_hypothesis(), &options, &mut |_, _| Control::Continue).unwrap();
    let names: Vec<&String> = fitted.summary.best.parameters.keys().collect();
    assert_eq!(names.len(), 7, "{names:?}");
    // Priors on the universe are wide, and five numbers pin it only in part; but every draw is a universe.
    let chain = std::fs::read_to_string(fitted.directory.join("chain.csv")).unwrap();
    let mut lines = chain.lines();
    let header: Vec<&str> = lines.next().unwrap().split(',').collect();
    let column = |name: &str| header.iter().position(|each| *each == name).unwrap();
    let (omega_m, sigma8, damping) =
        (column("background.omega_m"), column("background.sigma8"), column("prediction.damping"));
    let mut count = 0;
    for line in lines {
        let fields: Vec<f64> = line.split(',').map(|field| field.parse().unwrap()).collect();
        assert!(fields[omega_m] > 0.049 && fields[sigma8] > 0.0 && fields[damping] >= 0.0, "{line}");
        count += 1;
    }
    assert!(count > 100, "{count}");
}
