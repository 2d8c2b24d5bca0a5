//! Windows: what is predicted is a matrix times the prediction at rows of its own.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{BACKGROUND, CONSTANT, Folder, survey};
use nalgebra::DMatrix;
use oddwell_sampler::Target;
use oddwell_study::assemble::{Posterior, read_measurements};
use oddwell_study::{Study, predict, predict_by_effect};
use std::fmt::Write;

/// Multipoles 1 and 3 at these separations.
fn table(separations: &[f64]) -> String {
    let mut text = String::from("bin,multipole,separation,value,error\n");
    for multipole in [1, 3] {
        for separation in separations {
            writeln!(text, "near,{multipole},{separation},{:e},1e-4", 0.05 / separation).unwrap();
        }
    }
    text
}

fn window_rows(separations: &[f64]) -> String {
    let mut text = String::from("bin,multipole,separation\n");
    for multipole in [1, 3] {
        for separation in separations {
            writeln!(text, "near,{multipole},{separation}").unwrap();
        }
    }
    text
}

fn csv(matrix: &DMatrix<f64>) -> String {
    let line = |row: usize| matrix.row(row).iter().map(|x| format!("{x:?}")).collect::<Vec<_>>().join(",");
    (0..matrix.nrows()).map(|row| line(row) + "\n").collect()
}

/// As NumPy writes it: 8-byte numbers, lowest byte first, line after line.
fn npy(matrix: &DMatrix<f64>) -> Vec<u8> {
    let (rows, columns) = matrix.shape();
    let header = format!("{{'descr': '<f8', 'fortran_order': False, 'shape': ({rows}, {columns}), }}");
    let mut bytes = b"\x93NUMPY\x01\x00\x76\x00".to_vec();
    bytes.extend(format!("{header:117}\n").into_bytes());
    bytes.extend(matrix.transpose().iter().flat_map(|number| number.to_le_bytes()));
    bytes
}

fn text(keys: &str) -> String {
    ["title = \"windows\"\n", BACKGROUND, &survey("larkfield", "near", "redshift = 0.35", keys), CONSTANT]
        .concat()
}

const WINDOW: &str = "window = \"window.csv\"\nwindow_rows = \"rows.csv\"";

fn predicted(study: &Study) -> Vec<f64> {
    predict(study, study.default_hypothesis()).unwrap().iter().map(|row| row.predicted).collect()
}

/// The largest difference, relative to the largest number.
fn difference(one: &[f64], other: &[f64]) -> f64 {
    assert_eq!(one.len(), other.len());
    let largest = other.iter().fold(0.0_f64, |largest, value| largest.max(value.abs()));
    one.iter().zip(other).fold(0.0_f64, |worst, (a, b)| worst.max((a - b).abs())) / largest
}

const SEPARATIONS: [f64; 5] = [28.0, 44.0, 60.0, 92.0, 124.0];

#[test]
fn the_identity_changes_nothing() {
    let folder = Folder::new();
    folder.write("larkfield.csv", table(&SEPARATIONS));
    folder.write("rows.csv", window_rows(&SEPARATIONS));
    folder.write("window.csv", csv(&DMatrix::identity(10, 10)));
    let plain = predicted(&folder.study(&text("")));
    // A product with 1 and sums of zeros are exact.
    assert_eq!(predicted(&folder.study(&text(WINDOW))), plain);
}

/// A Gaussian of 6 Mpc/h over points 2 Mpc/h apart, and a leak of a tenth between the multipoles.
fn smoothing(fine: &[f64]) -> DMatrix<f64> {
    let (rows, columns) = (SEPARATIONS.len(), fine.len());
    DMatrix::from_fn(2 * rows, 2 * columns, |row, column| {
        let weights = |at: f64| (-0.5 * ((at - SEPARATIONS[row % rows]) / 6.0).powi(2)).exp();
        let norm: f64 = fine.iter().map(|at| weights(*at)).sum();
        let leak = if row / rows == column / columns { 0.9 } else { 0.1 };
        leak * weights(fine[column % columns]) / norm
    })
}

#[test]
fn a_smoothing_window_is_a_convolution_compressed_or_not() {
    let folder = Folder::new();
    let fine: Vec<f64> = (0..78).map(|step| 10.0 + 2.0 * f64::from(step)).collect();
    let matrix = smoothing(&fine);
    folder.write("larkfield.csv", table(&SEPARATIONS));
    folder.write("rows.csv", window_rows(&fine));
    folder.write("window.csv", csv(&matrix));
    let windowed = folder.study(&text(WINDOW));
    let smoothed = predicted(&windowed);

    // The convolution, from the prediction at every point.
    folder.write("larkfield.csv", table(&fine));
    let at_points = predicted(&folder.study(&text("")));
    let direct: Vec<f64> = (0..matrix.nrows())
        .map(|row| (0..fine.len() * 2).map(|column| matrix[(row, column)] * at_points[column]).sum())
        .collect();
    // 156 products each: rounding is of order 1e-15 of the largest. Nothing else may differ.
    let worst = difference(&smoothed, &direct);
    assert!(worst < 1e-13, "{worst:e}");
    // And it is no small change: the window's leak alone moves them by a tenth.
    folder.write("larkfield.csv", table(&SEPARATIONS));
    assert!(difference(&smoothed, &predicted(&folder.study(&text("")))) > 0.05);

    // As .npy, in the order of C.
    let npy = npy(&matrix);
    folder.write("window.npy", npy);
    let from_npy = predicted(&folder.study(&text(&WINDOW.replace("window.csv", "window.npy"))));
    assert_eq!(from_npy, smoothed);

    let measurements = read_measurements(&windowed).unwrap();
    assert_eq!((measurements.len(), measurements.model_rows().len()), (10, 156));
    let posterior = Posterior::new(&windowed, windowed.default_hypothesis(), &measurements).unwrap();
    assert!(posterior.has_fixed_kernels());
    let mut scratch = posterior.scratch();
    for point in [[0.0, 2.1, 0.1, 0.0], [12.0, 2.0, -0.3, 4.0], [-7.0, 2.2, 0.5, -6.0]] {
        let plain = posterior.plain_log_likelihood(&point, &mut scratch).unwrap();
        let compressed = posterior.log_likelihood(&point, &mut scratch).unwrap();
        // QR of whitened kernels: 1e-15 times the squared norm of what it compresses, here up to some 1e3.
        assert!((plain - compressed).abs() < 1e-10 * plain.abs().max(1.0), "{plain} {compressed}");
    }
}

#[test]
fn a_window_applies_to_each_effect() {
    let folder = Folder::new();
    let fine: Vec<f64> = (0..78).map(|step| 10.0 + 2.0 * f64::from(step)).collect();
    folder.write("larkfield.csv", table(&SEPARATIONS));
    folder.write("rows.csv", window_rows(&fine));
    folder.write("window.csv", csv(&smoothing(&fine)));
    let study = folder.study(&text(WINDOW));
    let (rows, effects) = predict_by_effect(&study, study.default_hypothesis()).unwrap();
    let predicted: Vec<f64> = rows.iter().map(|row| row.predicted).collect();
    let sums: Vec<f64> = (0..10).map(|row| effects.iter().map(|(_, column)| column[row]).sum()).collect();
    assert!(difference(&sums, &predicted) < 1e-11, "{sums:?} {predicted:?}");
    let redshift = effects.iter().find(|(name, _)| name == "gravitational_redshift").unwrap();
    assert!(redshift.1.iter().all(|value| *value != 0.0));
}

#[test]
fn a_window_is_cut_with_its_rows_and_stands_beside_surveys_without() {
    let folder = Folder::new();
    let fine: Vec<f64> = (0..78).map(|step| 10.0 + 2.0 * f64::from(step)).collect();
    folder.write("larkfield.csv", table(&SEPARATIONS));
    folder.write("northmoor.csv", table(&SEPARATIONS).replace("near", "deep"));
    folder.write("rows.csv", window_rows(&fine));
    folder.write("window.csv", csv(&smoothing(&fine)));
    let both = |keys: &str| {
        let deep = survey("northmoor", "deep", "redshift = 0.7", "");
        let first = survey("larkfield", "near", "redshift = 0.35", keys);
        [&deep, &first].iter().fold(format!("title = \"two\"\n{BACKGROUND}"), |all, next| all + next)
            + CONSTANT
    };
    let alone = predicted(&folder.study(&text(WINDOW)));
    let plain = predicted(&folder.study(&both("")));
    let mixed = predicted(&folder.study(&both(WINDOW)));
    // The grid of wavenumbers reaches as far as the largest separation asks, and with it the last digits.
    assert!(difference(&mixed[..10], &plain[..10]) < 1e-13);
    assert!(difference(&mixed[10..], &alone) < 1e-13);
    assert!(difference(&plain[10..], &alone) > 0.05);

    let keep = format!("{WINDOW}\nkeep = [{{ separation = [40.0, 100.0], multipoles = [3] }}]");
    let study = folder.study(&text(&keep));
    assert!(difference(&predicted(&study), &alone[6..9]) < 1e-13);
    // A column that no kept row needs is not predicted.
    let mut sharp = DMatrix::zeros(10, 156);
    (0..10).for_each(|row| sharp[(row, 3 * row)] = 2.0);
    folder.write("window.csv", csv(&sharp));
    let measurements = read_measurements(&folder.study(&text(&keep))).unwrap();
    let at: Vec<f64> = measurements.model_rows().iter().map(|row| row.at).collect();
    assert_eq!(at, [fine[18], fine[21], fine[24]]);
}

#[test]
fn lengths_in_megaparsec_go_through_a_window_that_changes_space() {
    // Measured: one separation; predicted: two wavenumbers, so the matrix has a unit.
    let folder = Folder::new();
    let h: f64 = 0.68;
    let study = |unit: f64, keys: &str| {
        let measured = format!("bin,multipole,separation,value,error\nnear,1,{:?},0.001,1e-4\n", 50.0 / unit);
        folder.write("larkfield.csv", measured);
        let wave = |k: f64| k * unit;
        let rows = format!(
            "bin,multipole,wavenumber,low,high\nnear,1,{:?},{:?},{:?}\nnear,1,{:?},,\n",
            wave(0.05),
            wave(0.04),
            wave(0.06),
            wave(0.1)
        );
        folder.write("rows.csv", rows);
        let entry = |value: f64| value * unit.powi(3);
        folder.write("window.csv", format!("{:?},{:?}\n", entry(1e-5), entry(3e-5)));
        predicted(&folder.study(&text(keys)))
    };
    let with_h = study(1.0, WINDOW);
    let without = study(h, &format!("{WINDOW}\nunit = \"Mpc\""));
    // Seventeen digits are written, and every length goes through one product.
    assert!(difference(&without, &with_h) < 1e-12, "{without:?} {with_h:?}");
    assert!(with_h[0].abs() > 1e-5);
}

#[test]
fn every_bad_window_says_what_is_wrong_in_full() {
    let ones = |rows, columns| csv(&DMatrix::from_element(rows, columns, 0.5));
    let rows = window_rows(&[30.0, 40.0]);
    let shape =
        "must have 10 lines, one for each row of larkfield.csv, and 4 columns, one for each row of rows.csv";
    let order = "give the window of all rows of the table, in the table's order, whatever `keep` cuts";
    let mut zeros = DMatrix::from_element(10, 4, 0.5);
    zeros.row_mut(6).fill(0.0);
    let cases = [
        (ones(9, 4), rows.clone(), format!("window.csv: {shape}, found 9 and 4; {order}")),
        (ones(4, 10), rows.clone(), format!("window.csv: {shape}, found 4 and 10; transpose it")),
        (ones(10, 4).replacen("0.5", "nan", 1), rows.clone(), "window.csv, line 1, column `1`: must be a finite number, found `nan`; leave the row out if it was not measured".into()),
        (csv(&zeros), rows.clone(), "window.csv, matrix line 7: must have an entry other than 0 for a row that is kept, found zeros only; correct the line, or cut that row with `keep`".into()),
        (ones(10, 4), rows.replacen("near", "naer", 1), "rows.csv, line 2, column `bin`: must be a [[survey.bin]] of `larkfield`, found `naer`; did you mean `near`?".into()),
        (ones(10, 4), rows.replacen("40", "30", 1), "rows.csv, line 3: measures bin `near`, pair first-second, multipole 1, separation 30 again, which line 2 has already; remove one of the two".into()),
        (ones(10, 4), "bin,multipole,separation,wavenumber\nnear,1,30,0.1\n".into(), "rows.csv, line 2: has a separation (30) and a wavenumber (0.1); a row is measured at one of them: leave the other empty".into()),
        (ones(10, 1), "bin,multipole,separation,low,high\nnear,1,30,40,50\n".into(), "rows.csv, line 2: must have `low` and `high` with 0 <= low < high around 30, or neither, found `40` and `50`; correct the two".into()),
        (ones(10, 1), "bin,multipole,separation,low,high\nnear,1,30,,50\n".into(), "rows.csv, line 2: must have `low` and `high` with 0 <= low < high around 30, or neither, found `` and `50`; correct the two".into()),
    ];
    for (matrix, rows, message) in cases {
        let folder = Folder::new();
        folder.write("larkfield.csv", table(&SEPARATIONS));
        folder.write("window.csv", matrix);
        folder.write("rows.csv", rows);
        let said = read_measurements(&folder.study(&text(WINDOW))).unwrap_err().to_string();
        assert_eq!(folder.local(&said), message);
    }
    let folder = Folder::new();
    folder.write("larkfield.csv", table(&SEPARATIONS));
    folder.write("rows.csv", rows);
    let said = read_measurements(&folder.study(&text(WINDOW))).unwrap_err().to_string();
    assert_eq!(
        folder.local(&said),
        "window.csv: there is no such file; correct the path, which counts from the folder of the study file"
    );
    let said = read_measurements(&folder.study(&text(&WINDOW.replace("window.csv", "window.txt"))));
    assert_eq!(
        folder.local(&said.unwrap_err().to_string()),
        "window.txt: the format is told from the ending, which must be one of .csv, .npy, .fits; save or rename the file"
    );
}
