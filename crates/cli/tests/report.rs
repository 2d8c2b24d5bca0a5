//! `oddwell report`, `table`, `schema`, `completions`, `manual --pages` and `fit --stability`, as a user runs them.

#![allow(clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::Folder;

fn told(text: &str, expected: &[&str]) {
    for words in expected {
        assert!(text.contains(words), "`{words}` is not in:\n{text}");
    }
}

fn read(folder: &Folder, name: &str) -> String {
    std::fs::read_to_string(folder.path(name)).unwrap_or_else(|error| panic!("{name}: {error}"))
}

/// A fitted study: `run` in the folder, with its stability.
fn fitted() -> Folder {
    let folder = Folder::new();
    let done = folder.run(&["fit", "study.toml", "--hypothesis", "constant", "--out", "run", "--stability"]);
    assert_eq!(done.status, Some(0), "{}", done.err);
    told(&done.out, &["written to run/stability.json"]);
    folder
}

/// What the command line put in the place of the study's words counts for the page too.
#[test]
fn a_run_with_set_quantities_has_its_pictures() {
    let folder = Folder::new();
    let set = ["--set", "larkfield.near.offset={ normal = [0.0, 5.0] }", "--set", "background.sigma8=0.8"];
    let done =
        folder.run(&[&["fit", "study.toml", "--hypothesis", "constant", "--out", "run"], &set[..]].concat());
    assert_eq!(done.status, Some(0), "{}", done.err);
    let made = folder.run(&["report", "run"]);
    assert_eq!(made.status, Some(0), "{}", made.err);
    assert!(!made.err.contains("lacks"), "{}", made.err);
    told(&read(&folder, "run/report.html"), &["larkfield.near.offset", "residual"]);
}

#[test]
fn a_run_becomes_a_page_a_table_and_figures() {
    let folder = fitted();
    let made = folder.run(&["report", "run", "--figures", "figures"]);
    assert_eq!(made.status, Some(0), "{}", made.err);
    told(&made.out, &["written to run/report.html, its BibTeX to run/report.bib", "figures to figures"]);
    let page = read(&folder, "run/report.html");
    told(
        &page,
        &[
            "<!DOCTYPE html>",
            "oddwell report run --figures figures",
            "figure-stability-constant",
            "growth index free",
        ],
    );
    told(&read(&folder, "run/report.bib"), &["@article{GrattonChallinor2020,"]);
    told(&read(&folder, "figures/error-budget.svg"), &["<svg", "standard deviation of the departure"]);
    assert!(
        std::fs::read(folder.path("figures/error-budget.pdf")).expect("it is there").starts_with(b"%PDF")
    );
    // Nothing is overwritten unless asked for.
    let again = folder.run(&["report", "run"]);
    assert_eq!(again.status, Some(1));
    told(&again.err, &["run/report.html: exists already", "--replace"]);
    assert_eq!(folder.run(&["report", "run", "--replace"]).status, Some(0));
    for (format, expected) in [
        ("markdown", "| departure.tau |"),
        ("latex", "\\texttt{departure.tau} & $"),
        ("csv", "constant,true,false,departure.tau,"),
    ] {
        let table = folder.run(&["table", "run", "--format", format]);
        assert_eq!(table.status, Some(0), "{}", table.err);
        told(&table.out, &[expected]);
    }
    let wrong = folder.run(&["report", "nowhere"]);
    assert_eq!(wrong.status, Some(1));
    told(&wrong.err, &["nowhere/summary.json: can't be read"]);
}

/// Differences are those of the means, and scatter is there exactly for cuts of the same data.
#[test]
fn stability_is_written_beside_the_run() {
    let folder = fitted();
    let json =
        |name: &str| -> serde_json::Value { serde_json::from_str(&read(&folder, name)).expect("it is JSON") };
    let (summary, stability) = (json("run/summary.json"), json("run/stability.json"));
    assert_eq!(stability["whole"]["mean"], summary["parameters"]["departure.tau"]["mean"]);
    let variations = stability["variations"].as_array().expect("it is a list");
    let of_kind = |kind: &str| variations.iter().filter(|variation| variation["kind"] == kind).count();
    assert!(of_kind("smallest") >= 2 && of_kind("largest") >= 2 && of_kind("growth") == 1);
    let whole = |key: &str| stability["whole"][key].as_f64().expect("it is a number");
    for variation in variations {
        let number = |key: &str| variation["found"][key].as_f64().expect("it is a number");
        let difference = variation["difference"].as_f64().expect("it is a number");
        assert!((difference - (number("mean") - whole("mean"))).abs() < 1e-12, "{variation}");
        let nested = ["smallest", "largest", "without", "only"].iter().any(|kind| variation["kind"] == *kind);
        assert_eq!(variation["expected_scatter"].is_number(), nested, "{variation}");
        if nested {
            assert!(number("data_points") < whole("data_points"), "{variation}");
            let scatter = variation["expected_scatter"].as_f64().expect("it is a number");
            // Four standard deviations of some twenty differences: less than one in five hundred studies.
            assert!(difference.abs() < 4.0 * scatter + 0.01, "{variation}");
        }
    }
}

#[test]
fn schemas_completions_and_pages_come_from_the_program_itself() {
    let folder = Folder::new();
    told(&folder.run(&["schema"]).out, &["study", "summary.json", "stability.json"]);
    let study: serde_json::Value =
        serde_json::from_str(&folder.run(&["schema", "study"]).out).expect("it is JSON");
    told(&study["$defs"]["hypothesis"]["properties"]["departure"].to_string(), &["finite-range", "f-of-r"]);
    told(&study["$defs"]["survey"]["properties"]["noise"].to_string(), &["percival"]);
    let wrong = folder.run(&["schema", "studdy"]);
    assert_eq!(wrong.status, Some(2));
    told(&wrong.err, &["there is no schema `studdy`; there are study, summary"]);
    for shell in ["bash", "zsh", "fish"] {
        told(&folder.run(&["completions", shell]).out, &["oddwell", "stability", "markdown"]);
    }
    let pages = folder.run(&["manual", "--pages", "man"]);
    assert_eq!(pages.status, Some(0), "{}", pages.err);
    told(&read(&folder, "man/oddwell-fit.1"), &[".TH", "stability"]);
    told(&read(&folder, "man/oddwell.1"), &["report"]);
}

/// A weighing brings its own posteriors, and its numbers stand on the page as in weigh.json.
#[test]
fn what_was_weighed_is_on_the_page() {
    let folder = Folder::new();
    let weighed = folder.run(&["weigh", "study.toml", "--out", "weighed"]);
    assert!(matches!(weighed.status, Some(0 | 3)), "{}", weighed.err);
    let made = folder.run(&["report", "weighed"]);
    assert_eq!(made.status, Some(0), "{}", made.err);
    let page = read(&folder, "weighed/report.html");
    let record: serde_json::Value =
        serde_json::from_str(&read(&folder, "weighed/weigh.json")).expect("it is JSON");
    let mut compared = 0;
    for rest in page.split("<data value=\"").skip(1) {
        let (value, rest) = rest.split_once("\" data-from=\"").expect("a source");
        let (from, _) = rest.split_once('"').expect("an end");
        let Some(pointer) = from.strip_prefix("w0:weigh.json:") else { continue };
        let found = record.pointer(pointer).unwrap_or_else(|| panic!("{pointer} is not there"));
        assert_eq!(found.as_f64(), value.parse().ok(), "{pointer}");
        compared += 1;
    }
    assert!(compared > 20, "{compared}");
    told(
        &page,
        &["Odds of <code>constant</code> against <code>gr</code>", "The same evidence by independent routes"],
    );
}
