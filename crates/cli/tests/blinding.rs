//! `oddwell blind` and `oddwell reveal`: nothing leaks in between, and everything comes back.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use serde_json::Value;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

const PHRASE: &str = "nine herons over wet slate";

fn oddwell(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_oddwell")).args(arguments).current_dir(folder).output().unwrap()
}

fn succeed(folder: &Path, arguments: &[&str]) -> (String, String) {
    let run = oddwell(folder, arguments);
    let said = String::from_utf8(run.stderr).unwrap();
    assert!(run.status.success(), "{arguments:?}: {said}");
    (String::from_utf8(run.stdout).unwrap(), said)
}

/// The last column of a table of measurements, without notes and header.
fn values(path: &Path) -> Vec<f64> {
    let text = std::fs::read_to_string(path).unwrap();
    let rows = text.lines().filter(|line| !line.starts_with('#')).skip(1);
    rows.map(|line| line.rsplit(',').next().unwrap().parse().unwrap()).collect()
}

fn files(folder: &Path) -> Vec<PathBuf> {
    let mut found = Vec::new();
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() { found.extend(files(&path)) } else { found.push(path) }
    }
    found
}

/// Which of some sizes stands in a text as a number, to this relative closeness.
fn found_number(text: &str, sizes: &[f64], closeness: f64) -> Option<usize> {
    let part = |letter: char| letter.is_ascii_digit() || ".eE+-".contains(letter);
    let numbers = text.split(|letter| !part(letter)).filter_map(|word| word.parse::<f64>().ok());
    numbers
        .filter(|number| *number != 0.0)
        .find_map(|number| sizes.iter().position(|size| (number.abs() / size - 1.0).abs() < closeness))
}

fn summary(run: &Path) -> Value {
    serde_json::from_str(&std::fs::read_to_string(run.join("summary.json")).unwrap()).unwrap()
}

#[test]
fn blinded_measurements_come_back_and_nothing_leaks_before() {
    let folder = tempfile::tempdir().unwrap();
    let folder = folder.path();
    succeed(folder, &["new", "first"]);
    let phrase_file = folder.join("phrase.txt");
    std::fs::write(&phrase_file, format!("{PHRASE}\n")).unwrap();
    // A study in which everything inferred but tau is linear in the prediction and normal: biases held.
    let path = folder.join("first/study.toml");
    let mut text = std::fs::read_to_string(&path).unwrap();
    for bias in ["[2.0, 0.05]", "[1.2, 0.05]", "[2.2, 0.05]", "[1.3, 0.05]"] {
        let number = bias.trim_start_matches('[').split(',').next().unwrap();
        text = text.replace(&format!("bias = {{ normal = {bias} }}"), &format!("bias = {number}"));
    }
    text = text.replace("sigma8 = { normal = [0.81, 0.01] }", "sigma8 = 0.81");
    text = text.replace("tau = { uniform = [-30.0, 30.0] }", "tau = { uniform = [-300.0, 300.0] }");
    std::fs::write(&path, text).unwrap();

    let blind = ["blind", "first/study.toml", "--phrase-file", "phrase.txt", "--out", "blinded"];
    let (shown, said) = succeed(folder, &blind);
    assert!(said.contains("BLINDED"), "{said}");
    let said_blinding = shown + &said;
    let table = |folder_name: &str| folder.join(folder_name).join("windmere-multipoles.csv");
    let (original, shifted) = (values(&table("first")), values(&table("blinded")));
    let largest = |values: &[f64]| values.iter().fold(0.0_f64, |largest, value| largest.max(value.abs()));
    let moved: Vec<f64> = shifted.iter().zip(&original).map(|(one, other)| one - other).collect();
    assert!(largest(&moved) > 1e-3 * largest(&original), "something was added");

    // A fit of the blinded study says nothing of where the departure lies, and one of general relativity is refused.
    let (shown, said) = succeed(folder, &["fit", "blinded/study.toml", "--out", "run-blinded"]);
    let said_fitting = shown.clone() + &said;
    assert!(shown.contains("BLINDED"), "{shown}");
    assert!(!shown.contains("General relativity lies"), "{shown}");
    let blinded = summary(&folder.join("run-blinded"));
    assert_eq!(blinded["blinded"], true);
    for key in ["mean", "median", "interval68", "interval95"] {
        assert!(blinded["parameters"]["departure.tau"][key].is_null(), "{key}");
    }
    assert!(blinded["parameters"]["departure.tau"]["sd"].is_number());
    assert!(blinded["general_relativity"]["sigma"].is_null());
    assert!(blinded["best"]["parameters"].get("departure.tau").is_none());
    assert!(blinded["best"]["chi2"].is_number(), "how well it fits with the departure free is shown");
    let refused = oddwell(folder, &["fit", "blinded/study.toml", "--hypothesis", "gr"]);
    assert_eq!(refused.status.code(), Some(1));
    let said = String::from_utf8(refused.stderr).unwrap();
    assert!(
        said.contains("hypothesis `gr` has no inferred departure, and the measurements are blinded"),
        "{said}"
    );
    let (predicted, said) = succeed(folder, &["predict", "blinded/study.toml"]);
    assert!(said.contains("BLINDED"), "{said}");
    assert!(predicted.lines().nth(1).unwrap().contains(",,"), "the measured column is empty: {predicted}");
    let (checked, also) = succeed(folder, &["check", "blinded/study.toml"]);
    let said_predicting = predicted + &said + &checked + &also;

    // A wrong phrase is refused, and nothing is written.
    std::fs::write(folder.join("wrong.txt"), "nine herons over dry slate").unwrap();
    let wrong = oddwell(folder, &["reveal", "blinded", "--phrase-file", "wrong.txt", "--out", "revealed"]);
    assert_eq!(wrong.status.code(), Some(1));
    assert!(String::from_utf8(wrong.stderr).unwrap().contains("is not the phrase"));
    assert!(!folder.join("revealed").exists());

    // The right one brings everything back to 1e-12 of each multipole's size and tells the secret.
    let reveal = ["reveal", "blinded", "--phrase-file", "phrase.txt", "--out", "revealed", "--json"];
    let (told, _) = succeed(folder, &reveal);
    let secret = serde_json::from_str::<Value>(&told).unwrap()["secret_departure"].as_f64().unwrap();
    for (one, other) in values(&table("revealed")).iter().zip(&original) {
        assert!((one - other).abs() < 1e-12 * largest(&original), "{one} {other}");
    }
    let log = std::fs::read_to_string(folder.join("revealed/reveal.json")).unwrap();
    assert!(log.contains("planned") && log.contains("blinded_study_sha256"));

    // Where the problem is linear the blinded posterior is the true one, moved by the secret.
    succeed(folder, &["fit", "revealed/study.toml", "--out", "run-revealed", "--quiet"]);
    let revealed = summary(&folder.join("run-revealed"));
    let tau = |run: &str| -> Vec<f64> {
        let chain = std::fs::read_to_string(folder.join(run).join("chain.csv")).unwrap();
        let column =
            chain.lines().next().unwrap().split(',').position(|name| name == "departure.tau").unwrap();
        chain.lines().skip(1).map(|line| line.split(',').nth(column).unwrap().parse().unwrap()).collect()
    };
    let mean = |draws: &[f64]| draws.iter().sum::<f64>() / draws.len() as f64;
    let difference = mean(&tau("run-blinded")) - mean(&tau("run-revealed"));
    let error = revealed["parameters"]["departure.tau"]["mcse"].as_f64().unwrap();
    // Two runs, each with its Monte Carlo error: five of the sum of both.
    assert!((difference - secret).abs() < 10.0 * error, "{difference} {secret} ± {error}");

    // The phrase stands in no file but its own, nor in anything said; and no number written or said before the reveal is the
    // secret, or what it moved a row by, to a part in 10⁷. (A hundred thousand unrelated numbers meet one of thirty so closely
    // with a probability of a few in a thousand where they are of its size; a chain, with millions, is searched for all digits.)
    let largest_shift = largest(&moved);
    // A departure felt by light leaves octupoles alone.
    let mut shifts: Vec<f64> =
        moved.iter().map(|moved| moved.abs()).filter(|shift| *shift > 1e-6 * largest_shift).collect();
    assert_eq!(shifts.len(), 30);
    shifts.push(secret.abs());
    let mut searched = 0;
    for file in files(folder) {
        if file.ends_with("phrase.txt") || file.starts_with(folder.join("revealed")) {
            continue;
        }
        let content = String::from_utf8_lossy(&std::fs::read(&file).unwrap()).into_owned();
        assert!(!content.contains(PHRASE), "{}", file.display());
        let before =
            ["first", "blinded", "run-blinded"].iter().any(|name| file.starts_with(folder.join(name)));
        if before {
            let closeness = if file.ends_with("chain.csv") { 1e-13 } else { 1e-7 };
            let found = found_number(&content, &shifts, closeness);
            assert_eq!(found, None, "{}", file.display());
            searched += 1;
        }
    }
    assert!(searched >= 8, "{searched}");
    for said in [&said_blinding, &said_fitting, &said_predicting] {
        assert!(!said.contains(PHRASE));
        assert_eq!(found_number(said, &shifts, 1e-7), None, "{said}");
    }
    // The search finds what is there.
    assert_eq!(found_number(&format!("tau = {:.8};", -secret), &shifts, 1e-7), Some(shifts.len() - 1));
    assert_eq!(found_number(&told, &shifts, 1e-7), Some(shifts.len() - 1));
    let revealed_text = std::fs::read_to_string(folder.join("revealed/study.toml")).unwrap();
    assert!(!revealed_text.contains("[blinding]") && !revealed_text.contains(PHRASE));
}

#[test]
fn what_can_not_be_blinded_or_revealed_is_refused() {
    let folder = tempfile::tempdir().unwrap();
    let folder = folder.path();
    succeed(folder, &["new", "first"]);
    std::fs::write(folder.join("short.txt"), "abc").unwrap();
    std::fs::write(folder.join("phrase.txt"), PHRASE).unwrap();
    let refuse = |arguments: &[&str], message: &str| {
        let run = oddwell(folder, arguments);
        assert_eq!(run.status.code(), Some(1), "{arguments:?}");
        let said = String::from_utf8(run.stderr).unwrap();
        assert!(said.contains(message), "{said}");
    };
    refuse(
        &["blind", "first/study.toml", "--phrase-file", "short.txt", "--out", "b"],
        "error: short.txt: a phrase file: it must hold at least 8 characters; choose a longer phrase",
    );
    refuse(
        &["blind", "first/study.toml", "--phrase-file", "nowhere.txt", "--out", "b"],
        "error: nowhere.txt: a phrase file: it can't be read",
    );
    refuse(
        &["reveal", "first", "--phrase-file", "phrase.txt", "--out", "b"],
        "error: nothing is blinded; give the folder that `oddwell blind` wrote",
    );
    assert!(!folder.join("b").exists());
    succeed(folder, &["blind", "first/study.toml", "--phrase-file", "phrase.txt", "--out", "b"]);
    refuse(
        &["blind", "b/study.toml", "--phrase-file", "phrase.txt", "--out", "c"],
        "error: the study is blinded; reveal it before blinding it anew",
    );
}
