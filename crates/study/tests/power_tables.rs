//! The user's own power spectrum.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{BACKGROUND, CONSTANT, Folder, survey};
use oddwell_cosmology::{LinearPower, PowerShape};
use oddwell_study::{Study, predict};

const MEASURED: &str = "bin,multipole,separation,value,error\nnear,0,30,0.1,0.01\nnear,1,30,0.002,1e-4\nnear,1,60,0.001,1e-4\nnear,3,90,0.0001,1e-4\n";

fn study(folder: &Folder, power: &str) -> Study {
    folder.write("larkfield.csv", MEASURED);
    let background = format!("{BACKGROUND}power = \"{power}\"\n");
    folder.study(
        &["title = \"p\"\n", &background, &survey("larkfield", "near", "redshift = 0.35", ""), CONSTANT]
            .concat(),
    )
}

fn predicted(study: &Study) -> Vec<f64> {
    predict(study, study.default_hypothesis()).unwrap().iter().map(|row| row.predicted).collect()
}

/// The fitting formula as a table, of another amplitude and from `low` to `high`.
fn table(low: f64, high: f64, header: &str) -> String {
    let power = LinearPower::new(&PowerShape::EisensteinHu, 0.31, 0.049, 0.68, 0.965, 0.5).unwrap();
    let count = 3000;
    let step = (high / low).ln() / f64::from(count - 1);
    let mut text = format!("# made up\n{header}\n");
    for index in 0..count {
        let k = if index + 1 == count { high } else { low * (step * f64::from(index)).exp() };
        text.push_str(&format!("{k:.17e},0,{:.17e}\n", 7.0 * power.power(k)));
    }
    text
}

#[test]
fn a_table_gives_what_its_formula_gives() {
    let folder = Folder::new();
    folder.write("power.csv", table(1e-5, 50.0, "wavenumber,note,power"));
    let from_table = predicted(&study(&folder, "power.csv"));
    let formula = predicted(&study(&folder, "eisenstein-hu"));
    for (one, other) in from_table.iter().zip(&formula) {
        // A cubic spline in the logarithms, 0.005 apart: (0.1)⁴/384 of the wiggles' fourth derivative, some 1e-7 of P; and
        // the variance in 8 Mpc/h of what lies beyond the table's ends.
        assert!((one / other - 1.0).abs() < 3e-6, "{one} {other}");
    }
    assert!(predicted(&study(&folder, "eisenstein-hu-smooth"))[2] / formula[2] - 1.0 > 1e-3);
}

#[test]
fn every_bad_table_says_what_is_wrong_in_full() {
    let header = "wavenumber,note,power";
    let short = "wavenumber,power\n0.01,1e4\n0.02,1.1e4\n0.03,1e4\n0.04,9e3\n";
    let cases = [
        (
            table(1e-5, 50.0, "k,note,power"),
            "power.csv, line 2: must have the columns `wavenumber` (h/Mpc) and `power` ((Mpc/h)³), found `k,note,power`; name the columns so in the header",
        ),
        (
            short.replace("0.03,1e4", "0.03,much"),
            "power.csv, line 4: must hold numbers, found `much`; correct that entry",
        ),
        (
            short.replace("0.03", "0.015"),
            "power.csv: power table, entry 3: wavenumber = 0.015: must be above the one before it; correct the table",
        ),
        (
            table(1e-5, 0.3, header),
            "power.csv: the power spectrum is given from 0.00001 to 0.3 h/Mpc, and is needed from 0.0001 to 8.6 h/Mpc; give a table that covers that range",
        ),
        (
            "wavenumber,power\n".to_owned(),
            "power.csv: power table: 0 wavenumbers and 0 powers: must be as many of each, and 4 or more; correct the table",
        ),
        (
            String::new(),
            "power.csv, line 1: must have the columns `wavenumber` (h/Mpc) and `power` ((Mpc/h)³), found ``; name the columns so in the header",
        ),
        (short.replace("1.1e4", ""), "power.csv, line 3: must hold numbers, found ``; correct that entry"),
    ];
    let mut wrong = Vec::new();
    for (table, message) in cases {
        let folder = Folder::new();
        folder.write("power.csv", table);
        let study = study(&folder, "power.csv");
        let said = folder.local(&predict(&study, study.default_hypothesis()).unwrap_err().to_string());
        if said != message {
            wrong.push(format!("said: {said}\nmust: {message}"));
        }
    }
    let folder = Folder::new();
    let study = study(&folder, "power.csv");
    let said = folder.local(&predict(&study, study.default_hypothesis()).unwrap_err().to_string());
    if said
        != "power.csv: there is no such file; correct the path, which counts from the folder of the study file"
    {
        wrong.push(said);
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}
