//! Every input that cannot be used, and the whole of what the user reads.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

mod common;

use std::collections::BTreeMap;

use oddwell_likelihood::{
    Covariance, CovarianceRows, DataError, Keep, MultipoleTable, NoiseChoice, SurveyLikelihood, keep_rows,
    read_covariance_csv, read_covariance_rows, read_multipoles,
};

fn columns(pairs: &[(&str, &str)]) -> BTreeMap<String, String> {
    pairs.iter().map(|(name, in_file)| ((*name).to_owned(), (*in_file).to_owned())).collect()
}

fn parse(text: &str) -> Result<MultipoleTable, DataError> {
    MultipoleTable::parse("larkfield.csv", text.as_bytes(), &BTreeMap::new())
}

/// A sound table of four rows, two in each of two bins.
const SOUND: &str = "\
# shells of 8 Mpc/h
bin,multipole,separation,low,high,value,error
near,1,28,24,32,0.001,1e-4
near,1,36,32,40,0.002,1e-4
far,1,28,24,32,0.003,1e-4
far,3,28,24,32,-0.001,1e-4
";

/// The sound table with one line's text replaced.
fn with(line: &str, by: &str) -> String {
    assert!(SOUND.contains(line));
    SOUND.replacen(line, by, 1)
}

fn check<T: std::fmt::Debug>(result: Result<T, DataError>, message: &str) {
    assert_eq!(result.unwrap_err().to_string(), message);
}

#[test]
fn tables() {
    assert_eq!(parse(SOUND).unwrap().len(), 4);
    let first = "near,1,28,24,32,0.001,1e-4";
    for (text, message) in [
        (
            String::new(),
            "larkfield.csv: is empty, but must hold a header such as bin,multipole,separation,value and a row for each \
             measured number",
        ),
        (
            "# only\n\n# notes\n".to_owned(),
            "larkfield.csv: is empty, but must hold a header such as bin,multipole,separation,value and a row for each \
             measured number",
        ),
        (
            "\u{feff}\u{feff}".to_owned(),
            "larkfield.csv: is empty, but must hold a header such as bin,multipole,separation,value and a row for each \
             measured number",
        ),
        (
            "# note\nbin,multipole,separation,value\n".to_owned(),
            "larkfield.csv, line 2: a header with no rows below it; add at least one measured row",
        ),
        (
            SOUND.replace("value", "vlaue"),
            "larkfield.csv, line 2: there is no column `value`, only `bin`, `multipole`, `separation`, `low`, `high`, \
             `vlaue`, `error`; did you mean `vlaue`? rename it, or map it with columns = { value = \"vlaue\" }",
        ),
        (
            SOUND.replace("bin,", "z,"),
            "larkfield.csv, line 2: there is no column `bin`, only `z`, `multipole`, `separation`, `low`, `high`, \
             `value`, `error`; add it, or name the column that holds it with columns = { bin = \"…\" }",
        ),
        (
            SOUND.replace("separation", "r"),
            "larkfield.csv, line 2: there is no column `separation` or `wavenumber`, only `bin`, `multipole`, `r`, `low`, \
             `high`, `value`, `error`; add it, or name the column that holds it with columns = { separation = \"…\" }",
        ),
        (
            SOUND.replace(',', ";"),
            "larkfield.csv, line 2: there is no column `bin`, only `bin;multipole;separation;low;high;value;error`; \
             separate the columns with commas",
        ),
        (
            SOUND.replace("high", "top"),
            "larkfield.csv, line 2: there is no column `high`, only `bin`, `multipole`, `separation`, `low`, `top`, \
             `value`, `error`; add it, or name the column that holds it with columns = { high = \"…\" }",
        ),
        (
            SOUND.replace("error", "value"),
            "larkfield.csv, line 2, column `value`: fields 6 and 7 of the header have the same name; rename one of them",
        ),
        (
            with(first, "near,1,28,24,32,0.001"),
            "larkfield.csv, line 3: must have 7 fields as line 2 has, found 6; add or remove commas",
        ),
        (
            with(first, "near,1,28,24,32,0,001,1e-4"),
            "larkfield.csv, line 3: must have 7 fields as line 2 has, found 8; add or remove commas",
        ),
        (
            with(first, "\"near,1,28,24,32,0.001,1e-4"),
            "larkfield.csv, line 3: a quote (\") is opened and not closed on this line; close or remove it",
        ),
        (
            with(first, "near,1,28,24,32,0.001 per cent,1e-4"),
            "larkfield.csv, line 3, column `value`: must be a number, found `0.001 per cent`; write it as 1.25 or 1.25e-3",
        ),
        (
            with(first, "near,1,28,24,32,--,1e-4"),
            "larkfield.csv, line 3, column `value`: must be a number, found `--`; write it as 1.25 or 1.25e-3",
        ),
        (
            with(first, "near,1,28,24,32,nan,1e-4"),
            "larkfield.csv, line 3, column `value`: must be a finite number, found `nan`; leave the row out if it was not \
             measured",
        ),
        (
            with(first, "near,1,28,24,32,1e999,1e-4"),
            "larkfield.csv, line 3, column `value`: must be a finite number, found `1e999`; leave the row out if it was \
             not measured",
        ),
        (
            with(first, "near,1,inf,24,32,0.001,1e-4"),
            "larkfield.csv, line 3, column `separation`: must be a finite number, found `inf`; leave the row out if it \
             was not measured",
        ),
        (
            with(first, "near,1,28,24,32,,1e-4"),
            "larkfield.csv, line 3, column `value`: is empty; write the measured number, or leave the row out",
        ),
        (
            with(first, ",1,28,24,32,0.001,1e-4"),
            "larkfield.csv, line 3, column `bin`: is empty; write the name of a bin of the study",
        ),
        (
            with(first, "near,,28,24,32,0.001,1e-4"),
            "larkfield.csv, line 3, column `multipole`: is empty; write 0, 1, 2, 3 or 4",
        ),
        (
            with(first, "near,7,28,24,32,0.001,1e-4"),
            "larkfield.csv, line 3, column `multipole`: must be 0, 1, 2, 3 or 4, found `7`; remove the row: no other \
             multipole is predicted",
        ),
        (
            with(first, "near,1.5,28,24,32,0.001,1e-4"),
            "larkfield.csv, line 3, column `multipole`: must be 0, 1, 2, 3 or 4, found `1.5`; remove the row: no other \
             multipole is predicted",
        ),
        (
            with(first, "near,dipole,28,24,32,0.001,1e-4"),
            "larkfield.csv, line 3, column `multipole`: must be a number, found `dipole`; write it as 1.25 or 1.25e-3",
        ),
        (
            with(first, "near,1,0,24,32,0.001,1e-4"),
            "larkfield.csv, line 3, column `separation`: must be above 0, found 0; a separation is a length in Mpc/h",
        ),
        (
            "bin,multipole,wavenumber,value\nnear,1,-0.1,5\n".to_owned(),
            "larkfield.csv, line 2, column `wavenumber`: must be above 0, found -0.1; a wavenumber is counted in h/Mpc",
        ),
        (
            with(first, "near,1,28,24,,0.001,1e-4"),
            "larkfield.csv, line 3: `low` is given without `high`; give both ends of the shell or neither",
        ),
        (
            with(first, "near,1,28,,32,0.001,1e-4"),
            "larkfield.csv, line 3: `high` is given without `low`; give both ends of the shell or neither",
        ),
        (
            with(first, "near,1,28,-4,32,0.001,1e-4"),
            "larkfield.csv, line 3, column `low`: must be 0 or above, found -4; a shell cannot begin below 0",
        ),
        (
            with(first, "near,1,28,32,24,0.001,1e-4"),
            "larkfield.csv, line 3: low must be below high, found low 32 and high 24; swap or correct them",
        ),
        (
            with(first, "near,1,28,28,28,0.001,1e-4"),
            "larkfield.csv, line 3: low must be below high, found low 28 and high 28; swap or correct them",
        ),
        (
            with(first, "near,1,20,24,32,0.001,1e-4"),
            "larkfield.csv, line 3, column `separation`: must lie within its shell, from 24 to 32, found 20; correct the \
             centre or the ends",
        ),
        (
            with(first, "near,1,28,24,32,0.001,0"),
            "larkfield.csv, line 3, column `error`: must be above 0, found 0; an error is a standard deviation; leave \
             the row out if it was not measured",
        ),
        (
            with(first, "near,1,28,24,32,0.001,-1e-4"),
            "larkfield.csv, line 3, column `error`: must be above 0, found -0.0001; an error is a standard deviation; \
             leave the row out if it was not measured",
        ),
        (
            with("near,1,36,32,40,0.002", "near,1,28,24,32,0.002"),
            "larkfield.csv, line 4: measures bin `near`, pair first-second, multipole 1, separation 28 again, which line \
             3 has already; remove one of the two",
        ),
        (
            "bin,multipole,separation,wavenumber,value\nnear,1,28,0.1,0.001\n".to_owned(),
            "larkfield.csv, line 2: has a separation (28) and a wavenumber (0.1); a row is measured at one of them: \
             leave the other empty",
        ),
        (
            "bin,multipole,separation,wavenumber,value\nnear,1,,,0.001\n".to_owned(),
            "larkfield.csv, line 2: has neither a separation nor a wavenumber; fill one of them",
        ),
        (
            "bin,pair,multipole,separation,value\nnear,first-secnd,1,28,0.001\n".to_owned(),
            "larkfield.csv, line 2, column `pair`: must be `first-second`, `first-first` or `second-second`, found \
             `first-secnd`; did you mean `first-second`?",
        ),
        (
            "bin,pair,multipole,separation,value\nnear,second-first,1,28,0.001\n".to_owned(),
            "larkfield.csv, line 2, column `pair`: must be `first-second`, `first-first` or `second-second`, found \
             `second-first`; write first-second, and the odd multipoles with the other sign: they follow the separation \
             from the first tracer to the second",
        ),
        (
            "bin,pair,multipole,separation,value\nnear,1x2,1,28,0.001\n".to_owned(),
            "larkfield.csv, line 2, column `pair`: must be `first-second`, `first-first` or `second-second`, found \
             `1x2`; an empty field stands for first-second",
        ),
    ] {
        assert_eq!(parse(&text).expect_err(&text).to_string(), message);
    }
}

#[test]
fn tables_that_are_not_text() {
    let bytes = |bytes: &[u8]| MultipoleTable::parse("larkfield.csv", bytes, &BTreeMap::new());
    check(
        bytes(b"bin,multipole,separation,value\nnear,1,28,\xff\n"),
        "larkfield.csv, line 2: must be utf-8 text, found the byte 0xff; save the table as plain csv in utf-8",
    );
    check(
        bytes(b"\x93NUMPY\x01\x00"),
        "larkfield.csv, line 1: must be utf-8 text, found the byte 0x93; save the table as plain csv in utf-8",
    );
}

#[test]
fn mapped_columns() {
    let parse = |text: &str, map: &[(&str, &str)]| {
        MultipoleTable::parse("larkfield.csv", text.as_bytes(), &columns(map))
    };
    check(
        parse(SOUND, &[("sepration", "r")]),
        "larkfield.csv: `columns` maps `sepration`, which is no column of such a table; did you mean `separation`?; the \
         columns are `bin`, `pair`, `multipole`, `separation`, `wavenumber`, `low`, `high`, `value`, `error`",
    );
    check(
        parse(SOUND, &[("value", "xi1")]),
        "larkfield.csv, line 2: there is no column `xi1`, only `bin`, `multipole`, `separation`, `low`, `high`, `value`, \
         `error`; add it, or name the column that holds it with columns = { value = \"…\" }",
    );
    check(
        parse(SOUND, &[("error", "value")]),
        "larkfield.csv, line 2, column `value`: would be read both as `value` and as `error`; map each to a column of \
         its own in `columns`",
    );
    // The file's own header stands in messages.
    check(
        parse(&SOUND.replace("value", "xi").replace("0.003", "x"), &[("value", "xi")]),
        "larkfield.csv, line 5, column `xi`: must be a number, found `x`; write it as 1.25 or 1.25e-3",
    );
}

#[test]
fn files() {
    let message = "no-such.csv: there is no such file; correct the path, which counts from the folder of the study file";
    check(read_multipoles("no-such.csv", &BTreeMap::new()), message);
    check(read_covariance_csv("no-such.csv", 4), message);
    check(read_covariance_rows("no-such.csv", &BTreeMap::new()), message);
    // A folder: the wording of the reason is the operating system's.
    let error = read_multipoles("src", &BTreeMap::new()).unwrap_err();
    let DataError::Unreadable { reason, .. } = &error else { panic!("{error}") };
    assert_eq!(
        error.to_string(),
        format!("src: cannot be read ({reason}); check that it is a file and that you may read it")
    );
}

#[test]
fn covariances() {
    let parse = |text: &str| Covariance::parse_csv("cov.csv", text.as_bytes(), 2);
    parse("# note\n2.0,0.5\n0.5,1.0\n").unwrap().check_definite().unwrap();
    for (text, message) in [
        ("", "cov.csv: is empty, but must hold a square matrix, one line a row"),
        (
            "near,far\n2.0,0.5\n0.5,1.0\n",
            "cov.csv, line 1: a covariance has no header, found `near`; begin the line with # to make it a note",
        ),
        (
            "2.0\n",
            "cov.csv: must be 2 × 2, one line and one column for each of the 2 rows, found 1 × 1; separate the numbers \
             of a line with commas",
        ),
        (
            "2.0 0.5\n0.5 1.0\n",
            "cov.csv: must be 2 × 2, one line and one column for each of the 2 rows, found 2 × 1; separate the numbers \
             of a line with commas",
        ),
        (
            "1,0,0\n0,1,0\n0,0,1\n",
            "cov.csv: must be 2 × 2, one line and one column for each of the 2 rows, found 3 × 3; if it holds more rows \
             than the table, name its rows with `covariance_rows`",
        ),
        (
            "1,0\n0,1\n0,0\n",
            "cov.csv: must be 2 × 2, one line and one column for each of the 2 rows, found 3 × 2; give the covariance of \
             all rows of the table, in the table's order",
        ),
        (
            "2.0,0.5\n0.5\n",
            "cov.csv, line 2: must have 2 fields as line 1 has, found 1; add or remove commas",
        ),
        (
            "# note\n2.0,0.5\n0.5,one\n",
            "cov.csv, line 3, column `2`: must be a number, found `one`; write it as 1.25 or 1.25e-3",
        ),
        (
            "2.0,nan\nnan,1.0\n",
            "cov.csv, line 1, column `2`: must be a finite number, found `nan`; leave the row out if it was not measured",
        ),
        (
            "2.0,0.5\n0.4,1.0\n",
            "cov.csv: must be symmetric, but the covariance of line 1 with line 2 is 5e-1 one way and 4e-1 the other; \
             they may differ by 1e-6 of the two standard deviations: check that the file is whole and in one order",
        ),
        (
            "2.0,0.5\n0.5,-1.0\n",
            "cov.csv: the variance of line 2 must be above 0, found -1e0; give its variance, or remove the row where it \
             was not measured",
        ),
        (
            "0.0,0.0\n0.0,1.0\n",
            "cov.csv: the variance of line 1 must be above 0, found 0e0; give its variance, or remove the row where it \
             was not measured",
        ),
    ] {
        check(parse(text), message);
    }
    // Rounding passes, and is evened out.
    let covariance = parse("2.0,0.5000001\n0.5,1.0\n").unwrap();
    assert_eq!(covariance.matrix()[(0, 1)], covariance.matrix()[(1, 0)]);
    assert!((covariance.matrix()[(0, 1)] - 0.50000005).abs() < 1e-15);
}

#[test]
fn covariances_that_are_not_definite() {
    // Correlation 2 of the first and third: an eigenvalue 1 − 2 with half of each.
    let covariance = Covariance::parse_csv("cov.csv", b"4,0,4\n0,9,0\n4,0,1\n", 3).unwrap();
    assert_eq!(
        covariance.check_definite().unwrap_err().to_string(),
        "cov.csv: must be positive definite, but the smallest eigenvalue of its correlations is -1.000; that mode is \
         made of line 1 (50 %), line 3 (50 %): cut or merge such rows, or estimate the covariance from more mocks than \
         rows"
    );
    // With the table's names for the rows; a duplicate up to a factor is singular, which rounding hides from a plain
    // Cholesky factorisation.
    let table = parse(&SOUND.lines().take(5).collect::<Vec<_>>().join("\n")).unwrap();
    let covariance = Covariance::parse_csv("cov.csv", b"0.01,0.02,0\n0.02,0.04,0\n0,0,1\n", 3).unwrap();
    assert_eq!(
        covariance.with_labels(table.row_labels()).check_definite().unwrap_err().to_string(),
        "cov.csv: must be positive definite, but the smallest eigenvalue of its correlations is 0 within rounding; that \
         mode is made of line 3 (bin `near`, pair first-second, multipole 1, separation 28) (50 %), line 4 (bin `near`, \
         pair first-second, multipole 1, separation 36) (50 %): cut or merge such rows, or estimate the covariance from \
         more mocks than rows"
    );
}

/// A covariance from no more mocks than rows is singular, and rounding lets a plain Cholesky factorisation through for many
/// of these; it is sound over the rows that are kept.
#[test]
fn covariances_from_too_few_mocks_are_not_definite() {
    for seed in 0..500 {
        let sample = common::normal_matrix(12, 12, &mut common::generator(seed));
        let centred = nalgebra::DMatrix::from_fn(12, 12, |i, j| sample[(i, j)] - sample.column(j).mean());
        let covariance = Covariance::new(centred.tr_mul(&centred) / 11.0, "cov.csv").unwrap();
        assert!(covariance.check_definite().is_err(), "seed {seed}");
        covariance.select(&[0, 2, 4, 6]).check_definite().unwrap();
    }
}

#[test]
fn errors_in_place_of_a_covariance() {
    let table = parse(&with("0.003,1e-4", "0.003,")).unwrap();
    assert_eq!(
        Covariance::from_errors(&table).unwrap_err().to_string(),
        "larkfield.csv, line 5: has no `error`, which each row needs where no covariance is given; add the column, or \
         give `covariance` or `mocks`"
    );
    let table = parse(SOUND).unwrap();
    let covariance = Covariance::from_errors(&table).unwrap();
    assert_eq!(covariance.matrix(), &(nalgebra::DMatrix::identity(4, 4) * 1e-4_f64.powi(2)));
    let survey = SurveyLikelihood::from_covariance(
        table.select(&[0, 1]).values(),
        covariance.select(&[0, 1, 2]),
        &NoiseChoice::gaussian(),
    );
    assert_eq!(
        survey.unwrap_err().to_string(),
        "larkfield.csv (column `error`): must have a row for each of the 2 measured rows, found 3; give one covariance \
         for the same rows in the same order"
    );
}

#[test]
fn covariance_rows() {
    let table = parse(SOUND).unwrap();
    let parse = |text: &str| CovarianceRows::parse("rows.csv", text.as_bytes(), &BTreeMap::new());
    let sound = "bin,multipole,separation\nfar,3,28\nfar,1,28\nnear,1,28\nnear,1,36\nnear,1,44\n";
    assert_eq!(parse(sound).unwrap().positions(&table).unwrap(), [2, 3, 1, 0]);
    check(
        parse(&sound.replace("near,1,36\n", "")).unwrap().positions(&table),
        "rows.csv: has no row for bin `near`, pair first-second, multipole 1, separation 36, which larkfield.csv, line 4, \
         measures; add the row, with its line and column in the covariance, or cut it with `keep`",
    );
    for (text, message) in [
        (
            "bin,multipole,separation\n".to_owned(),
            "rows.csv, line 1: a header with no rows below it; add at least one measured row",
        ),
        (
            sound.replace("multipole", "multipol"),
            "rows.csv, line 1: there is no column `multipole`, only `bin`, `multipol`, `separation`; did you mean \
             `multipol`? rename it, or map it with columns = { multipole = \"multipol\" }",
        ),
        (
            sound.replace("near,1,44", "far,3,28.0"),
            "rows.csv, line 6: measures bin `far`, pair first-second, multipole 3, separation 28 again, which line 2 has \
             already; remove one of the two",
        ),
        (
            sound.replace("near,1,44", "near,1,x"),
            "rows.csv, line 6, column `separation`: must be a number, found `x`; write it as 1.25 or 1.25e-3",
        ),
    ] {
        check(parse(&text), message);
    }
}

#[test]
fn keep() {
    let table = parse(SOUND).unwrap();
    let cut = |entry: Keep| keep_rows(&table, &[Keep::default(), entry]);
    check(
        cut(Keep { separation: Some((144.0, 24.0)), ..Keep::default() }),
        "entry 2 of `keep`: separation must run from low to high, found [144, 24]; swap the two",
    );
    check(
        cut(Keep { wavenumber: Some((0.2, 0.1)), ..Keep::default() }),
        "entry 2 of `keep`: wavenumber must run from low to high, found [0.2, 0.1]; swap the two",
    );
    check(
        cut(Keep { bins: Some(vec!["neer".to_owned()]), ..Keep::default() }),
        "entry 2 of `keep`: there is no bin `neer`, only `near`, `far`; did you mean `near`?",
    );
    check(
        cut(Keep { pairs: Some(vec!["first-frist".to_owned()]), ..Keep::default() }),
        "entry 2 of `keep`: there is no pair `first-frist`, only `first-second`, `first-first`, `second-second`; did you \
         mean `first-first`?",
    );
    check(
        cut(Keep { multipoles: Some(vec![1, 7]), ..Keep::default() }),
        "entry 2 of `keep`: there is no multipole `7`, only `0`, `1`, `2`, `3`, `4`",
    );
    check(
        keep_rows(&table, &[Keep { separation: Some((30.0, 36.0)), ..Keep::default() }]),
        "`keep` leaves none of the 4 rows of larkfield.csv, which reach over separations from 24 to 40; widen it",
    );
}

#[test]
fn units() {
    let message = |text: &str| text.parse::<oddwell_likelihood::LengthUnit>().unwrap_err().to_string();
    assert_eq!(message("mpc"), "unit must be `Mpc/h` or `Mpc`, found `mpc`; did you mean `Mpc`?");
    assert_eq!(message("furlong"), "unit must be `Mpc/h` or `Mpc`, found `furlong`");
    check(
        parse(SOUND).unwrap().from_megaparsec(0.0),
        "larkfield.csv: converting from Mpc needs h above 0 and finite, found 0; hold `background.h` or give \
         `fiducial.h`",
    );
}

#[test]
fn noise() {
    let data = nalgebra::DVector::from_vec(vec![0.0; 26]);
    let covariance = nalgebra::DMatrix::identity(26, 26);
    let message = |noise: NoiseChoice| {
        SurveyLikelihood::new(data.clone(), covariance.clone(), &noise).unwrap_err().to_string()
    };
    assert_eq!(
        NoiseChoice::new("hartlapp", None).unwrap_err().to_string(),
        "unknown noise model `hartlapp`; did you mean `hartlap`?; there are `gaussian`, `hartlap`, `t`, `percival`"
    );
    for (name, mocks, text) in [
        (
            "hartlap",
            None,
            "noise `hartlap` needs the number of mocks behind the covariance; give `mock_count` or `mocks`, or choose \
             noise \"gaussian\" where the covariance is known exactly",
        ),
        (
            "hartlap",
            Some(28),
            "noise `hartlap` needs at least 29 mocks for 26 kept rows, found mock_count 28; keep fewer rows or make more \
             mocks",
        ),
        (
            "t",
            Some(26),
            "noise `t` needs at least 27 mocks for 26 kept rows, found mock_count 26; keep fewer rows or make more mocks",
        ),
        (
            "percival",
            Some(30),
            "noise `percival` needs at least 31 mocks for 26 kept rows, found mock_count 30; keep fewer rows or make \
             more mocks",
        ),
        (
            "percival",
            Some(31),
            "noise `percival` needs the number of quantities that the data determine; count those whose sd the data at \
             least halve, or set it",
        ),
    ] {
        assert_eq!(message(NoiseChoice::new(name, mocks).unwrap()), text);
    }
    assert_eq!(
        message(NoiseChoice::new("percival", Some(60)).unwrap().with_determined(27)),
        "noise `percival`: the data cannot determine 27 quantities with 26 kept rows; set at most 26"
    );
    // One more mock, and each is well.
    for (name, mocks) in [("hartlap", 29), ("t", 27), ("percival", 31)] {
        let noise = NoiseChoice::new(name, Some(mocks)).unwrap().with_determined(26);
        SurveyLikelihood::new(data.clone(), covariance.clone(), &noise).unwrap();
    }
}

#[test]
fn data_and_matrices() {
    use nalgebra::{DMatrix, DVector};
    let build = |data: Vec<f64>, covariance: DMatrix<f64>| {
        SurveyLikelihood::new(DVector::from_vec(data), covariance, &NoiseChoice::gaussian())
            .unwrap_err()
            .to_string()
    };
    assert_eq!(
        build(vec![1.0, f64::NAN], DMatrix::identity(2, 2)),
        "measured value 2 must be a finite number, found NaN; leave out what was not measured"
    );
    assert_eq!(
        build(vec![1.0, 2.0], DMatrix::zeros(2, 3)),
        "covariance: a covariance must be square, found 2 × 3; give a line and a column for each row"
    );
    assert_eq!(
        build(vec![1.0, 2.0], DMatrix::from_row_slice(2, 2, &[1.0, f64::INFINITY, 0.0, 1.0])),
        "covariance: the covariance of row 1 with row 2 must be a finite number, found inf; correct the entry, or cut \
         the row with `keep` where it was not measured"
    );
}
