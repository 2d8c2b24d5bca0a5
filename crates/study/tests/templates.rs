//! Templates from a study file: integrated out exactly, drawn back, or sampled.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{BACKGROUND, Folder};
use oddwell_sampler::{Control, Target};
use oddwell_study::assemble::{Posterior, read_measurements};
use oddwell_study::{FitOptions, Fitted, State, Study, fit};
use std::fmt::Write;

const ROWS: [(u8, f64, f64); 5] =
    [(1, 30.0, 1.3e-3), (1, 60.0, 5e-4), (1, 90.0, 1e-4), (3, 30.0, -3e-4), (3, 60.0, 8e-5)];
const SHAPE: &str = "2e-4\n1e-4\n5e-5\n-1e-4\n3e-5\n";

/// A linear study with everything held but tau (or that too) and a template.
fn text(keys: &str, amplitude: &str, tau: &str) -> String {
    format!(
        "{BACKGROUND}\n[[survey]]\nname = \"s\"\nmultipoles = \"s.csv\"\ncovariance = \"covariance.csv\"\n{keys}\n[[survey.template]]\nname = \"stray\"\nfile = \"stray.csv\"\namplitude = {amplitude}\n[[survey.bin]]\nname = \"near\"\nredshift = 0.35\nfirst = {{ bias = 2.1, magnification = 0.5, evolution = 0.1 }}\nsecond = {{ bias = 1.2, magnification = 0.2, evolution = 0.0 }}\n[[hypothesis]]\nname = \"h\"\ndeparture = \"constant\"\nfelt_by = \"light\"\ntau = {tau}\n[sampling]\neffective_samples = 2000\n"
    )
}

fn folder() -> Folder {
    let folder = Folder::new();
    let mut table = String::from("bin,multipole,separation,low,high,value\n");
    for (multipole, at, value) in ROWS {
        writeln!(table, "near,{multipole},{at},{},{},{value:e}", at - 4.0, at + 4.0).unwrap();
    }
    folder.write("s.csv", table);
    let mut covariance = String::new();
    for i in 0..5_i32 {
        let row: Vec<String> =
            (0..5_i32).map(|j| format!("{:e}", 4e-8 * 0.5_f64.powi((i - j).abs()))).collect();
        covariance.push_str(&(row.join(",") + "\n"));
    }
    folder.write("covariance.csv", covariance);
    folder.write("stray.csv", SHAPE);
    folder
}

fn posterior(study: &Study) -> Posterior {
    Posterior::new(study, study.default_hypothesis(), &read_measurements(study).unwrap()).unwrap()
}

/// The log-likelihood with everything else at its start.
fn at_start(study: &Study, tau: f64) -> f64 {
    let posterior = posterior(study);
    posterior.log_likelihood(&vec![tau; posterior.dimension()], &mut posterior.scratch()).unwrap()
}

/// The likelihood with the amplitude integrated out equals that with the amplitude held, integrated over its prior number by
/// number, to 1e-10 of the logarithm: the trapezoidal rule on a normal density times a normal likelihood converges faster
/// than any power, and 4000 steps over ±12 standard deviations of the prior leave nothing.
#[test]
fn integrating_out_is_integrating() {
    let folder = folder();
    let (mean, sd) = (0.7, 1.6);
    for (noise, tau) in [("gaussian", 0.0), ("gaussian", 3.0), ("hartlap", 1.0)] {
        let keys = format!("noise = \"{noise}\"\nmock_count = 40");
        let study =
            folder.study(&text(&keys, &format!("{{ normal = [{mean}, {sd}] }}"), "{ normal = [0.0, 5.0] }"));
        let hypothesis = study.default_hypothesis();
        let state = &hypothesis.quantity("s.template.stray").unwrap().state;
        assert_eq!(*state, State::IntegratedOut { mean, standard_deviation: sd });
        assert_eq!(hypothesis.free.len(), 1);
        let exact = at_start(&study, tau);
        // The same noise with the amplitude inferred, so that one posterior serves all amplitudes.
        let sampled = folder.study(&text(&keys, "{ uniform = [-1e3, 1e3] }", "{ normal = [0.0, 5.0] }"));
        let sampled = posterior(&sampled);
        assert_eq!(sampled.map.names(), ["s.template.stray", "departure.tau"]);
        let mut scratch = sampled.scratch();
        let step = 24.0 * sd / 4000.0;
        let terms: Vec<f64> = (0..=4000)
            .map(|index| {
                let amplitude = mean - 12.0 * sd + step * f64::from(index);
                let away = (amplitude - mean) / sd;
                sampled.log_likelihood(&[amplitude, tau], &mut scratch).unwrap()
                    - 0.5 * away * away
                    - 0.5 * (std::f64::consts::TAU * sd * sd).ln()
            })
            .collect();
        let largest = terms.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let sum: f64 = terms.iter().map(|term| (term - largest).exp()).sum();
        let numerical = largest + (sum * step).ln();
        assert!((exact / numerical - 1.0).abs() < 1e-10, "{noise}, {tau}: {exact} {numerical}");
    }
}

#[test]
fn the_prediction_has_the_template_at_its_prior_mean() {
    let folder = folder();
    let predict = |amplitude: &str| {
        let posterior = posterior(&folder.study(&text("", amplitude, "{ normal = [0.0, 5.0] }")));
        let point = posterior.hypothesis.start();
        posterior.predict(&point, &mut posterior.scratch()).unwrap()
    };
    let (without, held, integrated) = (predict("0.0"), predict("0.7"), predict("{ normal = [0.7, 2.0] }"));
    assert_eq!(held, integrated);
    let shape: Vec<f64> = SHAPE.lines().map(|line| line.parse().unwrap()).collect();
    for row in 0..5 {
        assert!((held[row] - without[row] - 0.7 * shape[row]).abs() < 1e-18);
    }
}

#[test]
fn what_cannot_be_integrated_out_is_sampled() {
    let folder = folder();
    let names = |keys: &str, amplitude: &str, tau: &str| {
        posterior(&folder.study(&text(keys, amplitude, tau))).map.names().to_vec()
    };
    let (normal, tau) = ("{ normal = [0.0, 1.0] }", "{ normal = [0.0, 5.0] }");
    let both = ["s.template.stray", "departure.tau"];
    assert_eq!(names("", normal, tau), ["departure.tau"]);
    assert_eq!(names("", "{ uniform = [-1.0, 1.0] }", tau), both);
    assert_eq!(names("", "{ normal = [0.0, 1.0], within = [0.0, 3.0] }", tau), both);
    assert_eq!(names("noise = \"t\"\nmock_count = 30", normal, tau), both);
    assert_eq!(names("noise = \"percival\"\nmock_count = 30", normal, tau), both);
    // With nothing else to infer, it is what is inferred.
    assert_eq!(names("", normal, "0.0"), ["s.template.stray"]);
    // A systematic that moves it.
    let moved = text("", normal, tau)
        + "[[systematic]]\nname = \"light\"\namplitude = { normal = [0.0, 1.0] }\nmoves = [{ quantity = \"*.template.stray\", by = 2.0 }]\n";
    let moved = posterior(&folder.study(&moved));
    assert_eq!(moved.map.names(), ["s.template.stray", "systematic.light", "departure.tau"]);
    let mut scratch = moved.scratch();
    let of = |theta: &[f64], scratch: &mut _| moved.predict(theta, scratch).unwrap();
    let (plain, shifted) = (of(&[2.5, 0.0, 1.0], &mut scratch), of(&[0.5, 1.0, 1.0], &mut scratch));
    for row in 0..5 {
        assert!((plain[row] - shifted[row]).abs() < 1e-18);
    }
    // Compressed and plain agree.
    let theta = [0.4, -0.7, 1.5];
    let compressed = moved.log_likelihood(&theta, &mut scratch).unwrap();
    let plain = moved.plain_log_likelihood(&theta, &mut scratch).unwrap();
    assert!((compressed / plain - 1.0).abs() < 1e-12, "{compressed} {plain}");
}

fn run(folder: &Folder, study: &Study, name: &str) -> Fitted {
    let options = FitOptions {
        out: folder.0.path().join(name),
        existing: oddwell_study::Existing::Replace,
        seed: None,
        maximum_evaluations: None,
        command: Vec::new(),
        threads: 1,
    };
    fit(study, study.default_hypothesis(), &options, &mut |_, _| Control::Continue).unwrap()
}

/// Drawn back or sampled, the posterior of amplitude and departure is the same normal one. With 2000 effective samples a
/// mean is known to 1/√2000 and an sd to 1/√4000 of the sd: 4.5 standard errors of the difference of two.
#[test]
fn drawn_back_is_as_sampled() {
    let folder = folder();
    let tau = "{ normal = [0.0, 5.0] }";
    let drawn = run(&folder, &folder.study(&text("", "{ normal = [0.3, 2.0] }", tau)), "drawn");
    // Ten standard deviations of a window change nothing, and make it a quantity like any other.
    let window = "{ normal = [0.3, 2.0], within = [-20.0, 20.0] }";
    let sampled = run(&folder, &folder.study(&text("", window, tau)), "sampled");
    for name in ["s.template.stray", "departure.tau"] {
        let (one, other) = (&drawn.summary.parameters[name], &sampled.summary.parameters[name]);
        let (sd, ess) = (other.sd.unwrap(), one.ess.unwrap().min(other.ess.unwrap()));
        assert!(ess > 400.0, "{name}: {ess}");
        let error = sd * (2.0 / ess).sqrt();
        assert!((one.mean.unwrap() - other.mean.unwrap()).abs() < 4.5 * error, "{name}: {one:?} {other:?}");
        assert!((one.sd.unwrap() - sd).abs() < 4.5 * error / 2.0_f64.sqrt(), "{name}: {one:?} {other:?}");
    }
    let stray = &drawn.summary.parameters["s.template.stray"];
    assert_eq!((stray.prior_mean, stray.prior_sd), (Some(0.3), Some(2.0)));
    let correlation = |fitted: &Fitted| {
        let chain = std::fs::read_to_string(fitted.directory.join("chain.csv")).unwrap();
        let header: Vec<&str> = chain.lines().next().unwrap().split(',').collect();
        let column = |name: &str| -> Vec<f64> {
            let place = header.iter().position(|each| *each == name).unwrap();
            chain.lines().skip(1).map(|line| line.split(',').nth(place).unwrap().parse().unwrap()).collect()
        };
        let (one, other) = (column("s.template.stray"), column("departure.tau"));
        let mean = |list: &[f64]| list.iter().sum::<f64>() / list.len() as f64;
        let (a, b) = (mean(&one), mean(&other));
        let product = |x: &[f64], m: f64, y: &[f64], n: f64| -> f64 {
            x.iter().zip(y).map(|(x, y)| (x - m) * (y - n)).sum()
        };
        product(&one, a, &other, b) / (product(&one, a, &one, a) * product(&other, b, &other, b)).sqrt()
    };
    let (one, other) = (correlation(&drawn), correlation(&sampled));
    // A correlation ρ from n draws is known to (1 − ρ²)/√n.
    assert!(one.abs() > 0.3 && (one - other).abs() < 4.5 * (2.0_f64 / 400.0).sqrt(), "{one} {other}");
    // The best amplitude is the expected one at the best point: of a normal posterior, its mean.
    let best = drawn.summary.best.parameters["s.template.stray"];
    let error = stray.sd.unwrap() / stray.ess.unwrap().sqrt();
    assert!((best - stray.mean.unwrap()).abs() < 4.5 * error, "{best} {stray:?}");
    // A fit with templates is as good with the one as with the other.
    let chi2 = |fitted: &Fitted| fitted.summary.best.p_value.unwrap();
    assert!((0.0..=1.0).contains(&chi2(&drawn)) && (0.0..=1.0).contains(&chi2(&sampled)));
}
