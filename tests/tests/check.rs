//! `check` finds faults that are planted in the demo, one at a time, and is silent about the demo itself.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_study::check::{AmplitudeVerdict, CheckReport, KINDS, check};
use oddwell_study::{Draw, Override, RunError, Study, Truth, simulate_study};
use oddwell_tests::demo;
use std::path::{Path, PathBuf};

fn demo_folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../data-demo")
}

/// A copy of the demo's files, each passed through `change` (name, text).
fn checked(change: &dyn Fn(&str, String) -> String) -> CheckReport {
    let folder = tempfile::tempdir().unwrap();
    for name in [
        "study.toml",
        "larkfield-multipoles.csv",
        "larkfield-covariance.csv",
        "northmoor-multipoles.csv",
        "northmoor-covariance.csv",
    ] {
        let text = std::fs::read_to_string(demo_folder().join(name)).unwrap();
        std::fs::write(folder.path().join(name), change(name, text)).unwrap();
    }
    checked_in(folder.path()).unwrap()
}

fn checked_in(folder: &Path) -> Result<CheckReport, RunError> {
    let study = Study::read(folder.join("study.toml"), &[])?;
    check(&study, study.hypothesis(None)?)
}

/// The demo drawn anew from another design: its study file passed through `change`, same truth, in a folder of its own.
fn drawn(change: &dyn Fn(String) -> String, seed: u64) -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap();
    let text = std::fs::read_to_string(demo_folder().join("study.toml")).unwrap();
    let text = change(text);
    std::fs::write(folder.path().join("plan.toml"), &text).unwrap();
    let overrides: Vec<Override> = demo::TRUTH
        .iter()
        .filter(|(name, _)| !name.starts_with("northmoor.") || text.contains("\"northmoor\""))
        .map(|(name, value)| Override::parse(&format!("{name}={value}")).unwrap())
        .collect();
    let study = Study::read(folder.path().join("plan.toml"), &overrides).unwrap();
    let draw = Draw { truth: Truth::Centre, seed, mocks: 0 };
    simulate_study(&study, study.hypothesis(None).unwrap(), draw, &folder.path().join("drawn")).unwrap();
    folder
}

fn change_file(path: &Path, change: &dyn Fn(String) -> String) {
    let text = std::fs::read_to_string(path).unwrap();
    std::fs::write(path, change(text)).unwrap();
}

fn codes(report: &CheckReport) -> Vec<&str> {
    report.warnings.iter().map(|warning| warning.code.as_str()).collect()
}

/// The table's lines below the header, changed where `pick` says so.
fn rows(text: &str, change: &dyn Fn(Vec<String>) -> Vec<String>) -> String {
    let mut lines = text.lines();
    let header = lines.next().unwrap();
    let changed = change(lines.map(str::to_owned).collect());
    format!("{header}\n{}\n", changed.join("\n"))
}

fn with_value(line: &str, change: &dyn Fn(f64) -> f64) -> String {
    let (front, value) = line.rsplit_once(',').unwrap();
    format!("{front},{:e}", change(value.parse().unwrap()))
}

#[test]
fn the_demo_is_sound() {
    let report = checked(&|_, text| text);
    assert_eq!(codes(&report), [""; 0], "{:?}", report.warnings);
    let verdicts = report.verdicts.unwrap();
    // Three claims, three numbers, in falling order of how much they claim.
    let any = verdicts.any_odd_signal.unwrap().sigma.unwrap();
    let redshift = verdicts.gravitational_redshift.unwrap().sigma.unwrap();
    let departure = verdicts.departure.unwrap();
    assert!(any > redshift && redshift > departure.sigma.unwrap());
    // Of each multipole of each bin too: octupoles do not see light's redshift, dipoles do.
    assert_eq!(verdicts.signals.len(), 10);
    for signal in &verdicts.signals {
        let dipole = signal.place.ends_with("multipole 1");
        assert_eq!(signal.gravitational_redshift.is_some(), dipole, "{}", signal.place);
        // One is the other less one.
        let of = |verdict: &Option<AmplitudeVerdict>| verdict.as_ref().map(|it| (it.value.unwrap(), it.sd));
        if let (Some(one), Some(other)) = (of(&signal.gravitational_redshift), of(&signal.departure)) {
            assert!(
                (one.0 - other.0 - 1.0).abs() < 1e-6 && (one.1 / other.1 - 1.0).abs() < 1e-6,
                "{}",
                signal.place
            );
        }
    }
    // Twenty shares of even multipoles, none of them large; no even multipole, so nothing to correlate.
    assert_eq!((verdicts.leakage.len(), verdicts.parity.len()), (20, 0));
    // Every nuisance of every bin, the errors in common, each with what a prior's standard deviation is worth.
    let worth = |quantity: &str| {
        verdicts
            .tau_equivalents
            .iter()
            .find(|it| it.bin == "larkfield.near" && it.quantity == quantity)
            .unwrap()
    };
    assert_eq!(verdicts.tau_equivalents.len(), 5 * 11);
    let (offset, shared) = (worth("offset"), worth("systematic.bright-luminosity-function"));
    assert!((offset.per_prior_sd.unwrap() / offset.per_unit - 10.0).abs() < 1e-6);
    // An amplitude of 1 moves evolution by 0.15 and magnification by 0.03.
    let sum = 0.15 * worth("first.evolution").per_unit + 0.03 * worth("first.magnification").per_unit;
    assert!((shared.per_unit / sum - 1.0).abs() < 1e-3, "{} {sum}", shared.per_unit);
    // ξ1 averages 7 % above its value at the mean over z 0.2 to 0.5 (for other tracers than these, near a mean of 0.37): at 2 %
    // such a bin may be 0.3·√(2/7) = 0.16 wide. Here the same is 0.12 at 0.25, 0.19 at 0.40.
    let widest: Vec<f64> = verdicts.widths.iter().map(|width| width.widest).collect();
    assert!(widest.is_sorted() && widest[0] < 0.16 && widest[1] > 0.16, "{widest:?}");
    // What the linear estimate expects is what the fit measures, within a few per cent: the problem is nearly linear.
    assert!((verdicts.expected_sd.unwrap() / 1.07 - 1.0).abs() < 0.1, "{:?}", verdicts.expected_sd);
}

#[test]
fn swapped_tracers_are_found() {
    let report = checked(&|name, text| {
        if !name.ends_with("multipoles.csv") {
            return text;
        }
        rows(&text, &|lines| lines.iter().map(|line| with_value(line, &|value| -value)).collect())
    });
    assert!(codes(&report).contains(&"orientation"), "{:?}", report.warnings);
    let text = &report.warnings.iter().find(|warning| warning.code == "orientation").unwrap().text;
    assert!(text.contains("the first tracer of each bin is `bright`"), "{text}");
}

#[test]
fn a_covariance_in_other_units_is_found() {
    let report = checked(&|name, text| {
        if name != "larkfield-covariance.csv" {
            return text;
        }
        let scaled = |field: &str| format!("{:e}", field.parse::<f64>().unwrap() * 1e4);
        text.lines().map(|line| line.split(',').map(scaled).collect::<Vec<_>>().join(",") + "\n").collect()
    });
    assert!(codes(&report).contains(&"covariance-scale"), "{:?}", report.warnings);
}

#[test]
fn rows_in_another_order_are_found() {
    let report = checked(&|name, text| {
        if name != "larkfield-multipoles.csv" {
            return text;
        }
        // The dipole of the first bin, smallest separations last: the values move, the labels stay.
        rows(&text, &|lines| {
            let values: Vec<String> =
                lines.iter().map(|line| line.rsplit_once(',').unwrap().1.to_owned()).collect();
            let reordered = lines.iter().enumerate().map(|(index, line)| {
                let from = if index < 15 { 14 - index } else { index };
                format!("{},{}", line.rsplit_once(',').unwrap().0, values[from])
            });
            reordered.collect()
        })
    });
    let found: Vec<&str> = report
        .warnings
        .iter()
        .filter(|warning| warning.code == "row-order")
        .map(|warning| warning.place.as_str())
        .collect();
    assert_eq!(found, ["larkfield.near"], "{:?}", report.warnings);
}

#[test]
fn a_survey_given_twice_is_found() {
    let report = checked(&|name, text| match name {
        "northmoor-multipoles.csv" => {
            let other = std::fs::read_to_string(demo_folder().join("larkfield-multipoles.csv")).unwrap();
            let renamed = other.replace("near,", "early,").replace("middle,", "earliest,");
            let kept: Vec<&str> = renamed.lines().filter(|line| !line.starts_with("far,")).collect();
            kept.join("\n") + "\n"
        }
        _ => text,
    });
    assert!(codes(&report).contains(&"duplicated-survey"), "{:?}", report.warnings);
}

#[test]
fn an_observed_slope_given_as_evolution_is_found() {
    let report = checked(&|name, text| match name {
        "study.toml" => {
            text.replace("evolution = { normal = [0.6, 0.2] }", "evolution = { normal = [-6.5, 0.2] }")
        }
        _ => text,
    });
    assert!(codes(&report).contains(&"large-evolution"), "{:?}", report.warnings);
}

/// 60 mocks for 75 numbers: no inverse at all for a noise model that is about mocks, and no error that can be trusted for
/// one that is not.
#[test]
fn too_few_mocks_are_found() {
    let with_noise = |noise: &str| {
        let (from, to) = (
            "keep = [{ separation = [24.0, 144.0], multipoles = [1, 3] }]",
            format!(
                "noise = \"{noise}\"\nmock_count = 60\nkeep = [{{ multipoles = [1] }}, {{ multipoles = [3], bins = [\"near\", \"far\"] }}]"
            ),
        );
        let folder = tempfile::tempdir().unwrap();
        for name in demo::FILES.iter().chain(&["study.toml"]) {
            std::fs::copy(demo_folder().join(name), folder.path().join(name)).unwrap();
        }
        change_file(&folder.path().join("study.toml"), &|text| text.replacen(from, &to, 1));
        checked_in(folder.path())
    };
    let error = with_noise("t").unwrap_err().to_string();
    assert!(error.contains("survey `larkfield`") && error.contains("60") && error.contains("75"), "{error}");
    let report = with_noise("gaussian").unwrap();
    let warning = report.warnings.iter().find(|warning| warning.code == "few-mocks").unwrap();
    assert!(warning.text.starts_with("60 mocks for 75 rows of `larkfield`"), "{}", warning.text);
}

/// The demo's first survey alone, with monopole and quadrupole measured too.
fn with_even(text: String) -> String {
    let (before, rest) = text.split_once("[[survey]]\nname = \"northmoor\"").unwrap();
    let (_, after) = rest.split_once("# ---").unwrap();
    format!("{before}# ---{after}").replace("multipoles = [1, 3]", "multipoles = [0, 1, 2, 3]")
}

/// 5 % of the monopole that is measured, where a share is known to 0.8 %: about six standard deviations.
#[test]
fn a_leaked_even_multipole_is_found() {
    let folder = drawn(&with_even, 8);
    change_file(&folder.path().join("drawn/larkfield-multipoles.csv"), &|text| {
        rows(&text, &|lines| {
            let value = |line: &str| line.rsplit(',').next().unwrap().parse::<f64>().unwrap();
            let leaked = lines.iter().enumerate().map(|(index, line)| match line.starts_with("near,1,") {
                // Fifteen shells of the monopole come before those of the dipole.
                true => with_value(line, &|dipole| dipole + 0.05 * value(&lines[index - 15])),
                false => line.clone(),
            });
            leaked.collect()
        })
    });
    let report = checked_in(&folder.path().join("drawn")).unwrap();
    let found: Vec<&str> = report
        .warnings
        .iter()
        .filter(|warning| warning.code == "leakage")
        .map(|warning| warning.place.as_str())
        .collect();
    assert!(
        !found.is_empty() && found.iter().all(|place| *place == "larkfield.near"),
        "{:?}",
        report.warnings
    );
    let share = report.verdicts.unwrap().leakage.remove(0);
    assert_eq!((share.bin.as_str(), share.from, share.into), ("larkfield.near", 0, 1));
    let (value, sd) = (share.share.value.unwrap(), share.share.sd);
    assert!((value - 0.05).abs() < 4.0 * sd && value > 4.0 * sd, "{value} ± {sd}");
}

#[test]
fn a_redshift_typed_as_scale_factor_is_found() {
    let report = checked(&|name, text| match name {
        "study.toml" => text.replacen("redshift = 0.25", "redshift = 0.8", 1),
        _ => text,
    });
    let found: Vec<&str> = report
        .warnings
        .iter()
        .filter(|warning| warning.code == "scale-factor")
        .map(|warning| warning.place.as_str())
        .collect();
    assert_eq!(found, ["larkfield.near"], "{:?}", report.warnings);
    // All bins of a survey: 0.25, 0.40, 0.55.
    let report = checked(&|name, text| match name {
        "study.toml" => text
            .replacen("redshift = 0.25", "redshift = 0.8", 1)
            .replacen("redshift = 0.40", "redshift = 0.714", 1)
            .replacen("redshift = 0.55", "redshift = 0.645", 1),
        _ => text,
    });
    assert!(
        report.warnings.iter().any(|warning| warning.code == "scale-factor" && warning.place == "larkfield"),
        "{:?}",
        report.warnings
    );
}

/// Surveys a fifth as large see an odd signal at five standard deviations or so.
#[test]
fn swapped_tracers_are_found_at_five_sigma() {
    let smaller = |text: String| {
        [("1.5e9", "3e8"), ("3.5e9", "7e8"), ("6.0e9", "1.2e9"), ("1.2e10", "2.4e9"), ("1.6e10", "3.2e9")]
            .iter()
            .fold(text, |text, (from, to)| {
                text.replacen(&format!("volume = {from}"), &format!("volume = {to}"), 1)
            })
    };
    let folder = drawn(&smaller, 5);
    let report = checked_in(&folder.path().join("drawn")).unwrap();
    assert_eq!(codes(&report), [""; 0], "{:?}", report.warnings);
    let sigma = report.verdicts.unwrap().any_odd_signal.unwrap().sigma.unwrap();
    assert!((4.0..6.0).contains(&sigma), "{sigma}");
    for name in ["larkfield", "northmoor"] {
        change_file(&folder.path().join(format!("drawn/{name}-multipoles.csv")), &|text| {
            rows(&text, &|lines| lines.iter().map(|line| with_value(line, &|value| -value)).collect())
        });
    }
    let report = checked_in(&folder.path().join("drawn")).unwrap();
    assert!(codes(&report).contains(&"orientation"), "{:?}", report.warnings);
}

/// Even multipoles measured too: their correlations with the odd ones are those of the design, until the covariance has the
/// odd rows with the other sign.
#[test]
fn a_covariance_of_the_other_orientation_is_found() {
    let folder = drawn(&with_even, 6);
    let report = checked_in(&folder.path().join("drawn")).unwrap();
    assert_eq!(codes(&report), [""; 0], "{:?}", report.warnings);
    let verdicts = report.verdicts.unwrap();
    assert_eq!(verdicts.parity.len(), 3);
    for block in &verdicts.parity {
        // What the design gives to nine digits, at the centre of the priors as here.
        assert!(block.largest_difference.unwrap().abs() < 1e-6 && block.largest.abs() > 0.02, "{block:?}");
    }
    change_file(&folder.path().join("drawn/larkfield-covariance.csv"), &|text| {
        let odd = |index: usize| index / 15 % 2 == 1;
        let line = |(row, line): (usize, &str)| {
            let fields = line.split(',').enumerate().map(|(column, field)| {
                let value: f64 = field.parse().unwrap();
                if odd(row) == odd(column) { field.to_owned() } else { format!("{:e}", -value) }
            });
            fields.collect::<Vec<_>>().join(",") + "\n"
        };
        text.lines().enumerate().map(line).collect()
    });
    let report = checked_in(&folder.path().join("drawn")).unwrap();
    assert!(codes(&report).contains(&"parity"), "{:?}", report.warnings);
}

/// A bin from z = 0.15 to 0.5 at its mean redshift; with the nodes that are proposed there is nothing left to propose.
#[test]
fn a_wide_bin_gets_nodes() {
    let wide = |text: String| {
        let text = text.replacen("[survey.design]", "[survey.design]\n  area = 3000.0", 1);
        text.replacen("redshift = 0.25", "redshift = 0.38", 1).replacen(
            "volume = 1.5e9",
            "redshifts = [0.15, 0.5]",
            1,
        )
    };
    let folder = drawn(&wide, 7);
    let path = folder.path().join("drawn/study.toml");
    let report = checked_in(path.parent().unwrap()).unwrap();
    assert_eq!(codes(&report), ["wide-bin"], "{:?}", report.warnings);
    let text = &report.warnings[0].text;
    let verdicts = report.verdicts.unwrap();
    let width = &verdicts.widths[0];
    let nodes = width.nodes.clone().unwrap();
    let sum = |of: &dyn Fn(f64) -> f64| -> f64 { nodes.iter().map(|&(z, weight)| weight * of(z)).sum() };
    assert!((sum(&|_| 1.0) - 1.0).abs() < 1e-12);
    // More volume far away: beyond the middle, which is 0.325.
    assert!((0.36..0.40).contains(&sum(&|z| z)), "{nodes:?}");
    let listed = text.split("nodes = ").nth(1).unwrap().split("` in place").next().unwrap();
    change_file(&path, &|study| study.replacen("redshift = 0.38", &format!("nodes = {listed}"), 1));
    let report = checked_in(path.parent().unwrap()).unwrap();
    assert_eq!(codes(&report), [""; 0], "{:?}", report.warnings);
    assert_eq!(report.verdicts.unwrap().widths.len(), 4);
}

/// What `check` can warn of is what its manual lists.
#[test]
fn every_warning_of_a_verdict_is_in_the_manual() {
    let source = include_str!("../../crates/study/src/check/suspicions.rs");
    let said: Vec<&str> =
        source.split("warning(\"").skip(1).map(|rest| rest.split('"').next().unwrap()).collect();
    for code in &said {
        assert!(KINDS.iter().any(|kind| kind.code == *code), "{code}");
    }
    // Some are warnings that a fit gives as well.
    let shared = include_str!("../../crates/study/src/warnings.rs");
    for kind in KINDS {
        let known = said.contains(&kind.code) || shared.contains(&format!("=> \"{}\"", kind.code));
        assert!(known, "{}", kind.code);
    }
}
