//! Covariances from mocks: against NumPy, as estimates, and every input that cannot be used.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

mod common;

use std::collections::BTreeMap;
use std::path::Path;

use common::{cases, covariance, generator, normal_matrix, normal_vector};
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{
    Covariance, ExtraCovariance, JointSurvey, MockSet, MockTables, MultipoleTable, NoiseChoice,
    SurveyLikelihood, read_extra_covariance, read_mock_tables, read_mocks,
};

/// Sums of some hundred products of numbers of one size, 100 times their scatter: 10⁻¹² of a covariance.
#[test]
fn estimates_are_those_of_numpy() {
    let cases = cases(include_str!("reference/mocks.csv"));
    assert_eq!(cases.len(), 4);
    for (name, case) in &cases {
        let rows = case["mean"].len();
        let count = case["mocks"].len() / rows;
        let mocks = MockSet::new(DMatrix::from_row_slice(count, rows, &case["mocks"]), "mocks").unwrap();
        assert_eq!((mocks.mock_count(), mocks.rows()), (count, rows));
        let mean = DVector::from_column_slice(&case["mean"]);
        assert!((mocks.mean() - mean).amax() < 1e-12, "{name}");
        let wanted = DMatrix::from_row_slice(rows, rows, &case["covariance"]);
        let found = mocks.covariance().unwrap();
        for (i, j) in (0..rows).flat_map(|i| (0..rows).map(move |j| (i, j))) {
            let scale = (wanted[(i, i)] * wanted[(j, j)]).sqrt();
            assert!(
                (found.matrix()[(i, j)] - wanted[(i, j)]).abs() < 1e-12 * scale,
                "{name}, entry {i}, {j}"
            );
        }
        let model = Covariance::new(DMatrix::from_row_slice(rows, rows, &case["model"]), "model").unwrap();
        let shrunk = mocks.shrunk(&model).unwrap();
        let share = case["share"][0];
        assert!((shrunk.share - share).abs() < 1e-10 * share, "{name}: {} {share}", shrunk.share);
        let mixed = model.matrix() * share + wanted * (1.0 - share);
        for (i, j) in (0..rows).flat_map(|i| (0..rows).map(move |j| (i, j))) {
            let scale = (mixed[(i, i)] * mixed[(j, j)]).sqrt();
            assert!((shrunk.covariance.matrix()[(i, j)] - mixed[(i, j)]).abs() < 1e-10 * scale, "{name}");
        }
    }
}

/// λ minimises the expected squared distance from the truth: the mean over draws at the estimated λ lies below those at 0,
/// at 1, and, within a few per cent, at the best fixed λ. It does not depend on units. 300 draws put the means' relative
/// errors at 2 %.
#[test]
fn shrinkage_is_near_its_optimum() {
    let rows = 8;
    let mut random = generator(5);
    let truth = covariance(rows, &mut random);
    let root = truth.clone().cholesky().unwrap().unpack();
    let scales = truth.diagonal().map(f64::sqrt);
    // The model has no correlations, and variances of its own.
    let wrong = truth.diagonal().map_with_location(|row, _, x| x * if row % 2 == 0 { 0.6 } else { 1.5 });
    let model = Covariance::new(DMatrix::from_diagonal(&wrong), "model").unwrap();
    let distance = |matrix: &DMatrix<f64>| {
        DMatrix::from_fn(rows, rows, |i, j| (matrix[(i, j)] - truth[(i, j)]) / (scales[i] * scales[j]))
            .norm_squared()
    };
    let grid: Vec<f64> = (0..=20).map(|step| f64::from(step) / 20.0).collect();
    let (mut at_estimate, mut on_grid) = (0.0, vec![0.0; grid.len()]);
    for _ in 0..300 {
        let sample = normal_matrix(40, rows, &mut random) * root.transpose();
        let mocks = MockSet::new(sample.clone(), "mocks").unwrap();
        let shrunk = mocks.shrunk(&model).unwrap();
        at_estimate += distance(shrunk.covariance.matrix());
        let estimate = mocks.covariance().unwrap();
        for (total, share) in on_grid.iter_mut().zip(&grid) {
            *total += distance(&(model.matrix() * *share + estimate.matrix() * (1.0 - share)));
        }
        let factors: Vec<f64> = (0..rows).map(|row| 10.0_f64.powi(row as i32 - 4)).collect();
        let rescaled = mocks.scaled(&factors).shrunk(&model.scaled(&factors)).unwrap();
        assert!((rescaled.share - shrunk.share).abs() < 1e-10);
    }
    let best = on_grid.iter().copied().fold(f64::INFINITY, f64::min);
    assert!(at_estimate < 0.8 * on_grid[0] && at_estimate < 0.8 * on_grid[20], "{at_estimate} {on_grid:?}");
    assert!(at_estimate < 1.15 * best, "{at_estimate} {best}");
}

/// The sample covariance is unbiased: over 4000 draws of 5 mocks its mean is the truth within the Monte Carlo error
/// (σ_iσ_j √(2/4)/√4000 = 1.1 % at most; 4.5 of these for 21 entries).
#[test]
fn the_estimate_is_unbiased() {
    let rows = 6;
    let mut random = generator(6);
    let truth = covariance(rows, &mut random);
    let root = truth.clone().cholesky().unwrap().unpack();
    let mut mean = DMatrix::zeros(rows, rows);
    let draws = 4000;
    for _ in 0..draws {
        let sample = normal_matrix(5, rows, &mut random) * root.transpose();
        mean += MockSet::new(sample, "mocks").unwrap().covariance().unwrap().matrix() / f64::from(draws);
    }
    for (i, j) in (0..rows).flat_map(|i| (0..rows).map(move |j| (i, j))) {
        let scale = (truth[(i, i)] * truth[(j, j)]).sqrt();
        assert!((mean[(i, j)] - truth[(i, j)]).abs() < 4.5 * 0.0112 * scale);
    }
}

#[test]
fn an_array_of_mocks() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference/arrays");
    let mocks = read_mocks(folder.join("mocks.npy"), 3).unwrap();
    assert_eq!((mocks.mock_count(), mocks.rows()), (4, 3));
    let wanted = DMatrix::from_fn(4, 3, |i, j| ((3 * i + j) as f64).powf(1.5));
    assert!((mocks.measurements() - &wanted).amax() < 1e-13);
    assert_eq!(
        read_mocks(folder.join("mocks-fortran-order.npy"), 3).unwrap().measurements(),
        mocks.measurements()
    );
    let text = "# four mocks\n0,1,2\n3,4,5\n6,7,8.5\n9,1,1\n";
    let parsed = MockSet::parse("mocks.csv", text.as_bytes(), 3).unwrap();
    assert_eq!(parsed.measurements()[(2, 2)], 8.5);
    assert_eq!(parsed.select(&[2, 0]).measurements()[(2, 0)], 8.5);
    assert_eq!(parsed.covariance().unwrap().origin(), "mocks.csv (4 mocks)");
    for (name, text, rows, message) in [
        (
            "mocks.csv",
            text,
            4,
            "mocks.csv: must have a line for each mock and 4 columns, one for each row, found 4 lines of 3; transpose it: \
             a line is one mock",
        ),
        (
            "mocks.csv",
            text,
            5,
            "mocks.csv: must have a line for each mock and 5 columns, one for each row, found 4 lines of 3; give each \
             mock's measurement of all rows of the table, in the table's order",
        ),
        (
            "mocks.csv",
            "1,2,3\n",
            3,
            "mocks.csv: a covariance needs at least two mocks, found 1; give more, or a covariance",
        ),
        (
            "mocks.csv",
            "1,2,3\n4,nan,6\n",
            3,
            "mocks.csv, line 2, column `2`: must be a finite number, found `nan`; leave the row out if it was not measured",
        ),
        ("mocks.csv", "", 3, "mocks.csv: is empty, but must hold a matrix of numbers, one line a row"),
        (
            "mocks.txt",
            text,
            3,
            "mocks.txt: the format is told from the ending, which must be one of .csv, .npy, .fits; save or rename the file",
        ),
    ] {
        assert_eq!(MockSet::parse(name, text.as_bytes(), rows).unwrap_err().to_string(), message);
    }
    let bytes = std::fs::read(folder.join("not-a-number.npy")).unwrap();
    assert_eq!(
        MockSet::parse("mocks.npy", &bytes, 3).unwrap_err().to_string(),
        "mocks.npy, row 2, column 2: must be a finite number, found NaN; leave out what was not measured"
    );
    let still = MockSet::parse("mocks.csv", b"1,2\n1,3\n", 2).unwrap();
    assert_eq!(
        still.covariance().unwrap_err().to_string(),
        "mocks.csv (2 mocks): the variance of row 1 must be above 0, found 0e0; give its variance, or remove the row \
         where it was not measured"
    );
    assert_eq!(
        MockSet::new(DMatrix::from_row_slice(2, 1, &[1.0, f64::INFINITY]), "mocks").unwrap_err().to_string(),
        "mocks: row 1 of mock 2 must be a finite number, found inf; leave that mock out, or cut the row"
    );
}

const TABLE: &str = "bin,multipole,separation,value\nnear,1,28,0.1\nnear,1,36,0.2\nfar,3,28,0.3\n";

/// Writes a mock with rows in another order, one row more, and another number of digits.
fn write_mock(folder: &Path, name: &str, values: [f64; 3]) {
    let [first, second, third] = values;
    let text = format!(
        "bin,multipole,separation,value,error\nfar,3,28.0,{third},1\nnear,1,36.000001,{second},1\nnear,0,28,99,1\n\
         near,1,28,{first},1\n"
    );
    std::fs::write(folder.join(name), text).unwrap();
}

fn tables(folder: &Path, pattern: &str) -> Result<MockTables, oddwell_likelihood::DataError> {
    let table = MultipoleTable::parse("larkfield.csv", TABLE.as_bytes(), &BTreeMap::new()).unwrap();
    read_mock_tables(folder, pattern, &BTreeMap::new(), &table)
}

#[test]
fn a_table_per_mock() {
    let folder = tempfile::tempdir().unwrap();
    // Characters that mean something in a pattern.
    let folder = folder.path().join("study [1]*");
    std::fs::create_dir_all(folder.join("mocks")).unwrap();
    for number in [9, 10, 11, 14, 15, 16] {
        let value = f64::from(number);
        write_mock(
            &folder.join("mocks"),
            &format!("larkfield-{number}-v2.csv"),
            [value, value * value, -value],
        );
    }
    let read = tables(&folder, "mocks/larkfield-*-v2.csv").unwrap();
    assert_eq!(read.mocks.mock_count(), 6);
    let first: Vec<f64> = read.mocks.measurements().column(0).iter().copied().collect();
    assert_eq!(first, [9.0, 10.0, 11.0, 14.0, 15.0, 16.0]);
    assert_eq!(read.mocks.measurements()[(2, 1)], 121.0);
    assert_eq!(read.mocks.measurements()[(2, 2)], -11.0);
    assert!(read.files[5].ends_with("mocks/larkfield-16-v2.csv"));
    let missing: Vec<&str> = read.missing.iter().map(|name| name.rsplit('/').next().unwrap()).collect();
    assert_eq!(missing, ["larkfield-12-v2.csv", "larkfield-13-v2.csv"]);
    assert_eq!(read.mocks.labels()[1], "line 3 (bin `near`, pair first-second, multipole 1, separation 36)");
    // Without a number in the names there is no numbering.
    write_mock(&folder.join("mocks"), "larkfield-last-v2.csv", [0.0, 0.0, 0.0]);
    assert_eq!(tables(&folder, "mocks/larkfield-*-v2.csv").unwrap().missing, [""; 0]);
}

#[test]
fn numbers_with_leading_zeros() {
    let folder = tempfile::tempdir().unwrap();
    for number in [8, 9, 11] {
        write_mock(folder.path(), &format!("m{number:04}.csv"), [f64::from(number), 0.0, 0.0]);
    }
    let read = tables(folder.path(), "m*.csv").unwrap();
    assert_eq!(read.missing.len(), 1);
    assert!(read.missing[0].ends_with("m0010.csv"), "{:?}", read.missing);
    // Two far-off numbers are no sequence with gaps.
    let other = tempfile::tempdir().unwrap();
    for number in [20_230_101, 20_240_101] {
        write_mock(other.path(), &format!("{number}.csv"), [f64::from(number), 0.0, 0.0]);
    }
    assert_eq!(tables(other.path(), "*.csv").unwrap().missing, [""; 0]);
}

#[test]
fn tables_of_mocks_that_cannot_be_used() {
    let folder = tempfile::tempdir().unwrap();
    let message = |pattern: &str| tables(folder.path(), pattern).unwrap_err().to_string();
    assert_eq!(
        message("mocks-*.csv"),
        "`mocks-*.csv`: no file matches; correct the pattern, which counts from the folder of the study file"
    );
    assert_eq!(
        message("mocks-***.csv"),
        "`mocks-***.csv` is no pattern of file names (wildcards are either regular `*` or recursive `**`); write it as \
         mocks/multipoles-*.csv"
    );
    for number in 1..=14 {
        write_mock(folder.path(), &format!("mocks-{number:02}.csv"), [1.0, 2.0, f64::from(number)]);
    }
    let short = "bin,multipole,separation,value\nnear,1,28,0.1\nfar,3,28,0.3\n";
    for number in 2..=13 {
        std::fs::write(folder.path().join(format!("mocks-{number:02}.csv")), short).unwrap();
    }
    let at = |number: usize| folder.path().join(format!("mocks-{number:02}.csv")).display().to_string();
    let list: Vec<String> = (2..=11).map(at).collect();
    assert_eq!(
        message("mocks-*.csv"),
        format!(
            "12 of the 14 mocks of `mocks-*.csv` lack a row that larkfield.csv measures; the first is {}, without bin \
             `near`, pair first-second, multipole 1, separation 36 (line 3): complete these mocks or move them away: {} \
             and 2 more",
            at(2),
            list.join(", ")
        )
    );
    std::fs::write(folder.path().join("broken-1.csv"), "bin,multipole,separation,value\nnear,1,28,x\n")
        .unwrap();
    assert_eq!(
        message("broken-*.csv"),
        format!(
            "{}, line 2, column `value`: must be a number, found `x`; write it as 1.25 or 1.25e-3",
            folder.path().join("broken-1.csv").display()
        )
    );
    write_mock(folder.path(), "alone.csv", [1.0, 2.0, 3.0]);
    assert_eq!(
        message("alone.csv"),
        "alone.csv: a covariance needs at least two mocks, found 1; give more, or a covariance"
    );
}

#[test]
fn surveys_that_share_volume() {
    let mut random = generator(7);
    let table = MultipoleTable::parse("larkfield.csv", TABLE.as_bytes(), &BTreeMap::new()).unwrap();
    let both = covariance(6, &mut random);
    let root = both.clone().cholesky().unwrap().unpack();
    let sample = normal_matrix(50, 6, &mut random) * root.transpose();
    let parts = [
        MockSet::new(sample.columns(0, 3).into_owned(), "a").unwrap(),
        MockSet::new(sample.columns(3, 3).into_owned(), "b").unwrap(),
    ];
    let joined = MockSet::joined(&parts).unwrap();
    assert_eq!(joined.measurements(), &sample);
    let estimate = joined.covariance().unwrap();
    let surveys = [
        JointSurvey { name: "larkfield", table: &table, kept: &[0, 2] },
        JointSurvey { name: "moorfield", table: &table, kept: &[1] },
    ];
    let noise = NoiseChoice::new("t", Some(joined.mock_count())).unwrap();
    let likelihood = SurveyLikelihood::joint(&surveys, &estimate, &noise).unwrap();
    // By hand: rows 0, 2 and 4 of the joint covariance.
    let by_hand = SurveyLikelihood::new(
        DVector::from_vec(vec![0.1, 0.3, 0.2]),
        estimate.select(&[0, 2, 4]).matrix().clone(),
        &noise,
    )
    .unwrap();
    let prediction = normal_vector(3, &mut random);
    let mut scratch = Vec::new();
    assert_eq!(
        likelihood.log_likelihood(prediction.as_slice(), &mut scratch),
        by_hand.log_likelihood(prediction.as_slice(), &mut scratch)
    );
    assert_eq!(likelihood.mock_count(), Some(50));
    assert_eq!(
        likelihood.covariance().labels()[2],
        "line 3 of moorfield (bin `near`, pair first-second, multipole 1, separation 36)"
    );
    let message = |error: String, wanted: &str| assert_eq!(error, wanted);
    message(
        SurveyLikelihood::joint(&surveys[..1], &estimate, &noise).unwrap_err().to_string(),
        "a with b (50 mocks): must have a row for each of the 3 measured rows, found 6; give one covariance for the same \
         rows in the same order",
    );
    let fewer = MockSet::new(sample.view((0, 0), (40, 3)).into_owned(), "c").unwrap();
    message(
        MockSet::joined(&[parts[0].clone(), fewer]).unwrap_err().to_string(),
        "surveys that share volume need the same mocks, but there are 50 of a and 40 of c; leave out what only one has",
    );
    message(
        MockSet::joined(&[]).unwrap_err().to_string(),
        "there are no mocks to join; name at least one survey",
    );
}

#[test]
fn what_is_added_and_what_is_left_out() {
    let covariance = Covariance::new(
        DMatrix::from_row_slice(3, 3, &[4.0, 1.0, 0.5, 1.0, 9.0, 2.0, 0.5, 2.0, 1.0]),
        "cov.csv",
    )
    .unwrap();
    // An error of the first two rows together, none of the third.
    let extra = |numbers: &[f64]| ExtraCovariance::new(DMatrix::from_row_slice(3, 3, numbers), "theory.csv");
    let sum = covariance.plus(&extra(&[1.0, 2.0, 0.0, 2.0, 4.0, 0.0, 0.0, 0.0, 0.0]).unwrap()).unwrap();
    assert_eq!(sum.matrix(), &DMatrix::from_row_slice(3, 3, &[5.0, 3.0, 0.5, 3.0, 13.0, 2.0, 0.5, 2.0, 1.0]));
    assert_eq!(sum.origin(), "cov.csv with theory.csv");
    let emptied = covariance.with_empty_block(&[0, 1], &[2]);
    assert_eq!(
        emptied.matrix(),
        &DMatrix::from_row_slice(3, 3, &[4.0, 1.0, 0.0, 1.0, 9.0, 0.0, 0.0, 0.0, 1.0])
    );
    assert_eq!(
        covariance.with_empty_block(&[0, 1, 2], &[0, 1, 2]).matrix(),
        &DMatrix::from_diagonal(&covariance.matrix().diagonal())
    );
    for (numbers, message) in [
        (
            [1.0, 0.0, 0.0, 0.0, -1.0, 0.0, 0.0, 0.0, 0.0],
            "theory.csv: the variance of row 2 must be 0 or above, found -1e0; correct it, or give 0 where nothing is added",
        ),
        (
            [1.0, 2.0, 0.0, 2.0, 1.0, 0.0, 0.0, 0.0, 0.0],
            "theory.csv: an additional covariance must have no negative eigenvalue, but the smallest is -1.000 of a unit \
             diagonal; check that the file is whole and that its correlations stay within -1 and 1",
        ),
        (
            [1.0, 0.0, 0.1, 0.0, 1.0, 0.0, 0.1, 0.0, 0.0],
            "theory.csv: an additional covariance must have no negative eigenvalue, but the smallest is -inf of a unit \
             diagonal; check that the file is whole and that its correlations stay within -1 and 1",
        ),
        (
            [1.0, 0.1, 0.0, 0.2, 1.0, 0.0, 0.0, 0.0, 0.0],
            "theory.csv: must be symmetric, but the covariance of row 1 with row 2 is 1e-1 one way and 2e-1 the other; \
             they may differ by 1e-6 of the two standard deviations: check that the file is whole and in one order",
        ),
        (
            [1.0, 0.0, 0.0, 0.0, f64::NAN, 0.0, 0.0, 0.0, 0.0],
            "theory.csv: the covariance of row 2 with row 2 must be a finite number, found NaN; correct the entry, or cut \
             the row with `keep` where it was not measured",
        ),
    ] {
        assert_eq!(extra(&numbers).unwrap_err().to_string(), message);
    }
    let small = ExtraCovariance::new(DMatrix::zeros(2, 2), "theory.csv").unwrap();
    assert_eq!(
        covariance.plus(&small).unwrap_err().to_string(),
        "theory.csv: must have a row for each of the 3 measured rows, found 2; give one covariance for the same rows in \
         the same order"
    );
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference/arrays");
    let read = read_extra_covariance(folder.join("c-order.npy"), 3).unwrap();
    assert_eq!(read.select(&[1]).scaled(&[2.0]).matrix()[(0, 0)], 36.0);
}
