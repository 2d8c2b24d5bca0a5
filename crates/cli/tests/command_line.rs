//! Help, mistakes of the command line, and how each command answers.

#![allow(clippy::panic, reason = "a test fails by panicking")]

mod common;

use common::Folder;
use std::io::Read;
use std::process::Stdio;

#[test]
fn help_shows_every_command_and_an_example_of_each() {
    let folder = Folder::new();
    let help = folder.run(&["--help"]);
    assert_eq!((help.status, help.err.as_str()), (Some(0), ""));
    for part in ["new", "show", "predict", "fit", "Exit status:", "130", "linear theory"] {
        assert!(help.out.contains(part), "`{part}` is missing in:\n{}", help.out);
    }
    for command in ["new", "show", "predict", "fit"] {
        let help = folder.run(&[command, "--help"]);
        assert_eq!(help.status, Some(0));
        assert!(help.out.contains("Example: oddwell "), "{}", help.out);
        assert!(help.out.lines().all(|line| line.chars().count() <= 100), "{}", help.out);
    }
    let version = folder.run(&["--version"]);
    assert_eq!(version.out, concat!("oddwell ", env!("CARGO_PKG_VERSION"), "\n"));
}

#[test]
fn a_wrong_command_line_is_status_2() {
    let folder = Folder::new();
    for (words, part) in [
        (vec!["fit", "study.toml", "--sed", "7"], "--seed"),
        (vec!["fit", "study.toml", "--threads", "0"], "0"),
        (vec!["fit", "study.toml", "--seed", "many"], "many"),
        (vec!["sample", "study.toml"], "sample"),
        (vec!["fit"], "STUDY"),
        (vec![], "Usage"),
        (vec!["show", "study.toml", "--set", "departure.tau"], "--set departure.tau"),
        (vec!["show", "study.toml", "--set", "departure.tau=wide"], "--set departure.tau=wide"),
        (vec!["show", "study.toml", "--color", "green"], "green"),
    ] {
        let ran = folder.run(&words);
        assert_eq!(ran.status, Some(2), "{words:?}: {ran:?}");
        assert_eq!(ran.out, "", "{words:?}");
        assert!(ran.err.contains(part), "{words:?}: {}", ran.err);
    }
}

#[test]
fn a_wrong_input_is_status_1_and_says_what_to_do() {
    let folder = Folder::new();
    let missing = folder.run(&["show", "nowhere.toml"]);
    assert_eq!((missing.status, missing.out.as_str()), (Some(1), ""));
    assert_eq!(
        missing.err,
        "error: nowhere.toml: the study file cannot be read: there is no such file; give the path of a study file \
         (`oddwell new DIR` writes one)\n"
    );
    for (words, part) in [
        (vec!["fit", "study.toml", "--hypothesis", "constnt"], "did you mean `constant`"),
        (vec!["show", "study.toml", "--set", "larkfield.near.first.bais=2"], "larkfield.near.first.bias"),
        (vec!["fit", "study.toml", "--hypothesis", "gr", "--set", "departure.tau=1"], "departure.tau"),
    ] {
        let ran = folder.run(&words);
        assert_eq!((ran.status, ran.out.as_str()), (Some(1), ""), "{words:?}: {}", ran.err);
        assert!(ran.err.starts_with("error: ") && ran.err.contains(part), "{words:?}: {}", ran.err);
    }
    assert_eq!(common::names(&folder.path("")), ["multipoles.csv", "study.toml"], "nothing may stay behind");
}

#[test]
fn several_problems_are_a_line_each() {
    let folder = Folder::new();
    let study = std::fs::read_to_string(folder.path("study.toml")).expect("the study");
    let broken = study.replace("omega_m", "omega_mm").replace("felt_by", "felt");
    std::fs::write(folder.path("study.toml"), broken).expect("a study");
    let ran = folder.run(&["show", "study.toml"]);
    assert_eq!(ran.status, Some(1));
    assert!(
        ran.err.lines().count() >= 2 && ran.err.lines().all(|line| line.starts_with("error: study.toml:"))
    );
}

#[test]
fn errors_are_json_too_where_json_is_asked_for() {
    let folder = Folder::new();
    for (words, status, part) in [
        (vec!["fit", "nowhere.toml", "--json"], 1, "nowhere.toml: the study file cannot be read"),
        (vec!["--json", "fit", "study.toml", "--sed", "7"], 2, "unexpected argument '--sed'"),
    ] {
        let ran = folder.run(&words);
        assert_eq!(ran.status, Some(status));
        let error = ran.json()["error"].as_str().map(str::to_owned).expect("a text");
        assert!(error.contains(part) && ran.err.contains(part), "{error}\n{}", ran.err);
    }
}

#[test]
fn show_lists_every_quantity() {
    let folder = Folder::new();
    let table = folder.run(&["show", "study.toml", "--set", "larkfield.near.offset=10"]);
    assert_eq!((table.status, table.err.as_str()), (Some(0), ""));
    assert!(
        table
            .out
            .starts_with("A small survey\nhypothesis `constant`: departure constant, felt by light; 2 of ")
    );
    assert!(
        table.out.contains("larkfield.near.offset                held      --set     10.0\n"),
        "{}",
        table.out
    );
    assert!(!table.out.contains('\u{1b}'), "no colour unless on a terminal");
    assert!(folder.run(&["show", "study.toml", "--color", "always"]).out.contains('\u{1b}'));
    let list = folder.run(&["show", "study.toml", "--hypothesis", "gr", "--json"]).json();
    let names: Vec<&str> =
        list.as_array().expect("a list").iter().filter_map(|each| each["name"].as_str()).collect();
    assert!(
        names.contains(&"larkfield.near.first.evolution") && !names.contains(&"departure.tau"),
        "{names:?}"
    );
}

#[test]
fn predict_prints_a_line_a_row() {
    let folder = Folder::new();
    let ran = folder.run(&["predict", "study.toml"]);
    assert_eq!(ran.status, Some(0));
    assert_eq!(ran.err, "predicting `constant` (felt by light); also in the study: `gr`\n");
    let lines: Vec<&str> = ran.out.lines().collect();
    assert_eq!(lines[0], "survey,bin,pair,multipole,separation,measured,error,predicted");
    assert_eq!(lines.len(), 9);
    assert!(lines[1].starts_with("larkfield,near,first-second,1,28.0,0.0031,0.0005,"), "{}", lines[1]);
    let same = folder.run(&["predict", "study.toml", "--hypothesis", "gr", "--quiet"]);
    assert_eq!(
        (same.out, same.err.as_str()),
        (ran.out.clone(), ""),
        "the prior of τ has its mean at general relativity"
    );
    let rows = folder.run(&["predict", "study.toml", "--json", "--hypothesis", "gr"]).json();
    assert_eq!(rows.as_array().map(Vec::len), Some(8));
    assert_eq!(rows[0]["predicted"].as_f64(), lines[1].rsplit(',').next().and_then(|cell| cell.parse().ok()));
}

#[test]
fn set_moves_a_prediction_as_the_degeneracy_says() {
    // The same shift of both evolution biases is a departure of −shift · f / (1.5 Ωm(a)): physics.md §4. Here f comes from
    // the study, so that the test needs no growth equation.
    let folder = Folder::new();
    let study = std::fs::read_to_string(folder.path("study.toml")).expect("the study");
    let given =
        study.replace("redshift = 0.35\n", "redshift = 0.35\ngrowth_rate = 0.7\ngrowth_slope = -0.3\n");
    std::fs::write(folder.path("study.toml"), given).expect("a study");
    let cubed = 1.35f64.powi(3);
    let matter_fraction = 0.31 * cubed / (0.31 * cubed + 0.69);
    let shift = 2.0;
    let tau = format!("departure.tau={:?}", -shift * 0.7 / (1.5 * matter_fraction));
    let predicted = |words: &[&str]| -> Vec<f64> {
        let ran = folder.run(&[&["predict", "study.toml"], words].concat());
        assert_eq!(ran.status, Some(0), "{}", ran.err);
        ran.out.lines().skip(1).filter_map(|line| line.rsplit(',').next()?.parse().ok()).collect()
    };
    let biased = predicted(&[
        "--set",
        "larkfield.near.first.evolution=2.0",
        "--set",
        "larkfield.near.second.evolution=2.0",
    ]);
    let departed = predicted(&["--set", &tau]);
    let plain = predicted(&[]);
    assert_eq!((biased.len(), departed.len()), (8, 8));
    for row in 0..8 {
        // Octupoles know nothing of either (R₁ − R₂ alone); dipoles move by a good part of themselves.
        let scale = plain[0].abs();
        assert!(
            (biased[row] - departed[row]).abs() < 1e-12 * scale,
            "row {row}: {} {}",
            biased[row],
            departed[row]
        );
    }
    assert!((plain[0] - departed[0]).abs() > 0.1 * plain[0].abs(), "{} {}", plain[0], departed[0]);
}

#[test]
fn a_closed_pipe_is_no_failure() {
    let folder = Folder::new();
    for words in
        [vec!["predict", "study.toml", "--quiet"], vec!["show", "study.toml", "--json"], vec!["--help"]]
    {
        let mut child = folder
            .oddwell(&words)
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("the program starts");
        drop(child.stdout.take());
        let mut err = String::new();
        child.stderr.take().expect("standard error").read_to_string(&mut err).expect("UTF-8");
        assert_eq!((child.wait().expect("it ends").code(), err.as_str()), (Some(0), ""), "{words:?}");
    }
}

#[test]
fn a_new_study_can_be_shown_predicted_and_is_never_overwritten() {
    let folder = Folder::new();
    let ran = folder.run(&["new", "first"]);
    assert_eq!(ran.status, Some(0), "{}", ran.err);
    let mut written: Vec<&str> = ran.out.lines().collect();
    assert_eq!(written[0], "first/study.toml");
    assert!(ran.err.contains("invented") && ran.err.contains("oddwell fit first/study.toml"), "{}", ran.err);
    written.sort_unstable();
    let there: Vec<String> =
        common::names(&folder.path("first")).into_iter().map(|name| format!("first/{name}")).collect();
    assert_eq!(written, there);
    for command in ["show", "predict"] {
        assert_eq!(folder.run(&[command, "first/study.toml"]).status, Some(0));
    }
    std::fs::write(folder.path("first/study.toml"), "mine").expect("writable");
    let again = folder.run(&["new", "first"]);
    assert_eq!((again.status, again.out.as_str()), (Some(1), ""));
    assert!(again.err.starts_with("error: first"), "{}", again.err);
    assert_eq!(std::fs::read_to_string(folder.path("first/study.toml")).ok().as_deref(), Some("mine"));
    let json = folder.run(&["new", "second", "--json", "--quiet"]);
    assert_eq!((&json.json()["written"][0], json.err.as_str()), (&"second/study.toml".into(), ""));
}

#[test]
fn the_manual_lists_its_topics_and_prints_their_pages() {
    let folder = Folder::new();
    let topics = folder.run(&["manual"]);
    assert_eq!((topics.status, topics.err.as_str()), (Some(0), ""));
    for topic in ["none", "constant", "finite-range", "f-of-r"] {
        assert!(topics.out.contains(&format!("  {topic} ")), "{}", topics.out);
        let page = folder.run(&["manual", topic]);
        assert_eq!((page.status, page.err.as_str()), (Some(0), ""));
        assert!(page.out.starts_with(&format!("departure = \"{topic}\"\n")), "{}", page.out);
        assert!(page.out.contains("Who feels it"), "{}", page.out);
    }
    let cancels = folder.run(&["manual", "braneworld"]).out;
    let cancels = cancels.split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(cancels.contains("potential and acceleration cancel"), "{cancels}");
    let wrong = folder.run(&["manual", "constnt"]);
    assert_eq!((wrong.status, wrong.out.as_str()), (Some(2), ""));
    assert_eq!(wrong.err, "error: the manual has no topic `constnt`; did you mean `constant`?\n");
    let json: serde_json::Value =
        serde_json::from_str(&folder.run(&["manual", "step", "--json"]).out).expect("it is JSON");
    assert_eq!((&json["name"], &json["parameters"][1]["name"]), (&"step".into(), &"redshift".into()));
}

#[test]
fn effects_are_columns_that_add_up_to_the_prediction() {
    let folder = Folder::new();
    let words = ["predict", "study.toml", "--quiet", "--set", "larkfield.near.offset=5"];
    let plain = folder.run(&words);
    let ran = folder.run(&[&words[..], &["--by-effect"]].concat());
    assert_eq!((ran.status, ran.err.as_str()), (Some(0), ""));
    let (plain, lines): (Vec<&str>, Vec<&str>) = (plain.out.lines().collect(), ran.out.lines().collect());
    let names = "standard,doppler,acceleration,gravitational_redshift,offset,wide_angle,light_cone,lensing";
    assert_eq!(lines[0], format!("{},{names}", plain[0]));
    assert_eq!(lines.len(), plain.len());
    for (line, plain) in lines.iter().zip(&plain).skip(1) {
        let parts = line.strip_prefix(*plain).and_then(|rest| rest.strip_prefix(',')).expect("the same row");
        let parts: Vec<f64> = parts.split(',').map(|cell| cell.parse().expect("a number")).collect();
        let predicted: f64 = plain.rsplit(',').next().and_then(|cell| cell.parse().ok()).expect("a number");
        let largest = parts.iter().fold(0.0_f64, |largest, part| largest.max(part.abs()));
        // Sums of the same terms in another order.
        assert!((parts.iter().sum::<f64>() - predicted).abs() < 1e-12 * largest, "{line}");
        // The standard part has no odd multipole; of the acceleration and the redshift, which are the same for both
        // tracers, the octupole has none.
        let zeros = if line.contains(",first-second,1,") { vec![0] } else { vec![0, 2, 3] };
        for (index, part) in parts.iter().enumerate() {
            assert_eq!(*part == 0.0, zeros.contains(&index), "{line}");
        }
    }
    let rows = folder.run(&[&words[..], &["--by-effect", "--json"]].concat()).json();
    assert!(rows[0]["gravitational_redshift"].as_f64().is_some_and(|part| part != 0.0), "{rows}");
}
