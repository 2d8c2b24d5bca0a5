//! Covariances and noise from a study file: mocks, joint surveys, theory errors, shrinkage, units.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{BACKGROUND, CONSTANT, Folder, survey};
use nalgebra::DMatrix;
use oddwell_sampler::Target;
use oddwell_study::Study;
use oddwell_study::assemble::{Measurements, Posterior, read_measurements};
use rand::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use rand_xoshiro::Xoshiro256PlusPlus;
use std::fmt::Write;

/// Six rows of one bin.
const ROWS: [(u8, f64); 6] = [(1, 30.0), (1, 50.0), (1, 70.0), (3, 30.0), (3, 50.0), (3, 70.0)];

fn table(bin: &str, values: &[f64], scale: f64) -> String {
    let mut text = String::from("bin,multipole,separation,low,high,value,error\n");
    for ((multipole, at), value) in ROWS.iter().zip(values) {
        let (at, low, high) = (at / scale, (at - 5.0) / scale, (at + 5.0) / scale);
        writeln!(text, "{bin},{multipole},{at},{low},{high},{value:e},1e-4").unwrap();
    }
    text
}

const MEASURED: [f64; 6] = [1.1e-3, 6e-4, 3e-4, -1e-4, 5e-5, 2e-5];

/// Mocks of `columns` correlated numbers near 1e-4.
fn mocks(count: usize, columns: usize, seed: u64) -> DMatrix<f64> {
    let mut random = Xoshiro256PlusPlus::seed_from_u64(seed);
    let mut all = DMatrix::zeros(count, columns);
    for mut mock in all.row_iter_mut() {
        let mut before = 0.0;
        for number in mock.iter_mut() {
            let normal: f64 = StandardNormal.sample(&mut random);
            before = 0.6 * before + normal;
            *number = 1e-4 * before;
        }
    }
    all
}

fn csv(matrix: &DMatrix<f64>) -> String {
    let line =
        |row: usize| matrix.row(row).iter().map(|value| format!("{value:e}")).collect::<Vec<_>>().join(",");
    (0..matrix.nrows()).map(|row| line(row) + "\n").collect()
}

/// Σ (x − x̄)(x − x̄)ᵀ/(n − 1), entry by entry.
fn sample_covariance(mocks: &DMatrix<f64>) -> DMatrix<f64> {
    let mean = mocks.row_mean();
    DMatrix::from_fn(mocks.ncols(), mocks.ncols(), |i, j| {
        let products = mocks.row_iter().map(|mock| (mock[i] - mean[i]) * (mock[j] - mean[j]));
        products.sum::<f64>() / (mocks.nrows() as f64 - 1.0)
    })
}

fn one_survey(keys: &str) -> String {
    format!("{BACKGROUND}{}{CONSTANT}", survey("s", "near", "redshift = 0.35", keys))
}

fn read(folder: &Folder, text: &str) -> (Study, Measurements) {
    let study = folder.study(text);
    let measurements = read_measurements(&study).unwrap_or_else(|error| panic!("{error}"));
    (study, measurements)
}

fn close(found: &DMatrix<f64>, expected: &DMatrix<f64>) {
    // Sums of some sixty products, in another order.
    let difference = (found - expected).amax();
    assert!(difference < 1e-12 * expected.amax(), "{difference:e}");
}

#[test]
fn mocks_as_an_array_and_as_tables_give_the_same_likelihood() {
    let folder = Folder::new();
    folder.write("s.csv", table("near", &MEASURED, 1.0));
    let mocks = mocks(60, 6, 1);
    folder.write("mocks.csv", csv(&mocks));
    std::fs::create_dir(folder.0.path().join("m")).unwrap();
    for (number, mock) in mocks.row_iter().enumerate() {
        // Their rows stand in another order, and some are of no concern.
        let values: Vec<f64> = mock.iter().copied().collect();
        let text = table("near", &values, 1.0);
        let mut lines: Vec<&str> = text.lines().collect();
        lines[1..].reverse();
        lines.push("other,1,30,25,35,5,1");
        folder.write(&format!("m/mock-{:03}.csv", number + 1), lines.join("\n"));
    }
    folder.write("covariance.csv", csv(&sample_covariance(&mocks)));
    let keep = "keep = [{ separation = [20.0, 60.0] }]";
    let likelihoods: Vec<f64> = [
        "mocks = \"mocks.csv\"",
        "mocks = \"m/mock-*.csv\"",
        "covariance = \"covariance.csv\"\nmock_count = 60",
    ]
    .iter()
    .map(|keys| {
        let (study, measurements) = read(&folder, &one_survey(&format!("{keys}\nnoise = \"t\"\n{keep}")));
        let likelihood = &measurements.surveys[0].likelihood;
        assert_eq!((likelihood.rows(), likelihood.mock_count()), (4, Some(60)));
        let kept = [0, 1, 3, 4];
        let expected = sample_covariance(&mocks).select_rows(&kept).select_columns(&kept);
        close(likelihood.covariance().matrix(), &expected);
        let posterior = Posterior::new(&study, study.default_hypothesis(), &measurements).unwrap();
        posterior.log_likelihood(&posterior.hypothesis.start(), &mut posterior.scratch()).unwrap()
    })
    .collect();
    assert!((likelihoods[0] / likelihoods[1] - 1.0).abs() < 1e-12, "{likelihoods:?}");
    assert!((likelihoods[0] / likelihoods[2] - 1.0).abs() < 1e-12, "{likelihoods:?}");

    // A realisation that is gone is missed; every mock is on record.
    std::fs::remove_file(folder.0.path().join("m/mock-017.csv")).unwrap();
    let (_, measurements) = read(&folder, &one_survey("mocks = \"m/mock-*.csv\"\nnoise = \"hartlap\""));
    assert_eq!(measurements.surveys[0].likelihood.mock_count(), Some(59));
    let warning = measurements.warnings.iter().find(|warning| warning.code() == "missing-mocks").unwrap();
    assert_eq!(
        folder.local(&warning.text()),
        "the mocks of `s` are numbered with gaps: 59 match `m/mock-*.csv`, without m/mock-017.csv; if they failed for a reason that has to do with what they measure, those that are left are no fair sample"
    );
    assert_eq!(measurements.inputs.len(), 2 + 59);
    assert!(measurements.inputs.iter().all(|input| input.sha256.len() == 64));
}

#[test]
fn lengths_in_megaparsec_reach_mocks_theory_errors_and_templates() {
    let folder = Folder::new();
    let h = 0.68;
    let mocks = mocks(40, 3, 2);
    // A spectrum: values in Mpc³ are h⁻³ times those in (Mpc/h)³, wavenumbers h times.
    let spectrum = |unit: f64, value: f64| {
        let mut text = String::from("bin,multipole,wavenumber,low,high,value\n");
        for (index, k) in [0.05, 0.07, 0.09].iter().enumerate() {
            let (k, low, high) = (k * unit, (k - 0.01) * unit, (k + 0.01) * unit);
            writeln!(text, "near,1,{k},{low},{high},{:e}", value * (1.0 + index as f64)).unwrap();
        }
        text
    };
    let extra = DMatrix::from_fn(3, 3, |i, j| 1e-9 / (1.0 + (i as f64 - j as f64).abs()));
    let shape = DMatrix::from_column_slice(3, 1, &[1e-4, 2e-4, 3e-4]);
    for (name, unit) in [("a", 1.0), ("b", h)] {
        let factor = f64::powi(1.0 / unit, 3);
        folder.write(&format!("{name}.csv"), spectrum(unit, 1e-4 * factor));
        folder.write(&format!("mocks-{name}.csv"), csv(&(&mocks * factor)));
        folder.write(&format!("extra-{name}.csv"), csv(&(&extra * factor * factor)));
        folder.write(&format!("shape-{name}.csv"), csv(&(&shape * factor)));
    }
    let values: Vec<f64> = [("a", "Mpc/h"), ("b", "Mpc")]
        .into_iter()
        .map(|(name, unit)| {
            let keys = format!(
                "unit = \"{unit}\"\nmocks = \"mocks-{name}.csv\"\nnoise = \"hartlap\"\nextra_covariance = \"extra-{name}.csv\"\n[[survey.template]]\nname = \"x\"\nfile = \"shape-{name}.csv\"\namplitude = {{ normal = [0.3, 2.0] }}"
            );
            let text = format!("{BACKGROUND}{}{CONSTANT}", survey(name, "near", "redshift = 0.35", &keys));
            let (study, measurements) = read(&folder, &text);
            close(
                measurements.groups[0].likelihood.covariance().matrix(),
                &(sample_covariance(&mocks) + &extra),
            );
            let posterior = Posterior::new(&study, study.default_hypothesis(), &measurements).unwrap();
            posterior.log_likelihood(&posterior.hypothesis.start(), &mut posterior.scratch()).unwrap()
        })
        .collect();
    assert!((values[0] / values[1] - 1.0).abs() < 1e-11, "{values:?}");
}

#[test]
fn surveys_that_share_volume_are_one_likelihood() {
    let folder = Folder::new();
    let second: Vec<f64> = MEASURED.iter().map(|value| 0.8 * value).collect();
    folder.write("a.csv", table("near", &MEASURED, 1.0));
    folder.write("b.csv", table("far", &MEASURED, 1.0));
    folder.write("c.csv", table("mid", &second, 1.0));
    let mocks = mocks(80, 12, 3);
    folder.write("joint.csv", csv(&sample_covariance(&mocks)));
    folder.write("c-mocks.csv", csv(&mocks.columns(0, 6).into_owned()));
    folder.write("a-mocks.csv", csv(&mocks.columns(6, 6).into_owned()));
    // a and c share volume, b stands between them; the arrays hold c first.
    let text = |keys: &str, joint: &str| {
        format!(
            "{BACKGROUND}{}{}{}\n[[joint_covariance]]\nsurveys = [\"c\", \"a\"]\nnoise = \"t\"\n{joint}\n{CONSTANT}",
            survey("a", "near", "redshift = 0.35", &keys.replace("NAME", "a")),
            survey("b", "far", "redshift = 0.6", ""),
            survey("c", "mid", "redshift = 0.45", &keys.replace("NAME", "c")),
        )
    };
    let keep = "keep = [{ multipoles = [1] }]";
    let (study, measurements) = read(&folder, &text(keep, "file = \"joint.csv\"\nmock_count = 80"));
    let names: Vec<&str> = measurements.surveys.iter().map(|survey| survey.name.as_str()).collect();
    assert_eq!(names, ["a", "c", "b"]);
    assert_eq!(measurements.groups.len(), 2);
    let group = &measurements.groups[0].likelihood;
    assert_eq!((group.rows(), group.mock_count(), group.noise().name()), (6, Some(80), "t"));
    // Rows of a stand at 6, 7, 8 of the file, rows of c at 0, 1, 2.
    let order = [6, 7, 8, 0, 1, 2];
    let whole = sample_covariance(&mocks);
    close(group.covariance().matrix(), &whole.select_rows(&order).select_columns(&order));
    let own = measurements.surveys[1].likelihood.covariance().matrix();
    close(own, &whole.select_rows(&[0, 1, 2]).select_columns(&[0, 1, 2]));
    let posterior = Posterior::new(&study, study.default_hypothesis(), &measurements).unwrap();
    let mut scratch = posterior.scratch();
    let point = posterior.hypothesis.start();
    let found = posterior.log_likelihood(&point, &mut scratch).unwrap();
    let plain = posterior.plain_log_likelihood(&point, &mut scratch).unwrap();
    assert!((found / plain - 1.0).abs() < 1e-11, "{found} {plain}");

    // The same from the surveys' own mocks, realisation by realisation.
    let (study, measurements) = read(&folder, &text(&format!("{keep}\nmocks = \"NAME-mocks.csv\""), ""));
    let posterior = Posterior::new(&study, study.default_hypothesis(), &measurements).unwrap();
    let from_mocks = posterior.log_likelihood(&point, &mut posterior.scratch()).unwrap();
    assert!((found / from_mocks - 1.0).abs() < 1e-11, "{found} {from_mocks}");

    // Declared independent, with normal noise, they multiply.
    let apart = text(keep, "file = \"joint.csv\"\nempty_blocks = [[\"a\", \"c.mid\"]]")
        .replace("\"t\"", "\"gaussian\"");
    let (study, measurements) = read(&folder, &apart);
    let posterior = Posterior::new(&study, study.default_hypothesis(), &measurements).unwrap();
    let prediction = posterior.predict(&point, &mut posterior.scratch()).unwrap();
    let product: f64 = measurements
        .with_offsets()
        .map(|(first, survey)| {
            let rows = &prediction[first..first + survey.table.len()];
            survey.likelihood.log_likelihood(rows, &mut Vec::new())
        })
        .sum();
    let joint = posterior.data.log_likelihood(&prediction, &mut Vec::new());
    assert!((joint / product - 1.0).abs() < 1e-12, "{joint} {product}");
}

#[test]
fn an_estimate_is_shrunk_over_the_rows_that_are_kept() {
    let folder = Folder::new();
    folder.write("s.csv", table("near", &MEASURED, 1.0));
    let mocks = mocks(12, 6, 4);
    folder.write("mocks.csv", csv(&mocks));
    folder.write("model.csv", csv(&(DMatrix::identity(6, 6) * 1.5e-8)));
    let keys = "mocks = \"mocks.csv\"\nshrink_towards = \"model.csv\"\nkeep = [{ multipoles = [1] }]";
    let (_, measurements) = read(&folder, &one_survey(keys));
    let share = measurements.groups[0].shrinkage.unwrap();
    assert!(share > 0.0 && share < 1.0, "{share}");
    let kept = sample_covariance(&mocks).select_rows(&[0, 1, 2]).select_columns(&[0, 1, 2]);
    let expected = DMatrix::identity(3, 3) * (1.5e-8 * share) + kept * (1.0 - share);
    close(measurements.surveys[0].likelihood.covariance().matrix(), &expected);
}

#[test]
fn covariance_rows_name_the_rows_of_every_array() {
    let folder = Folder::new();
    folder.write("s.csv", table("near", &MEASURED, 1.0));
    // Arrays of eight rows: two that nobody measured, and the six in reverse.
    let mut names = String::from("bin,multipole,separation\nelsewhere,1,30\n");
    for (multipole, at) in ROWS.iter().rev() {
        writeln!(names, "near,{multipole},{at}").unwrap();
    }
    names.push_str("elsewhere,1,50\n");
    folder.write("rows.csv", names);
    let mocks = mocks(50, 8, 5);
    folder.write("mocks.csv", csv(&mocks));
    folder.write("extra.csv", csv(&(sample_covariance(&mocks) * 0.5)));
    let keys = "mocks = \"mocks.csv\"\ncovariance_rows = \"rows.csv\"\nextra_covariance = \"extra.csv\"";
    let (_, measurements) = read(&folder, &one_survey(keys));
    let order = [6, 5, 4, 3, 2, 1];
    let expected = sample_covariance(&mocks).select_rows(&order).select_columns(&order) * 1.5;
    close(measurements.surveys[0].likelihood.covariance().matrix(), &expected);
}

#[test]
fn quantities_that_the_data_determine_are_counted_or_given() {
    let folder = Folder::new();
    folder.write("s.csv", table("near", &MEASURED, 1.0));
    let mocks = mocks(60, 6, 6);
    folder.write("mocks.csv", csv(&mocks));
    let value = |keys: &str| {
        let (study, measurements) = read(&folder, &one_survey(&format!("mocks = \"mocks.csv\"\n{keys}")));
        let posterior = Posterior::new(&study, study.default_hypothesis(), &measurements).unwrap();
        assert_eq!(posterior.data.surveys()[0].noise().name(), "percival");
        posterior.log_likelihood(&posterior.hypothesis.start(), &mut posterior.scratch()).unwrap()
    };
    let counted = value("noise = \"percival\"");
    let given: Vec<f64> =
        (1..=4).map(|n| value(&format!("noise = \"percival\"\ndetermined = {n}"))).collect();
    // Counted here from the Fisher information about the centre of the priors.
    let (study, measurements) = read(&folder, &one_survey("mocks = \"mocks.csv\"\nnoise = \"t\""));
    let posterior = Posterior::new(&study, study.default_hypothesis(), &measurements).unwrap();
    let (centre, mut scratch) = (posterior.hypothesis.start(), posterior.scratch());
    let plain = posterior.predict(&centre, &mut scratch).unwrap();
    let size = centre.len();
    let mut jacobian = DMatrix::zeros(plain.len(), size);
    for parameter in 0..size {
        let mut moved = centre.clone();
        moved[parameter] += 1e-3;
        let moved = posterior.predict(&moved, &mut scratch).unwrap();
        for row in 0..plain.len() {
            jacobian[(row, parameter)] = (moved[row] - plain[row]) / 1e-3;
        }
    }
    let likelihood = &posterior.data.surveys()[0];
    let chi_squared = likelihood.chi_squared(&plain, &mut Vec::new());
    let fisher = likelihood.fisher_information(&jacobian) * likelihood.noise().weight(chi_squared);
    let priors: Vec<f64> = (0..size).map(|each| posterior.priors.standard_deviation(each)).collect();
    let prior = DMatrix::from_fn(size, size, |i, j| if i == j { priors[i].powi(-2) } else { 0.0 });
    let covariance = (fisher + prior).try_inverse().unwrap();
    let narrowed: Vec<f64> = (0..size).map(|each| covariance[(each, each)].sqrt() / priors[each]).collect();
    // None is near a half, so that the place of the peak does not matter.
    assert!(narrowed.iter().all(|ratio| (ratio - 0.5).abs() > 0.05), "{narrowed:?}");
    let expected = narrowed.iter().filter(|ratio| **ratio < 0.5).count();
    assert_eq!(counted, given[expected - 1], "{expected}: {counted} {given:?}");
    assert!(given.windows(2).all(|pair| pair[0] != pair[1]));
}
