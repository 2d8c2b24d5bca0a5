//! Tables that are sound: what is read from them, and which rows are kept.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

use std::collections::BTreeMap;

use oddwell_likelihood::{
    Axis, Covariance, IgnoredColumn, Keep, LengthUnit, MeasuredRow, MultipoleTable, keep_rows,
    read_covariance_csv, read_covariance_rows, read_multipoles,
};

fn parse(text: &str) -> MultipoleTable {
    MultipoleTable::parse("table.csv", text.as_bytes(), &BTreeMap::new()).unwrap()
}

#[test]
fn files_of_a_survey_are_read_whole() {
    let folder = tempfile::tempdir().unwrap();
    let write = |name: &str, text: &str| {
        let path = folder.path().join(name);
        std::fs::write(&path, text).unwrap();
        path
    };
    let table = write(
        "table.csv",
        "# invented\n\nvalue,error,xi_order,r,bin,low,high,pair,pairs_counted\n\
         1e-3,2e-4,1,28,near,24,32,,1200\n\
         # a note between rows\n\
         -2e-3,,3.0, 36 ,\"far, faint\",,,second-second,900\n",
    );
    let columns = BTreeMap::from(
        [("multipole", "xi_order"), ("separation", "r")]
            .map(|(name, file)| (name.to_owned(), file.to_owned())),
    );
    let table = read_multipoles(&table, &columns).unwrap();
    assert_eq!(
        table.rows,
        [
            MeasuredRow {
                bin: "near".to_owned(),
                pair: "first-second".to_owned(),
                multipole: 1,
                axis: Axis::Separation,
                at: 28.0,
                edges: Some((24.0, 32.0)),
                value: 1e-3,
                error: Some(2e-4),
                line: 4,
            },
            MeasuredRow {
                bin: "far, faint".to_owned(),
                pair: "second-second".to_owned(),
                multipole: 3,
                axis: Axis::Separation,
                at: 36.0,
                edges: None,
                value: -2e-3,
                error: None,
                line: 6,
            },
        ]
    );
    assert_eq!(table.ignored_columns, [IgnoredColumn { name: "pairs_counted".to_owned(), resembles: None }]);
    assert_eq!(table.bins(), ["near", "far, faint"]);

    // The covariance holds a third row, which the table lacks, and stands in another order.
    let rows = write(
        "rows.csv",
        "bin,pair,xi_order,r\n\"far, faint\",second-second,3,36\nmid,,1,28\nnear,,1,28.00001\n",
    );
    let rows = read_covariance_rows(rows, &columns).unwrap();
    let covariance = write("covariance.csv", "# three rows\n9,1,2\n1,4,0.5\n2,0.5,1\n");
    let covariance = read_covariance_csv(covariance, rows.len()).unwrap();
    let selected = covariance.select(&rows.positions(&table).unwrap());
    assert_eq!(selected.matrix().as_slice(), [1.0, 2.0, 2.0, 9.0]);
    assert_eq!(selected.labels(), ["line 4", "line 2"]);
    assert_eq!(selected.standard_deviations(), [1.0, 3.0]);
}

#[test]
fn line_ends_and_byte_order_marks_do_not_matter() {
    let unix = "# note\nbin,multipole,separation,value\nnear,1,28,1e-3\n\nnear,1,36,2e-3\n";
    let wanted = parse(unix);
    assert_eq!(wanted.rows.iter().map(|row| row.line).collect::<Vec<_>>(), [3, 5]);
    for text in [
        unix.replace('\n', "\r\n"),
        unix.replace('\n', "\r"),
        format!("\u{feff}{unix}"),
        unix.trim_end().to_owned(),
    ] {
        assert_eq!(parse(&text), wanted, "{text:?}");
    }
}

#[test]
fn a_column_that_looks_misspelt_is_pointed_out() {
    let table = parse("bin,multipole,separation,value,eror,weight\nnear,1,28,1e-3,1e-4,7\n");
    let ignored = |name: &str, resembles: Option<&str>| IgnoredColumn {
        name: name.to_owned(),
        resembles: resembles.map(str::to_owned),
    };
    assert_eq!(table.ignored_columns, [ignored("eror", Some("error")), ignored("weight", None)]);
}

#[test]
fn both_spaces_fit_in_one_table() {
    let table = parse(
        "bin,multipole,separation,wavenumber,value\nnear,1,28,,1e-3\nnear,1,,0.1,-40\nnear,2,,0.1,400\n",
    );
    assert_eq!(
        table.rows.iter().map(|row| (row.axis, row.at)).collect::<Vec<_>>(),
        [(Axis::Separation, 28.0), (Axis::Wavenumber, 0.1), (Axis::Wavenumber, 0.1)]
    );
}

/// 100 Mpc are 68 Mpc/h for h = 0.68; a wavenumber of 0.068/Mpc is 0.1 h/Mpc; a power of 1000 Mpc³ is 314.432 (Mpc/h)³.
#[test]
fn lengths_in_megaparsecs_are_converted() {
    let table = parse(
        "bin,multipole,separation,wavenumber,low,high,value,error\n\
         near,1,100,,90,110,0.001,0.0001\nnear,1,,0.068,0.0612,0.0748,1000,10\n",
    );
    let factors = table.value_factors(0.68);
    let covariance = Covariance::from_errors(&table).unwrap().scaled(&factors);
    let table = table.from_megaparsec(0.68).unwrap();
    // Two or three roundings each.
    let close =
        |found: f64, wanted: f64| assert!((found / wanted - 1.0).abs() < 1e-15, "{found}, wanted {wanted}");
    let [first, second] = [&table.rows[0], &table.rows[1]];
    for (row, at, low, high) in [(first, 68.0, 61.2, 74.8), (second, 0.1, 0.09, 0.11)] {
        close(row.at, at);
        close(row.edges.unwrap().0, low);
        close(row.edges.unwrap().1, high);
    }
    assert_eq!((first.value, first.error), (0.001, Some(0.0001)));
    close(second.value, 314.432);
    close(second.error.unwrap(), 3.14432);
    assert_eq!(covariance.matrix()[(0, 0)], 0.0001_f64.powi(2));
    assert!((covariance.matrix()[(1, 1)].sqrt() / 3.14432 - 1.0).abs() < 1e-15);
    assert_eq!("Mpc".parse::<LengthUnit>().unwrap(), LengthUnit::Megaparsec);
    assert_eq!("Mpc/h".parse::<LengthUnit>().unwrap(), LengthUnit::default());
}

const KEPT: &str = "\
bin,pair,multipole,separation,wavenumber,low,high,value
near,,1,28,,24,32,1
near,,1,36,,,,2
near,,3,28,,24,32,3
far,,1,28,,20,36,4
far,first-first,0,28,,24,32,5
far,,1,,0.1,0.08,0.12,6
";

fn kept(keep: &[Keep]) -> Vec<usize> {
    let table = parse(KEPT);
    let kept = keep_rows(&table, keep).unwrap();
    let mut all = [kept.rows.clone(), kept.cut].concat();
    all.sort_unstable();
    assert_eq!(all, (0..table.len()).collect::<Vec<_>>());
    kept.rows
}

#[test]
fn rows_are_kept_that_pass_any_entry() {
    let all = Keep::default();
    let separations = |low, high| Keep { separation: Some((low, high)), ..Keep::default() };
    assert_eq!(kept(&[]), [0, 1, 2, 3, 4, 5]);
    assert_eq!(kept(std::slice::from_ref(&all)), [0, 1, 2, 3, 4, 5]);
    // Ends included; a shell must lie inside, whatever its centre; rows at wavenumbers do not pass.
    assert_eq!(kept(&[separations(24.0, 36.0)]), [0, 1, 2, 4]);
    assert_eq!(kept(&[separations(20.0, 36.0)]), [0, 1, 2, 3, 4]);
    assert_eq!(kept(&[separations(24.1, 36.0)]), [1]);
    assert_eq!(kept(&[separations(24.0, 31.9), separations(36.0, 36.0)]), [1]);
    assert_eq!(kept(&[Keep { wavenumber: Some((0.08, 0.12)), ..all.clone() }]), [5]);
    // Both intervals in an entry: each row is held to its own.
    assert_eq!(kept(&[Keep { wavenumber: Some((0.08, 0.12)), ..separations(36.0, 40.0) }]), [1, 5]);
    assert_eq!(kept(&[Keep { multipoles: Some(vec![1, 2]), ..all.clone() }]), [0, 1, 3, 5]);
    assert_eq!(kept(&[Keep { bins: Some(vec!["near".to_owned()]), ..all.clone() }]), [0, 1, 2]);
    assert_eq!(kept(&[Keep { pairs: Some(vec!["first-first".to_owned()]), ..all.clone() }]), [4]);
    // All criteria of one entry, any of several.
    let near_dipole =
        Keep { bins: Some(vec!["near".to_owned()]), multipoles: Some(vec![1]), ..separations(24.0, 32.0) };
    assert_eq!(kept(std::slice::from_ref(&near_dipole)), [0]);
    assert_eq!(kept(&[near_dipole, Keep { multipoles: Some(vec![0]), ..all }]), [0, 4]);
}

/// 41/0.67·0.67 is not 41 in binary: an end that is written exactly still counts.
#[test]
fn an_end_that_was_rounded_is_still_an_end() {
    let mut moved = 0;
    for h in [0.67, 0.674, 0.68, 0.7, 0.71] {
        for (low, high) in [(24.0, 32.0), (41.0, 47.0), (0.1, 0.3)] {
            let text = format!(
                "bin,multipole,separation,low,high,value\nnear,1,{},{},{},1\n",
                (low + high) / 2.0 / h,
                low / h,
                high / h
            );
            let table = parse(&text).from_megaparsec(h).unwrap();
            moved += usize::from(table.rows[0].edges != Some((low, high)));
            let keep = Keep { separation: Some((low, high)), ..Keep::default() };
            assert_eq!(keep_rows(&table, &[keep]).unwrap().rows, [0]);
        }
    }
    assert!(moved > 0, "no case that the slack is for");
}
