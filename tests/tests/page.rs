//! The page over runs: what it says is what the runs' files say, and it is whole for runs of every kind.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_report::{Page, PageInput, page};
use oddwell_study::blinding::blind;
use oddwell_study::review::{Review, review};
use oddwell_study::{Control, FitOptions, Study, fit};
use serde_json::Value;
use std::path::{Path, PathBuf};
use tempfile::TempDir;

fn demo() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../data-demo")
}

/// A copy of the demo whose study file was edited.
fn edited(edit: impl Fn(String) -> String) -> TempDir {
    let folder = tempfile::tempdir().unwrap();
    for entry in std::fs::read_dir(demo()).unwrap() {
        let path = entry.unwrap().path();
        std::fs::copy(&path, folder.path().join(path.file_name().unwrap())).unwrap();
    }
    let file = folder.path().join("study.toml");
    let text = std::fs::read_to_string(&file).unwrap();
    let changed = edit(text.clone());
    assert_ne!(text, changed, "the edit must change something");
    std::fs::write(file, changed).unwrap();
    folder
}

fn run(study: &Path, hypothesis: &str, out: &Path, maximum_evaluations: Option<u64>) -> Review {
    let study = Study::read(study, &[]).unwrap();
    let options = FitOptions {
        out: out.to_owned(),
        existing: oddwell_study::Existing::Refuse,
        seed: None,
        maximum_evaluations,
        command: vec!["oddwell".to_owned(), "fit".to_owned()],
        threads: 2,
    };
    fit(&study, study.hypothesis(Some(hypothesis)).unwrap(), &options, &mut |_, _| Control::Continue)
        .unwrap();
    review(out).unwrap()
}

fn page_of(runs: &[Review]) -> Page {
    page(&PageInput { runs, weighed: &[], command: "oddwell report", version: "oddwell" })
}

/// Every `data` element: the run, file and pointer that it is from, its whole value, and the words shown.
fn told(html: &str) -> Vec<(String, f64, String)> {
    html.split("<data ")
        .skip(1)
        .map(|rest| {
            let (attributes, after) = rest.split_once('>').unwrap();
            let attribute = |name: &str| {
                let (_, rest) = attributes.split_once(&format!("{name}=\"")).unwrap();
                rest.split_once('"').unwrap().0.to_owned()
            };
            let words = after.split_once("</data>").unwrap().0.to_owned();
            (attribute("data-from"), attribute("value").parse().unwrap(), words)
        })
        .collect()
}

fn json_of(runs: &[Review], from: &str) -> Value {
    let (run, rest) = from.split_once(':').unwrap();
    let (file, pointer) = rest.split_once(':').unwrap();
    let directory = &runs[run.parse::<usize>().unwrap()].directory;
    let value: Value = serde_json::from_str(&std::fs::read_to_string(directory.join(file)).unwrap()).unwrap();
    value.pointer(pointer).unwrap_or_else(|| panic!("{from} is not there")).clone()
}

/// What holds of every page.
fn assert_sound(html: &str) {
    for outside in ["http://", "https://", "src=", "@import", "url(", "<link rel=\"style"] {
        let plain = html.replace("http://www.w3.org/2000/svg", "");
        assert!(!plain.contains(outside), "asks for something from outside: {outside}");
    }
    let mut ids: Vec<&str> =
        html.split(" id=\"").skip(1).filter_map(|rest| rest.split_once('"').map(|(id, _)| id)).collect();
    let all = ids.len();
    ids.sort_unstable();
    ids.dedup();
    assert_eq!(ids.len(), all, "an id stands twice");
    for named in html.split("aria-labelledby=\"").skip(1) {
        for id in named.split_once('"').unwrap().0.split(' ') {
            assert!(ids.binary_search(&id).is_ok(), "nothing has the id {id}");
        }
    }
    for section in ["answer", "redshift", "data", "trust", "limits", "stability", "weighed", "repeat"] {
        assert!(html.contains(&format!("<section id=\"{section}\"")), "{section} is missing");
    }
    assert!(!html.contains("NaN") && !html.contains("inf "), "what is no number is shown");
    assert!(html.len() < 3_000_000, "{} bytes", html.len());
}

#[test]
fn numbers_on_the_page_are_those_of_the_json_files() {
    let folder = tempfile::tempdir().unwrap();
    let study = demo().join("study.toml");
    let runs: Vec<Review> =
        ["constant", "per-bin"].map(|name| run(&study, name, &folder.path().join(name), None)).into();
    let made = page_of(&runs);
    assert_sound(&made.html);
    let numbers = told(&made.html);
    // 38 parameters and five clock contrasts with seven numbers each, twice, and more.
    assert!(numbers.len() > 500, "{}", numbers.len());
    for (from, value, words) in &numbers {
        assert_eq!(json_of(&runs, from).as_f64(), Some(*value), "{from}");
        // Shown with the digits that it deserves: at least one of them, and no more than rounding away.
        let shown: f64 = words
            .trim_end_matches([' ', '%', 'σ'])
            .replace(',', "")
            .parse()
            .unwrap_or_else(|_| panic!("{from}: {words}"));
        let whole = if words.ends_with('%') { 100.0 * value } else { *value };
        let tolerance = if from.contains("interval")
            || ["/mean", "prior_mean", "/value", "/together"].iter().any(|end| from.ends_with(end))
        {
            // Two digits of the error, so half of its second digit.
            let (parent, _) =
                from.rsplit_once(if from.contains("interval") { "/interval" } else { "/" }).unwrap();
            let sd = ["sd", "prior_sd", "together_sd"]
                .map(|key| json_of_or_null(&runs, &format!("{parent}/{key}")));
            0.06 * sd.into_iter().flatten().fold(0.0, f64::max) + 1e-12
        } else {
            // One and a half digits, or a whole count rounded down.
            let absolute = if from.ends_with("p_value") { 0.0051 } else { 0.0 };
            0.06 * whole.abs() + if whole > 50.0 { 1.0 } else { absolute }
        };
        assert!((shown.abs() - whole.abs()).abs() <= tolerance, "{from}: {words} is not {whole}");
    }
    let text = std::fs::read_to_string(runs[0].directory.join("summary.json")).unwrap();
    let summary: Value = serde_json::from_str(&text).unwrap();
    for warning in summary["warnings"].as_array().unwrap() {
        assert!(made.html.contains(&format!("<strong>{}</strong>", warning["code"].as_str().unwrap())));
    }
    // Each figure can be had as a file of its own.
    for figure in &made.figures {
        assert!(figure.svg().contains("<desc") && figure.pdf().starts_with(b"%PDF-"), "{}", figure.name);
        assert!(!figure.description.is_empty(), "{} says nothing to those who can't see it", figure.name);
    }
}

fn json_of_or_null(runs: &[Review], from: &str) -> Option<f64> {
    let (run, rest) = from.split_once(':')?;
    let (file, pointer) = rest.split_once(':')?;
    let text = std::fs::read_to_string(runs[run.parse::<usize>().ok()?].directory.join(file)).ok()?;
    serde_json::from_str::<Value>(&text).ok()?.pointer(pointer)?.as_f64()
}

#[test]
fn a_run_that_did_not_converge_says_so_first() {
    let folder = tempfile::tempdir().unwrap();
    let greedy = edited(|text| text.replace("effective_samples = 4000", "effective_samples = 1000000"));
    let study = greedy.path().join("study.toml");
    let unfinished = run(&study, "constant", &folder.path().join("run"), Some(20_000));
    assert!(!unfinished.summary.converged);
    let html = page_of(&[unfinished]).html;
    assert_sound(&html);
    let banner = html.find("NOT CONVERGED").unwrap();
    assert!(banner < html.find("<h1").unwrap());
}

#[test]
fn of_a_blinded_run_nothing_tells_where_the_departure_lies() {
    let folder = tempfile::tempdir().unwrap();
    let phrase = folder.path().join("phrase.txt");
    std::fs::write(&phrase, "an invented phrase of some length").unwrap();
    let study = Study::read(demo().join("study.toml"), &[]).unwrap();
    let blinded = folder.path().join("blinded");
    blind(&study, &phrase, &blinded).unwrap();
    let made = run(&blinded.join("study.toml"), "constant", &folder.path().join("run"), None);
    let chain = std::fs::read_to_string(made.directory.join("chain.csv")).unwrap();
    let html = page_of(&[made]).html;
    assert_sound(&html);
    assert!(html.find("<strong>BLINDED</strong>").unwrap() < html.find("<h1").unwrap());
    for (from, ..) in told(&html) {
        let telling =
            ["/mean", "/median", "interval"].iter().any(|end| from.contains(end) && !from.contains("prior"));
        assert!(!(telling && (from.contains("/departure.") || from.contains("/derived."))), "{from}");
        assert!(!["general_relativity", "/clocks", "/mimics"].iter().any(|key| from.contains(key)), "{from}");
    }
    // The departure's mean over the draws, as it would be written.
    let column = chain.lines().next().unwrap().split(',').position(|name| name == "departure.tau").unwrap();
    let draws: Vec<f64> =
        chain.lines().skip(1).map(|line| line.split(',').nth(column).unwrap().parse().unwrap()).collect();
    let mean = draws.iter().sum::<f64>() / draws.len() as f64;
    let visible = html.split("<style>").next().unwrap().to_owned() + html.split("</style>").nth(1).unwrap();
    assert!(!visible.contains(&format!("tau = {mean:.1}")) && !visible.contains("Posterior density"));
    for withheld in ["departure-against-redshift", "posterior-departure-tau\"", "without departure"] {
        assert!(!html.contains(withheld), "{withheld} is shown");
    }
}

#[test]
fn sixty_parameters_and_one_bin_are_whole() {
    let many = edited(|text| {
        let text = text.replace("  offset = ", "  growth_rate = { normal = [0.75, 0.03] }\n  growth_slope = { normal = [0.3, 0.05] }\n  offset = ");
        text.replace("first  = { ", "first  = { bias_slope = { normal = [0.0, 0.2] }, ")
            .replace("second = { ", "second = { bias_slope = { normal = [0.0, 0.2] }, ")
    });
    let folder = tempfile::tempdir().unwrap();
    let large = run(&many.path().join("study.toml"), "per-bin", &folder.path().join("many"), Some(60_000));
    assert!(large.dependence.names.len() >= 60, "{}", large.dependence.names.len());
    let html = page_of(&[large]).html;
    assert_sound(&html);
    let one = edited(|text| {
        let text = text.replace("multipoles = [1, 3] }", "multipoles = [1, 3], bins = [\"near\"] }");
        let (before, _) = text.split_once("  [[survey.bin]]\n  name = \"middle\"").unwrap();
        let (_, after) = text.split_once("# The luminosity functions").unwrap();
        format!("{before}# The luminosity functions{after}")
    });
    let small = run(&one.path().join("study.toml"), "constant", &folder.path().join("one"), None);
    assert_eq!(small.beside_data.as_ref().unwrap().panels.len(), 2);
    let html = page_of(&[small]).html;
    assert_sound(&html);
    assert!(html.contains("<figure id=\"figure-error-budget\""));
}

/// Where the measurements are no longer those of the run, the page says which file, and the rest stands.
#[test]
fn measurements_that_changed_are_named() {
    let copy = edited(|text| text.replace("seed = 1", "seed = 2"));
    let folder = tempfile::tempdir().unwrap();
    let out = folder.path().join("run");
    run(&copy.path().join("study.toml"), "constant", &out, Some(20_000));
    let table = copy.path().join("larkfield-multipoles.csv");
    let text = std::fs::read_to_string(&table).unwrap();
    std::fs::write(&table, format!("{text}# a remark\n")).unwrap();
    let changed = review(&out).unwrap();
    assert!(changed.beside_data.as_ref().unwrap_err().to_string().contains("larkfield-multipoles.csv"));
    let html = page_of(&[changed]).html;
    assert_sound(&html);
    assert!(html.contains("is not what the run read"));
}
