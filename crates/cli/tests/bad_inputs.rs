//! What a user sees who got something wrong: the whole message, exit status 1, and nothing left behind.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use std::collections::BTreeSet;
use std::path::Path;
use std::process::Command;

const STUDY: &str = r#"title = "base"

[background]
omega_m = 0.31
omega_b = 0.049
h = 0.68
n_s = 0.965
sigma8 = 0.81

[[survey]]
name = "windmere"
multipoles = "multipoles.csv"
covariance = "covariance.csv"

[[survey.bin]]
name = "near"
redshift = 0.35
offset = { normal = [0.0, 10.0] }
first = { bias = 2.1, magnification = 0.5, evolution = { normal = [0.0, 0.3] } }
second = { bias = 1.2, magnification = 0.2, evolution = 0.0 }

[[hypothesis]]
name = "constant"
departure = "constant"
felt_by = "light"
tau = { normal = [0.0, 3.0] }
"#;

const TABLE: &str = r#"bin,multipole,separation,low,high,value
near,1,28,24,32,1.0e-3
near,1,36,32,40,8.0e-4
near,3,36,32,40,-1.0e-4
"#;

const COVARIANCE: &str = r#"4e-8,1e-8,0
1e-8,3e-8,0
0,0,2e-8
"#;

/// One thing that is wrong with an input that is right otherwise.
enum Edit {
    /// The study file: this text once, by that.
    Study(&'static str, &'static str),
    /// The table of measurements: this text once, by that.
    Table(&'static str, &'static str),
    /// The table of measurements, altogether.
    All(&'static str),
    /// The covariance: this text once, by that.
    Covariance(&'static str, &'static str),
    /// A folder that stands there already.
    Folder(&'static str),
}
use Edit::{All, Covariance, Folder, Study, Table};

struct Case {
    what: &'static str,
    edits: &'static [Edit],
    arguments: &'static [&'static str],
    message: &'static str,
}

#[rustfmt::skip]
const CASES: &[Case] = &[
    Case {
        what: "there is no study file",
        edits: &[],
        arguments: &["fit", "nowhere.toml"],
        message: r#"nowhere.toml: the study file cannot be read: there is no such file; give the path of a study file (`oddwell new DIR` writes one)"#,
    },
    Case {
        what: "there is no table",
        edits: &[Study(r#""multipoles.csv""#, r#""multipole.csv""#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipole.csv: there is no such file; correct the path, which counts from the folder of the study file"#,
    },
    Case {
        what: "there is no covariance",
        edits: &[Study(r#""covariance.csv""#, r#""covar.csv""#)],
        arguments: &["fit", "study.toml"],
        message: r#"covar.csv: there is no such file; correct the path, which counts from the folder of the study file"#,
    },
    Case {
        what: "a column has another name",
        edits: &[Table(r#"separation"#, r#"distance"#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipoles.csv, line 1: there is no column `separation` or `wavenumber`, only `bin`, `multipole`, `distance`, `low`, `high`, `value`; add it, or name the column that holds it with columns = { separation = "…" }"#,
    },
    Case {
        what: "a word in place of a number",
        edits: &[Table(r#"8.0e-4"#, r#"eight"#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipoles.csv, line 3, column `value`: must be a number, found `eight`; write it as 1.25 or 1.25e-3"#,
    },
    Case {
        what: "not a number",
        edits: &[Table(r#"8.0e-4"#, r#"NaN"#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipoles.csv, line 3, column `value`: must be a finite number, found `NaN`; leave the row out if it was not measured"#,
    },
    Case {
        what: "an empty table",
        edits: &[All(r#""#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipoles.csv: is empty, but must hold a header such as bin,multipole,separation,value and a row for each measured number"#,
    },
    Case {
        what: "a header and nothing else",
        edits: &[All(r#"bin,multipole,separation,value
"#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipoles.csv, line 1: a header with no rows below it; add at least one measured row"#,
    },
    Case {
        what: "a row twice",
        edits: &[Table(r#"near,3,36,32,40,-1.0e-4"#, r#"near,1,36,32,40,8.1e-4"#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipoles.csv, line 4: measures bin `near`, pair first-second, multipole 1, separation 36 again, which line 3 has already; remove one of the two"#,
    },
    Case {
        what: "a row of an unknown bin",
        edits: &[Table(r#"near,3"#, r#"nera,3"#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipoles.csv, line 4, column `bin`: `nera` is not a [[survey.bin]] of `windmere`, which has `near`; did you mean `near`?; add the bin to the study, or cut its rows with `keep`"#,
    },
    Case {
        what: "a bin without a row",
        edits: &[Study(r#"[[hypothesis]]"#, r#"[[survey.bin]]
name = "far"
redshift = 0.6
first = { bias = 2.1, magnification = 0.5, evolution = 0.0 }
second = { bias = 1.2, magnification = 0.2, evolution = 0.0 }

[[hypothesis]]"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml, line 23: the bin `windmere.far` has no row in multipoles.csv; add its rows, widen `keep`, or remove the bin"#,
    },
    Case {
        what: "a covariance of another size",
        edits: &[Covariance(r#"0,0,2e-8
"#, r#""#)],
        arguments: &["fit", "study.toml"],
        message: r#"covariance.csv: must be 3 × 3, one line and one column for each of the 3 rows, found 2 × 3; give the covariance of all rows of the table, in the table's order"#,
    },
    Case {
        what: "a covariance that is not symmetric",
        edits: &[Covariance(r#"1e-8,3e-8"#, r#"2e-8,3e-8"#)],
        arguments: &["fit", "study.toml"],
        message: r#"covariance.csv: must be symmetric, but the covariance of line 1 with line 2 is 1e-8 one way and 2e-8 the other; they may differ by 1e-6 of the two standard deviations: check that the file is whole and in one order"#,
    },
    Case {
        what: "a covariance that is not definite",
        edits: &[Covariance(r#"4e-8,1e-8,0
1e-8"#, r#"4e-8,9e-8,0
9e-8"#)],
        arguments: &["fit", "study.toml"],
        message: r#"survey `windmere`: covariance.csv: must be positive definite, but the smallest eigenvalue of its correlations is -1.598; that mode is made of line 2 (bin `near`, pair first-second, multipole 1, separation 28) (50 %), line 3 (bin `near`, pair first-second, multipole 1, separation 36) (50 %): cut or merge such rows, or estimate the covariance from more mocks than rows"#,
    },
    Case {
        what: "a negative variance",
        edits: &[Covariance(r#"0,0,2e-8"#, r#"0,0,-2e-8"#)],
        arguments: &["fit", "study.toml"],
        message: r#"covariance.csv: the variance of line 3 must be above 0, found -2e-8; give its variance, or remove the row where it was not measured"#,
    },
    Case {
        what: "an unknown key",
        edits: &[Study(r#"sigma8 ="#, r#"sigma9 ="#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:8:1: `sigma9` is not a key of [background]; did you mean `sigma8`?"#,
    },
    Case {
        what: "two priors for one quantity",
        edits: &[Study(r#"tau = { normal = [0.0, 3.0] }"#, r#"tau = { normal = [0.0, 3.0], uniform = [-9.0, 9.0] }"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:26:40: `tau` has two priors, `normal` and `uniform`; keep one of them"#,
    },
    Case {
        what: "bounds the wrong way round",
        edits: &[Study(r#"tau = { normal = [0.0, 3.0] }"#, r#"tau = { uniform = [9.0, -9.0] }"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:26:19: `tau`: uniform prior: low must be below high, got [9, -9]; swap them, or give a plain number to hold the quantity"#,
    },
    Case {
        what: "a standard deviation of zero",
        edits: &[Study(r#"tau = { normal = [0.0, 3.0] }"#, r#"tau = { normal = [0.0, 0.0] }"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:26:18: `tau`: normal prior: sd must be above 0, got 0; to hold the quantity, give a plain number"#,
    },
    Case {
        what: "a family that does not exist",
        edits: &[Study(r#"tau = { normal"#, r#"tau = { nomral"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:26:9: unknown prior family `nomral`; did you mean `normal`?"#,
    },
    Case {
        what: "same_as of nothing",
        edits: &[Study(r#"second = { bias = 1.2"#, r#"second = { bias = { same_as = "windmere.near.frist.bias" }"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:20:19: `same_as` of `windmere.near.second.bias` names `windmere.near.frist.bias`, but no quantity has that name; did you mean `windmere.near.first.bias`?"#,
    },
    Case {
        what: "same_as in a circle",
        edits: &[Study(r#"first = { bias = 2.1"#, r#"first = { bias = { same_as = "windmere.near.second.bias" }"#), Study(r#"second = { bias = 1.2"#, r#"second = { bias = { same_as = "windmere.near.first.bias" }"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:19:18: `same_as` runs in a circle: windmere.near.first.bias -> windmere.near.second.bias -> windmere.near.first.bias; give one of them a number or a prior"#,
    },
    Case {
        what: "a systematic that moves nothing",
        edits: &[Study(r#"[[hypothesis]]"#, r#"[[systematic]]
name = "slope"
amplitude = { normal = [0.0, 1.0] }
moves = [{ quantity = "windmere.*.third.evolution", by = 0.2 }]

[[hypothesis]]"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:25:23: the systematic `slope` moves nothing: no quantity that can move is called `windmere.*.third.evolution`; did you mean `windmere.*.first.evolution`?"#,
    },
    Case {
        what: "a redshift of zero",
        edits: &[Study(r#"redshift = 0.35"#, r#"redshift = 0.0"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:17:12: `windmere.near.redshift` must be above 0, not 0.0; give the pair-weighted mean redshift of the bin"#,
    },
    Case {
        what: "a separation of zero",
        edits: &[Table(r#"1,28,24,32"#, r#"1,0,24,32"#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipoles.csv, line 2, column `separation`: must be above 0, found 0; a separation is a length in Mpc/h"#,
    },
    Case {
        what: "a shell inside out",
        edits: &[Table(r#"28,24,32"#, r#"28,32,24"#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipoles.csv, line 2: low must be below high, found low 32 and high 24; swap or correct them"#,
    },
    Case {
        what: "multipole 7",
        edits: &[Table(r#"near,3"#, r#"near,7"#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipoles.csv, line 4, column `multipole`: must be 0, 1, 2, 3 or 4, found `7`; remove the row: no other multipole is predicted"#,
    },
    Case {
        what: "an unknown hypothesis",
        edits: &[],
        arguments: &["fit", "study.toml", "--hypothesis", "constnat"],
        message: r#"study.toml: the study has no hypothesis `constnat`; did you mean `constant`?"#,
    },
    Case {
        what: "an unknown departure",
        edits: &[Study(r#"departure = "constant""#, r#"departure = "constnat""#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:24:13: unknown departure `constnat`; did you mean `constant`?"#,
    },
    Case {
        what: "a shape that cannot be felt so",
        edits: &[Study(r#"departure = "constant"
felt_by = "light""#, r#"departure = "per-bin"
felt_by = "matter""#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:25:11: the departure `per-bin` cannot be felt by matter; it can be felt by light"#,
    },
    Case {
        what: "a run directory that exists",
        edits: &[Folder(r#"run"#)],
        arguments: &["fit", "study.toml", "--out", "run"],
        message: r#"run: exists already, and a run is never overwritten; give `--replace`, or another folder with `--out` (`--resume` goes on with one that was interrupted)"#,
    },
    Case {
        what: "an output folder that cannot be written",
        edits: &[],
        arguments: &["fit", "study.toml", "--out", "study.toml/run"],
        message: r#"study.toml/run: can't be written (File exists (os error 17)); choose a folder that you may write to with `--out`"#,
    },
    Case {
        what: "nothing to infer",
        edits: &[Study(r#"tau = { normal = [0.0, 3.0] }"#, r#"tau = 1.0"#), Study(r#"offset = { normal = [0.0, 10.0] }"#, r#""#), Study(r#"evolution = { normal = [0.0, 0.3] }"#, r#"evolution = 0.0"#)],
        arguments: &["fit", "study.toml"],
        message: r#"hypothesis `constant` has nothing to infer: every quantity is held; give at least one quantity a prior, such as `tau = { normal = [0.0, 3.0] }`"#,
    },
    Case {
        what: "more baryons than matter",
        edits: &[Study(r#"omega_b = 0.049"#, r#"omega_b = 0.49"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:5:11: `background.omega_b` must be below `background.omega_m` = 0.31, not 0.49; baryons are part of matter"#,
    },
    Case {
        what: "a survey twice",
        edits: &[Study(r#"[[hypothesis]]"#, r#"[[survey]]
name = "windmere"
multipoles = "multipoles.csv"
covariance = "covariance.csv"

[[survey.bin]]
name = "near"
redshift = 0.35
offset = { normal = [0.0, 10.0] }
first = { bias = 2.1, magnification = 0.5, evolution = { normal = [0.0, 0.3] } }
second = { bias = 1.2, magnification = 0.2, evolution = 0.0 }

[[hypothesis]]"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:23:8: the survey name `windmere` is given twice, first on line 11; rename one of the two"#,
    },
    Case {
        what: "keep that leaves nothing",
        edits: &[Study(r#"covariance = "covariance.csv""#, r#"covariance = "covariance.csv"
keep = [{ separation = [100.0, 144.0] }]"#)],
        arguments: &["fit", "study.toml"],
        message: r#"`keep` leaves none of the 3 rows of multipoles.csv, which reach over separations from 24 to 40; widen it"#,
    },
    Case {
        what: "no covariance and no errors",
        edits: &[Study(r#"covariance = "covariance.csv"
"#, r#""#)],
        arguments: &["fit", "study.toml"],
        message: r#"survey `windmere`: multipoles.csv, line 2: has no `error`, which each row needs where no covariance is given; add the column, or give `covariance` or `mocks`"#,
    },
    Case {
        what: "mocks that are not counted",
        edits: &[Study(r#"covariance = "covariance.csv""#, r#"covariance = "covariance.csv"
noise = "hartlap""#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:14:9: `noise = "hartlap"` needs `mock_count` beside it; say how many mocks the covariance was estimated from, give the `mocks` themselves, or choose `noise = "gaussian"`"#,
    },
    Case {
        what: "a file that is not TOML",
        edits: &[Study(r#"[background]"#, r#"[background"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:3:12: not valid TOML: unclosed table, expected `]`; see the study file's language in the README"#,
    },
    Case {
        what: "an override of nothing",
        edits: &[],
        arguments: &["fit", "study.toml", "--set", "windmere.near.ofset=3"],
        message: r#"--set windmere.near.ofset=3: `--set` names `windmere.near.ofset`, but no quantity has that name; did you mean `windmere.near.offset`?"#,
    },
    Case {
        what: "no shell edge on one side",
        edits: &[Table(r#"near,1,28,24,32"#, r#"near,1,28,24,"#)],
        arguments: &["fit", "study.toml"],
        message: r#"multipoles.csv, line 2: `low` is given without `high`; give both ends of the shell or neither"#,
    },
    Case {
        what: "a crossover below zero",
        edits: &[Study(r#"departure = "constant"
felt_by = "light"
tau = { normal = [0.0, 3.0] }"#, r#"departure = "braneworld"
crossover = -1.0"#)],
        arguments: &["fit", "study.toml"],
        message: r#"study.toml:25:13: `departure.crossover` = -1: the crossover length is in c/H0 and above 0; a large one is general relativity"#,
    },
];

fn entries(folder: &Path) -> BTreeSet<String> {
    std::fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().file_name().into_string().unwrap())
        .collect()
}

fn replace(text: &mut String, from: &str, to: &str) {
    assert!(text.contains(from), "{from}");
    *text = text.replacen(from, to, 1);
}

#[test]
fn every_message_is_whole_and_nothing_stays_behind() {
    for case in CASES {
        let folder = tempfile::tempdir().unwrap();
        let (mut study, mut table, mut covariance) =
            (STUDY.to_owned(), TABLE.to_owned(), COVARIANCE.to_owned());
        for edit in case.edits {
            match edit {
                Study(from, to) => replace(&mut study, from, to),
                Table(from, to) => replace(&mut table, from, to),
                Covariance(from, to) => replace(&mut covariance, from, to),
                All(text) => table = (*text).to_owned(),
                Folder(name) => std::fs::create_dir(folder.path().join(name)).unwrap(),
            }
        }
        for (name, text) in [("study.toml", study), ("multipoles.csv", table), ("covariance.csv", covariance)]
        {
            std::fs::write(folder.path().join(name), text).unwrap();
        }
        let before = entries(folder.path());
        let run = Command::new(env!("CARGO_BIN_EXE_oddwell"))
            .args(case.arguments)
            .current_dir(folder.path())
            .output()
            .unwrap();
        let said = String::from_utf8(run.stderr).unwrap();
        let errors: Vec<&str> = said.lines().filter(|line| !line.starts_with("fitting ")).collect();
        assert_eq!(errors, [format!("error: {}", case.message)], "{}", case.what);
        assert_eq!(run.status.code(), Some(1), "{}", case.what);
        assert_eq!(entries(folder.path()), before, "{}", case.what);
    }
    assert!(CASES.len() >= 30);
}

/// The input that the cases spoil is right: without an edit it runs.
#[test]
fn the_input_that_is_spoilt_is_right() {
    let folder = tempfile::tempdir().unwrap();
    for (name, text) in [("study.toml", STUDY), ("multipoles.csv", TABLE), ("covariance.csv", COVARIANCE)] {
        std::fs::write(folder.path().join(name), text).unwrap();
    }
    let run = Command::new(env!("CARGO_BIN_EXE_oddwell"))
        .args(["fit", "study.toml", "--quiet"])
        .current_dir(folder.path())
        .output()
        .unwrap();
    assert_eq!(run.status.code(), Some(0), "{}", String::from_utf8_lossy(&run.stderr));
    assert!(folder.path().join("runs/base-constant/summary.json").is_file());
}
