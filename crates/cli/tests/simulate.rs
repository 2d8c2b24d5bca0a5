//! `oddwell simulate`: a complete study comes out, which fits, and whose truth is what was asked for.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use std::path::Path;
use std::process::{Command, Output};

fn oddwell(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_oddwell")).args(arguments).current_dir(folder).output().unwrap()
}

fn succeed(folder: &Path, arguments: &[&str]) -> String {
    let run = oddwell(folder, arguments);
    assert!(run.status.success(), "{arguments:?}: {}", String::from_utf8_lossy(&run.stderr));
    String::from_utf8(run.stdout).unwrap()
}

/// (measured, predicted, error) by row.
fn prediction(folder: &Path, study: &str, extra: &[&str]) -> Vec<[f64; 3]> {
    let mut arguments = vec!["predict", study, "--hypothesis", "constant"];
    arguments.extend(extra);
    let csv = succeed(folder, &arguments);
    let header: Vec<&str> = csv.lines().next().unwrap().split(',').collect();
    let column = |name: &str| header.iter().position(|field| *field == name).unwrap();
    let columns = [column("measured"), column("predicted"), column("error")];
    csv.lines()
        .skip(1)
        .map(|line| {
            let fields: Vec<&str> = line.split(',').collect();
            columns.map(|column| fields[column].parse().unwrap())
        })
        .collect()
}

/// The study without its design, so that its own covariance is what noise is drawn from.
fn forget_design(study: &Path) {
    let text = std::fs::read_to_string(study).unwrap();
    let of_design = |line: &&str| {
        ["[survey.design]", "multipoles = [1, 3] ", "separation = {", "design = {"]
            .iter()
            .any(|start| line.starts_with(start))
    };
    assert_eq!(text.lines().filter(of_design).count(), 5);
    let kept: Vec<&str> = text.lines().filter(|line| !of_design(line)).collect();
    std::fs::write(study, kept.join("\n")).unwrap();
}

#[test]
fn a_drawn_study_is_complete_and_scatters_about_its_truth() {
    let folder = tempfile::tempdir().unwrap();
    let folder = folder.path();
    succeed(folder, &["new", "first"]);
    forget_design(&folder.join("first/study.toml"));
    let set = ["--set", "departure.tau=8", "--set", "windmere.near.offset=30"];
    let mut arguments = vec!["simulate", "first/study.toml", "--out", "drawn", "--seed", "5"];
    arguments.extend(set);
    succeed(folder, &arguments);
    let text = std::fs::read_to_string(folder.join("drawn/study.toml")).unwrap();
    assert!(text.starts_with("# SYNTHETIC MEASUREMENTS"), "{text}");
    // χ² of 60 numbers about the truth: mean 60, sd 11; about the study's own centre it is far larger.
    let rows = prediction(folder, "drawn/study.toml", &set);
    assert_eq!(rows.len(), 60);
    let distance = |rows: &[[f64; 3]]| -> f64 {
        rows.iter().map(|[measured, predicted, error]| ((measured - predicted) / error).powi(2)).sum()
    };
    // Rows are correlated within a bin, which widens this naive sum; five of its nominal standard deviations.
    assert!((distance(&rows) - 60.0).abs() < 55.0, "{}", distance(&rows));
    assert!(distance(&prediction(folder, "drawn/study.toml", &[])) > 5.0 * distance(&rows));
    succeed(folder, &["fit", "drawn/study.toml", "--quiet", "--out", "run"]);

    // The same seed gives the same bytes, another seed others, and a folder is never overwritten.
    arguments[3] = "again";
    succeed(folder, &arguments);
    let table = |name: &str| std::fs::read(folder.join(name).join("windmere-multipoles.csv")).unwrap();
    assert_eq!(table("drawn"), table("again"));
    arguments[5] = "6";
    let refused = oddwell(folder, &arguments);
    assert_eq!(refused.status.code(), Some(1));
    let said = String::from_utf8(refused.stderr).unwrap();
    assert!(
        said.contains("error: again: exists already; give a folder that does not, with `--out`"),
        "{said}"
    );
    arguments[3] = "other";
    succeed(folder, &arguments);
    assert_ne!(table("drawn"), table("other"));
}

const PLANNED: &str = r#"
title = "Planned"
background = { omega_m = 0.31, omega_b = 0.049, h = 0.68, n_s = 0.965, sigma8 = 0.81 }

[[survey]]
name = "fenside"   # invented
noise = "gaussian"
covariance_rows = "of-something-else.csv"
covariance = "of-something-else-too.csv"

[survey.design]
multipoles = [0, 1, 3]
separation = [24.0, 40.0, 60.0, 90.0]
area = 5000.0

[[survey.bin]]
name = "only"
redshift = 0.4
design = { redshifts = [0.3, 0.5], first_density = 1.0e-3, second_density = 3.0e-3 }
offset = { normal = [0.0, 10.0] }
first = { bias = 2.0, magnification = 0.5, evolution = { normal = [0.0, 0.2] } }
second = { bias = 1.2, magnification = 0.2, evolution = 0.0 }

[[survey]]
name = "undermoor"
[survey.design]
wavenumber = { low = 0.02, high = 0.1, width = 0.02 }
multipoles = [1]
[survey.columns]
value = "imaginary part"
[[survey.bin]]
name = "only"
redshift = 0.8
design = { volume = 4.0e9, first_density = 1.0e-3, second_density = 3.0e-3 }
first = { bias = 2.0, magnification = 0.5, evolution = 0.0 }
second = { bias = 1.2, magnification = 0.2, evolution = 0.0 }

[[hypothesis]]
name = "constant"
departure = "constant"
felt_by = "light"
tau = { normal = [0.0, 5.0] }
"#;

#[test]
fn a_plan_needs_no_measurements() {
    let folder = tempfile::tempdir().unwrap();
    let folder = folder.path();
    std::fs::write(folder.join("plan.toml"), PLANNED).unwrap();
    let refused = oddwell(folder, &["fit", "plan.toml"]);
    assert_eq!(refused.status.code(), Some(1));
    let said = String::from_utf8(refused.stderr).unwrap();
    let expected = "survey `fenside` has a [survey.design] and no measurements yet; draw some with \
                    `oddwell simulate plan.toml --out DIR`, or give `multipoles`";
    assert!(said.contains(expected), "{said}");

    let simulate = |out: &str, extra: &[&str]| {
        let mut arguments = vec!["simulate", "plan.toml", "--out", out, "--set", "departure.tau=4"];
        arguments.extend(extra);
        succeed(folder, &arguments);
    };
    simulate("drawn", &[]);
    let read = |name: &str| std::fs::read_to_string(folder.join("drawn").join(name)).unwrap();
    let text = read("study.toml");
    assert!(
        text.contains("covariance = \"fenside-covariance.csv\"") && !text.contains("of-something"),
        "{text}"
    );
    assert!(text.contains("multipoles = \"undermoor-multipoles.csv\""), "{text}");
    assert!(text.contains("# invented"), "notes stay: {text}");
    assert!(
        read("undermoor-multipoles.csv").starts_with("bin,multipole,wavenumber,low,high,imaginary part\n")
    );
    // What was set is part of the truth, and nothing of it is in the study.
    assert!(
        read("truth.csv").contains("departure.tau,4e0\n") && text.contains("tau = { normal = [0.0, 5.0] }")
    );
    assert_eq!(read("fenside-covariance.csv").lines().count(), 9);
    // It is complete: it is checked, fitted, and drawn from again.
    succeed(folder, &["check", "drawn/study.toml"]);
    succeed(folder, &["fit", "drawn/study.toml", "--quiet", "--out", "run"]);
    succeed(folder, &["simulate", "drawn/study.toml", "--out", "again", "--set", "departure.tau=4"]);
    for name in ["fenside-multipoles.csv", "fenside-covariance.csv", "undermoor-multipoles.csv"] {
        assert_eq!(std::fs::read_to_string(folder.join("again").join(name)).unwrap(), read(name), "{name}");
    }

    // 5000 of 41252.96 square degrees between z = 0.3 and 0.5, where astropy 8.0.2 has comoving distances of 834.26429589 and
    // 1317.48686132 Mpc/h: FlatLambdaCDM(100, 0.31, Tcmb0=0).comoving_distance([0.3, 0.5]). The covariance goes as 1/volume,
    // and is printed to nine digits; the constant of the sky is good to eight.
    let by_redshifts: f64 = read("fenside-covariance.csv").split(',').next().unwrap().parse().unwrap();
    let volume = 5000.0 / 41_252.961 * 4.0 / 3.0
        * std::f64::consts::PI
        * (1_317.486_861_32_f64.powi(3) - 834.264_295_89_f64.powi(3));
    let given = PLANNED.replace("redshifts = [0.3, 0.5]", &format!("volume = {volume:e}"));
    std::fs::write(folder.join("plan.toml"), given).unwrap();
    simulate("by-volume", &[]);
    let by_volume = std::fs::read_to_string(folder.join("by-volume/fenside-covariance.csv")).unwrap();
    let by_volume: f64 = by_volume.split(',').next().unwrap().parse().unwrap();
    assert!((by_volume / by_redshifts - 1.0).abs() < 1e-7, "{by_volume:e} {by_redshifts:e}");
}

#[test]
fn mocks_come_with_the_noise_of_the_measurements() {
    let folder = tempfile::tempdir().unwrap();
    let folder = folder.path();
    std::fs::write(folder.join("plan.toml"), PLANNED).unwrap();
    succeed(folder, &["simulate", "plan.toml", "--out", "plain"]);
    succeed(folder, &["simulate", "plan.toml", "--out", "mocked", "--mocks", "400"]);
    let text = std::fs::read_to_string(folder.join("mocked/study.toml")).unwrap();
    assert!(text.contains("mocks = \"fenside-mocks.npy\""), "{text}");
    assert!(!text.contains("covariance"), "{text}");
    assert!(!folder.join("mocked/fenside-covariance.csv").exists());
    let measured = |name: &str| std::fs::read(folder.join(name).join("fenside-multipoles.csv")).unwrap();
    assert_eq!(measured("plain"), measured("mocked"), "mocks leave the measurements alone");
    // Little-endian float64 in C order behind a header that fills whole 64 bytes.
    let bytes = std::fs::read(folder.join("mocked/fenside-mocks.npy")).unwrap();
    let header = 10 + usize::from(u16::from_le_bytes([bytes[8], bytes[9]]));
    let said = String::from_utf8_lossy(&bytes[..header]).into_owned();
    assert!(said.contains("(400, 9)") && said.contains("<f8"), "{said}");
    let numbers: Vec<f64> =
        bytes[header..].chunks(8).map(|bytes| f64::from_le_bytes(bytes.try_into().unwrap())).collect();
    let covariance: Vec<Vec<f64>> = std::fs::read_to_string(folder.join("plain/fenside-covariance.csv"))
        .unwrap()
        .lines()
        .map(|line| line.split(',').map(|field| field.parse().unwrap()).collect())
        .collect();
    let mean = |column: usize| numbers.iter().skip(column).step_by(9).sum::<f64>() / 400.0;
    for i in 0..9 {
        for j in 0..=i {
            let (of_i, of_j) = (mean(i), mean(j));
            let products = numbers.chunks(9).map(|mock| (mock[i] - of_i) * (mock[j] - of_j));
            let sample = products.sum::<f64>() / 399.0;
            // The error of a sample covariance is √[(C_ii C_jj + C_ij²)/n]; four of them for 45 entries.
            let c = &covariance;
            let error = ((c[i][i] * c[j][j] + c[i][j].powi(2)) / 400.0).sqrt();
            assert!((sample - c[i][j]).abs() < 4.0 * error, "{i} {j}: {sample:e} {:e} ± {error:e}", c[i][j]);
        }
    }
    // The study is complete: its covariances are estimated from the mocks, and a noise model for that applies.
    let path = folder.join("mocked/study.toml");
    let text =
        std::fs::read_to_string(&path).unwrap().replace("noise = \"gaussian\"", "noise = \"percival\"");
    std::fs::write(&path, text).unwrap();
    let checked = succeed(folder, &["check", "mocked/study.toml", "--json"]);
    assert!(checked.contains("\"mocks\": 400") && checked.contains("\"noise\": \"percival\""), "{checked}");
    succeed(folder, &["fit", "mocked/study.toml", "--quiet", "--out", "run"]);
}

#[test]
fn what_a_design_can_not_be_drawn_with_is_refused() {
    let folder = tempfile::tempdir().unwrap();
    let folder = folder.path();
    let text = PLANNED.replace("noise = \"gaussian\"", "noise = \"t\"\nmock_count = 100");
    std::fs::write(folder.join("plan.toml"), text).unwrap();
    let refused = oddwell(folder, &["simulate", "plan.toml", "--out", "drawn"]);
    assert_eq!(refused.status.code(), Some(1));
    let said = String::from_utf8(refused.stderr).unwrap();
    assert!(
        said.contains("survey `fenside`: the noise model `t` is for a covariance estimated from mocks"),
        "{said}"
    );
    assert!(!folder.join("drawn").exists());
    let text = PLANNED.replace("noise = \"gaussian\"", "window = \"w.npy\"\nwindow_rows = \"w.csv\"");
    std::fs::write(folder.join("plan.toml"), text).unwrap();
    let refused = oddwell(folder, &["simulate", "plan.toml", "--out", "drawn"]);
    let said = String::from_utf8(refused.stderr).unwrap();
    assert!(said.contains("survey `fenside` has a window, and a design is drawn without a mask"), "{said}");
}

#[test]
fn a_truth_from_the_priors_is_recorded() {
    let folder = tempfile::tempdir().unwrap();
    let folder = folder.path();
    succeed(folder, &["new", "first"]);
    succeed(folder, &["simulate", "first/study.toml", "--out", "drawn", "--from-prior", "--seed", "3"]);
    let truth = std::fs::read_to_string(folder.join("drawn/truth.csv")).unwrap();
    let tau = truth.lines().find_map(|line| line.strip_prefix("departure.tau,")).unwrap();
    let tau: f64 = tau.parse().unwrap();
    assert!(tau != 0.0 && tau.abs() <= 30.0, "{tau}");
}
