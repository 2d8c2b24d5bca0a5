//! Whole texts of closing summaries, for invented results.

use indexmap::IndexMap;
use oddwell_study::record::{
    BestFit, BinGoodness, ClockContrastSummary, ClockSummary, GeneralRelativity, Mimic, ParameterSummary,
    SamplerSummary, Summary, SurveyGoodness, SwitchedOff, WarningRecord,
};
use unicode_width::UnicodeWidthStr;

use super::closing_summary;
use crate::style::Style;

fn parameter(mean: f64, sd: f64, prior_sd: Option<f64>, ess: f64, rhat: f64) -> ParameterSummary {
    ParameterSummary {
        mean: Some(mean),
        sd: Some(sd),
        median: Some(mean),
        interval68: Some([mean - 0.99 * sd, mean + 0.99 * sd]),
        interval95: Some([mean - 1.96 * sd, mean + 1.96 * sd]),
        prior_mean: prior_sd.map(|_| 0.0),
        prior_sd,
        ess: Some(ess),
        ess_tail: Some(0.8 * ess),
        rhat: Some(rhat),
        mcse: Some(sd / ess.sqrt()),
    }
}

fn bin(name: &str, chi2: f64, p_value: f64) -> BinGoodness {
    BinGoodness {
        name: name.to_owned(),
        chi2,
        data_points: 30,
        effective_parameters: Some(1.84),
        p_value: Some(p_value),
    }
}

fn clock(survey: &str, bin: &str, mean: f64, sd: f64, share_reached: Option<f64>) -> ClockSummary {
    ClockSummary {
        survey: survey.to_owned(),
        bin: bin.to_owned(),
        distance: 50.0,
        seconds_per_year: ClockContrastSummary {
            mean: Some(mean),
            sd: Some(sd),
            interval68: Some([mean - 0.99 * sd, mean + 0.99 * sd]),
        },
        general_relativity: Some(388.49),
        share_reached,
    }
}

fn warning(code: &str, place: &str, text: &str) -> WarningRecord {
    WarningRecord { code: code.to_owned(), text: text.to_owned(), place: place.to_owned() }
}

/// A converged fit of one departure to two surveys with three bins in all.
fn converged() -> Summary {
    let survey = |name: &str, chi2, points, effective, p_value, bins| SurveyGoodness {
        name: name.to_owned(),
        chi2,
        data_points: points,
        effective_parameters: Some(effective),
        p_value: Some(p_value),
        bins,
    };
    Summary {
        study: "Two invented surveys".to_owned(),
        only: Vec::new(),
        without: Vec::new(),
        hypothesis: "constant".to_owned(),
        departure: "constant".to_owned(),
        felt_by: "light".to_owned(),
        converged: true,
        blinded: false,
        warnings: vec![
            warning(
                "small-separation",
                "larkfield.near",
                "in `larkfield.near` 1 km/s of redshift offset is worth 0.62 in tau at the smallest separation, 28 Mpc/h; \
                 give `offset` a prior, or drop the smallest separations with `keep`",
            ),
            warning("growth-assumed", "constant", "`constant` is felt by light alone; free `growth_index`"),
        ],
        parameters: IndexMap::from([
            ("background.sigma8".to_owned(), parameter(0.811_23, 0.009_87, Some(0.01), 5120.7, 1.0012)),
            (
                "larkfield.near.first.evolution".to_owned(),
                parameter(-0.0312, 0.284, Some(0.3), 4711.2, 1.0044),
            ),
            ("departure.tau".to_owned(), parameter(4.5678, 1.8321, Some(17.320_508), 4012.9, 1.0031)),
            (
                "derived.clock_contrast.larkfield.near".to_owned(),
                parameter(2210.4, 731.2, None, 4012.9, 1.0031),
            ),
        ]),
        departure_parameters: vec!["departure.tau".to_owned()],
        best: BestFit {
            parameters: IndexMap::from([("departure.tau".to_owned(), 4.6)]),
            log_likelihood: 812.3,
            log_posterior: 810.1,
            chi2: 83.12,
            data_points: 90,
            effective_parameters: Some(5.3),
            p_value: Some(0.537),
            surveys: vec![
                survey(
                    "larkfield",
                    53.4,
                    60,
                    3.6,
                    0.61,
                    vec![bin("near", 25.2, 0.63), bin("far", 28.9, 0.42)],
                ),
                survey("northmoor", 29.72, 30, 1.7, 0.38, vec![bin("deep", 29.72, 0.38)]),
            ],
        },
        general_relativity: GeneralRelativity {
            tail_probability: Some(0.012_73),
            sigma: Some(2.4903),
            from: Some("chain".to_owned()),
        },
        mimics: vec![
            Mimic { nuisance: "evolution".to_owned(), shift: -3.114, allowed: Some(0.3), likeness: 0.9998 },
            Mimic { nuisance: "magnification".to_owned(), shift: 0.4123, allowed: None, likeness: 0.942 },
            Mimic { nuisance: "offset".to_owned(), shift: 11.27, allowed: Some(10.0), likeness: 0.513 },
        ],
        clocks: vec![
            clock("larkfield", "near", 2210.4, 731.2, Some(0.6138)),
            clock("northmoor", "deep", 1903.0, 690.0, None),
        ],
        by_part: None,
        switched_off: None,
        sampler: SamplerSummary {
            ensembles: 4,
            walkers: 32,
            steps: 3456,
            warm_up: 512,
            thinning: 1,
            evaluations: 445_312,
            rejected_evaluations: 0,
            rejected_reasons: Default::default(),
            wall_seconds: 12.34,
            evaluations_per_second: 36_087.0,
            acceptance: Some(0.412),
            acceptance_by_move: Default::default(),
            threads: 2,
            seed: 1,
        },
    }
}

#[test]
fn a_converged_fit() {
    expect(&converged(), include_str!("expected/converged.txt"));
}

#[test]
fn a_fit_that_did_not_converge_and_does_not_fit() {
    let mut summary = converged();
    summary.converged = false;
    summary.mimics.clear();
    summary.warnings = vec![warning(
        "not-converged",
        "departure.tau",
        "not converged: `departure.tau` has bulk ESS 212 of 4000; run it about 18.9 times as long",
    )];
    if let Some(tau) = summary.parameters.get_mut("departure.tau") {
        *tau = parameter(46.1, 2.3, Some(17.320_508), 212.4, 1.0871);
    }
    let unknown = ParameterSummary { prior_sd: Some(0.3), ..unknown() };
    summary.parameters.insert("larkfield.near.first.evolution".to_owned(), unknown);
    summary.best.p_value = Some(3.2e-9);
    summary.general_relativity = GeneralRelativity {
        tail_probability: Some(2.3e-89),
        sigma: Some(20.04),
        from: Some("normal".to_owned()),
    };
    summary.sampler.rejected_evaluations = 1234;
    summary.sampler.rejected_reasons = [("E² is not positive at z = 0.4".to_owned(), 1200)].into();
    summary.sampler.wall_seconds = 3725.0;
    expect(&summary, include_str!("expected/not-converged.txt"));
}

#[test]
fn one_departure_in_each_bin() {
    let mut summary = converged();
    summary.hypothesis = "each-bin".to_owned();
    summary.departure = "per-bin".to_owned();
    summary.warnings.clear();
    summary.mimics.truncate(1);
    summary.parameters.shift_remove("departure.tau");
    for (name, mean, sd) in
        [("larkfield.near", 4.1, 2.31), ("larkfield.far", -0.27, 3.4), ("northmoor.deep", 11.9, 14.2)]
    {
        let name = format!("departure.tau.{name}");
        summary.parameters.insert(name.clone(), parameter(mean, sd, Some(17.320_508), 4100.0, 1.002));
        summary.departure_parameters.push(name);
    }
    summary.departure_parameters.remove(0);
    summary.general_relativity =
        GeneralRelativity { tail_probability: Some(0.2312), sigma: None, from: Some("normal".to_owned()) };
    expect(&summary, include_str!("expected/each-bin.txt"));
}

#[test]
fn a_blinded_fit_shows_no_place() {
    let mut summary = converged();
    summary.blinded = true;
    summary.warnings.clear();
    let text = closing_summary(&summary, Style::Plain);
    for secret in ["4.6", "2210", "σ", "evolution biases"] {
        assert!(!text.contains(secret), "`{secret}` gives the departure away:\n{text}");
    }
    expect(&summary, include_str!("expected/blinded.txt"));
}

#[test]
fn general_relativity_alone() {
    let mut summary = converged();
    summary.hypothesis = "gr".to_owned();
    summary.departure = "none".to_owned();
    summary.warnings.clear();
    summary.mimics.clear();
    summary.departure_parameters.clear();
    summary.parameters.shift_remove("departure.tau");
    summary.general_relativity = GeneralRelativity::default();
    summary.best.surveys.truncate(1);
    summary.best.p_value = Some(0.999_7);
    expect(&summary, include_str!("expected/general-relativity.txt"));
}

#[test]
fn general_relativity_at_the_end_of_a_prior() {
    let mut summary = converged();
    summary.general_relativity = GeneralRelativity::default();
    let text = closing_summary(&summary, Style::Plain);
    assert!(
        text.contains(
            "\n  How far general relativity lies in the tail is not said: it is at the end of a prior or beyond it,\n  \
             or the draws do not suffice.\n"
        ),
        "{text}"
    );
}

#[test]
fn what_is_switched_off_is_said_with_its_size() {
    let mut summary = converged();
    for (effect, tau, sentence) in [
        (
            "wide_angle",
            -1.934,
            "The study switches wide-angle terms off: they would be taken for a departure of -1.9 that",
        ),
        (
            "light_cone",
            0.41,
            "The study switches light-cone evolution off: it would be taken for a departure of +0.41",
        ),
        (
            "lensing",
            0.0312,
            "The study switches lensing off: it would be taken for a departure of +0.031 that",
        ),
        (
            "offset",
            4.0,
            "The study holds the redshift offset at 0: one of 10 km/s would be taken for a departure of +4.0",
        ),
    ] {
        summary.switched_off = Some(SwitchedOff { effect: effect.to_owned(), tau });
        let text = closing_summary(&summary, Style::Plain);
        let text = text.split_whitespace().collect::<Vec<_>>().join(" ");
        assert!(text.contains(sentence), "{text}");
    }
}

#[test]
fn clocks_whose_every_quantity_is_held_have_no_interval() {
    let mut summary = converged();
    summary.clocks.truncate(1);
    summary.clocks[0].seconds_per_year =
        ClockContrastSummary { mean: Some(388.49), sd: Some(0.0), interval68: Some([388.49, 388.49]) };
    let text = closing_summary(&summary, Style::Plain);
    let sentence = "clocks 50 Mpc/h apart differ by 388.5 seconds a year; general relativity gives 388;";
    assert!(text.split_whitespace().collect::<Vec<_>>().join(" ").contains(sentence), "{text}");
}

#[test]
fn colour_adds_nothing_but_escapes() {
    let plain = closing_summary(&converged(), Style::Plain);
    let coloured = closing_summary(&converged(), Style::Coloured);
    assert!(!plain.contains('\u{1b}'));
    assert_ne!(plain, coloured);
    let mut stripped = String::new();
    for (index, part) in coloured.split('\u{1b}').enumerate() {
        let text = if index == 0 { part } else { part.split_once('m').map_or("", |(_, text)| text) };
        stripped.push_str(text);
    }
    assert_eq!(plain, stripped);
}

fn unknown() -> ParameterSummary {
    ParameterSummary {
        mean: None,
        sd: None,
        median: None,
        interval68: None,
        interval95: None,
        prior_mean: None,
        prior_sd: None,
        ess: None,
        ess_tail: None,
        rhat: None,
        mcse: None,
    }
}

fn expect(summary: &Summary, expected: &str) {
    let text = closing_summary(summary, Style::Plain);
    assert_eq!(text, expected, "got:\n{text}");
    let widest = text.lines().map(UnicodeWidthStr::width).max();
    assert!(widest <= Some(100), "a line of {widest:?} columns:\n{text}");
}
