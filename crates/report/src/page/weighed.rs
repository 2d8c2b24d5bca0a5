//! Which hypothesis the data prefer, and how far the priors decide that.

use maud::{Markup, html};
use oddwell_study::record::{HypothesisRecord, Sensitivity, WeighRecord};

use super::Runs;
use super::parts::{Sheet, cell, key, missing, on_demand, prose, slug, table, told};
use crate::figure::{
    Anchor, BAND, Dash, Figure, Frame, INK, Labels, MUTED, Mark, RELATIVITY, Scale, Stroke, range,
};
use crate::numbers::{UNKNOWN, count, duration, probability, rounded, significant, two_digits};
use crate::weigh::verdict_words;
use oddwell_study::review::Weighing;

pub(super) fn section(runs: &Runs<'_>, sheet: &mut Sheet) -> Markup {
    if runs.blinded() {
        return html! { p.missing { "Odds against general relativity would tell where the departure lies; not shown while the measurements are blinded." } };
    }
    let weighed = runs.weighed();
    if weighed.is_empty() {
        return missing(
            "The hypotheses were not weighed. Evidences and odds are made, and shown here if the run directory is given too, by",
            &format!("oddwell weigh {}", runs.first().manifest.study_file),
        );
    }
    html! { @for (at, each) in weighed.iter().enumerate() { (of_weighing(at, each, sheet)) } }
}

/// Where a number of the `at`-th weighing stands.
fn from(at: usize, pointer: &str) -> String {
    format!("w{at}:weigh.json:{pointer}")
}

fn of_weighing(at: usize, weighed: &Weighing, sheet: &mut Sheet) -> Markup {
    let record = &weighed.record;
    html! {
        @if !record.agree {
            p.banner role="note" { strong { "THE ESTIMATORS DO NOT AGREE" } ": quote no odds that hang on it." }
        }
        p {
            "Odds are against " code { (record.reference) } ", prior odds included. "
            @if record.relative { "The noise is no density: log evidences lack a common constant, so only odds are given. " }
            (count(record.evaluations)) " evaluations in " (duration(record.wall_seconds)) "."
        }
        (odds(at, record))
        (estimators(at, record))
        @for (index, hypothesis) in record.hypotheses.iter().enumerate() {
            @if let Some(sensitivity) = &hypothesis.sensitivity { (sensitivity_of((at, index), (hypothesis, sensitivity), &record.reference, sheet)) }
        }
        (average(at, record))
        (others(at, record))
        @if !record.notes.is_empty() { ul { @for note in &record.notes { li { (prose(note)) } } } }
    }
}

fn odds(at: usize, record: &WeighRecord) -> Markup {
    let rows = record.hypotheses.iter().enumerate().map(|(index, hypothesis)| {
        let own = |key: &str| from(at, &format!("/hypotheses/{index}/{key}"));
        vec![
            html! { (hypothesis.name) @if hypothesis.tested == Some(false) { " (not tested by the data)" } },
            told(&own("log_evidence"), hypothesis.log_evidence, |value| format!("{value:.2}")),
            told(&own("error"), hypothesis.error, two_digits),
            told(&own("odds"), hypothesis.odds, |odds| significant(odds, 2)),
            told(&own("log_odds_error"), hypothesis.log_odds_error, two_digits),
            told(&own("probability"), hypothesis.probability, probability),
        ]
    });
    table(
        "The hypotheses",
        &["hypothesis", "ln evidence", "error", "odds", "error of ln odds", "probability"],
        rows.collect(),
    )
}

fn estimators(at: usize, record: &WeighRecord) -> Markup {
    let mut names: Vec<&str> = Vec::new();
    for name in record.hypotheses.iter().flat_map(|hypothesis| hypothesis.estimators.keys()) {
        if !names.contains(&name.as_str()) {
            names.push(name);
        }
    }
    let mut header = vec!["hypothesis"];
    let words: Vec<String> = names.iter().map(|name| name.replace('_', " ")).collect();
    header.extend(words.iter().map(String::as_str));
    header.push("agree");
    let rows = record.hypotheses.iter().enumerate().map(|(index, hypothesis)| {
        let mut cells = vec![cell(&hypothesis.name)];
        for name in &names {
            let own = |key: &str| from(at, &format!("/hypotheses/{index}/estimators/{name}/{key}"));
            cells.push(match hypothesis.estimators.get(*name).and_then(Option::as_ref) {
                None => cell(UNKNOWN),
                Some(estimate) => html! {
                    (told(&own("log_evidence"), Some(estimate.log_evidence), |value| format!("{value:.2}"))) " ± "
                    (told(&own("error"), Some(estimate.error), two_digits))
                    @if !estimate.votes { " (does not count)" }
                },
            });
        }
        cells.push(cell(if hypothesis.agree { "yes" } else { "no" }));
        cells
    });
    let reasons = record.hypotheses.iter().flat_map(|hypothesis| {
        let absent = hypothesis
            .not_applicable
            .iter()
            .map(|(name, reason)| format!("{} of `{}`: {reason}", name.replace('_', " "), hypothesis.name));
        let doubted = hypothesis.estimators.iter().filter_map(|(name, estimate)| {
            let doubt = estimate.as_ref()?.doubt.as_ref()?;
            Some(format!("{} of `{}`: {doubt}", name.replace('_', " "), hypothesis.name))
        });
        absent.chain(doubted).collect::<Vec<String>>()
    });
    let reasons: Vec<String> = reasons.collect();
    html! {
        h3 { "The same evidence by independent routes" }
        (table("ln evidence by estimator", &header, rows.collect()))
        @if !reasons.is_empty() { (on_demand("Why some are missing or do not count", html! { ul { @for reason in reasons { li { (prose(&reason)) } } } })) }
    }
}

fn sensitivity_of(
    (at, index): (usize, usize),
    (hypothesis, sensitivity): (&HypothesisRecord, &Sensitivity),
    reference: &str,
    sheet: &mut Sheet,
) -> Markup {
    let own = |key: &str| from(at, &format!("/hypotheses/{index}/sensitivity/{key}"));
    html! {
        h3 { "How the odds of " code { (hypothesis.name) } " hang on its prior" }
        p {
            "The verdict on " code { (hypothesis.name) } ": " strong { (prose(&verdict_words(sensitivity.verdict, reference))) } ". "
            @match sensitivity.turning_width {
                Some(width) => {
                    "The odds turn at a prior width of " (told(&own("turning_width"), Some(width), |width| significant(width, 3)))
                    " (" (told(&own("width"), Some(sensitivity.width), |width| significant(width, 3))) " was used). "
                }
                None => { "No width of the prior turns the odds (" (told(&own("width"), Some(sensitivity.width), |width| significant(width, 3))) " was used). " }
            }
            "The most that any width gives is " (told(&own("largest"), Some(sensitivity.largest), |most| significant(most, 2)))
            ", at " (told(&own("largest_width"), Some(sensitivity.largest_width), |width| significant(width, 2))) "."
            @if let Some(bound) = sensitivity.bound {
                " No prior of any reasonable form could give more than " (told(&own("bound"), Some(bound), |bound| significant(bound, 2))) "."
            }
        }
        @if let Some(figure) = sensitivity_figure(hypothesis, sensitivity) {
            (sheet.figure(figure, html! {
                "ln of the ratio of evidences against the width of the departure's prior (half of its central 68 %). Vertical: the width "
                "that was used, and (dashed) the one at which the odds turn. Above 0 the data favour " (hypothesis.name) "."
            }))
        }
    }
}

fn sensitivity_figure(hypothesis: &HypothesisRecord, sensitivity: &Sensitivity) -> Option<Figure> {
    let points: Vec<(f64, f64)> = sensitivity
        .widths
        .iter()
        .copied()
        .zip(sensitivity.log_ratios.iter().copied())
        .filter(|(width, ratio)| *width > 0.0 && ratio.is_finite())
        .collect();
    let ends = (points.first()?.0, points.last()?.0);
    let (width, height) = (460.0, 270.0);
    let low = sensitivity.log_ratios.iter().copied().filter(|ratio| ratio.is_finite() && *ratio > -12.0);
    let frame = Frame {
        x: Scale::logarithmic(ends, (52.0, width - 14.0)),
        y: Scale::linear(range(low.chain([0.0]), 0.08), (height - 46.0, 40.0)),
    };
    let mut marks = frame
        .axes(Labels { x: "width of the prior", y: "ln ratio of evidences", ..Labels::default() }, (6, 6));
    marks.push(frame.across(0.0, Stroke::solid(MUTED, 1.2)));
    marks.push(frame.line(points.iter().copied(), Stroke::solid(BAND, 2.0)));
    marks.push(frame.up(sensitivity.width, Stroke::solid(INK, 1.4)));
    let mut description = format!(
        "At the width used, {}, and at most {} at {}.",
        significant(sensitivity.width, 3),
        significant(sensitivity.largest, 2),
        significant(sensitivity.largest_width, 2)
    );
    marks.push(Mark::words(
        (frame.x.clamped(sensitivity.width) + 5.0, 16.0),
        "used",
        11.0,
        Anchor::Start,
        INK,
    ));
    if let Some(turning) = sensitivity.turning_width {
        marks.push(frame.up(turning, Stroke::solid(RELATIVITY, 1.8).dashed(Dash::Long)));
        marks.push(Mark::words(
            (frame.x.clamped(turning) + 5.0, 32.0),
            "odds turn",
            11.0,
            Anchor::Start,
            RELATIVITY,
        ));
        description.push_str(&format!(" The odds turn at {}.", significant(turning, 3)));
    }
    Some(Figure {
        name: slug(&format!("prior width {}", hypothesis.name)),
        title: format!("Odds of {} against the width of its prior", hypothesis.name),
        description,
        width,
        height,
        marks,
    })
}

fn average(at: usize, record: &WeighRecord) -> Markup {
    if record.average.is_empty() {
        return html! {};
    }
    let rows = record.average.iter().map(|(name, summary)| {
        let own = |key: &str| from(at, &format!("/average/{name}/{key}"));
        vec![
            key(name),
            told(&own("mean"), Some(summary.mean), |mean| rounded(mean, summary.sd)),
            told(&own("sd"), Some(summary.sd), two_digits),
            html! {
                (told(&own("interval95/0"), Some(summary.interval95[0]), |low| rounded(low, summary.sd))) " to "
                (told(&own("interval95/1"), Some(summary.interval95[1]), |high| rounded(high, summary.sd)))
            },
        ]
    });
    html! {
        h3 { "Averaged over the hypotheses" }
        (table("Each hypothesis with its probability", &["quantity", "mean", "sd", "95 %"], rows.collect()))
    }
}

fn others(at: usize, record: &WeighRecord) -> Markup {
    let consistency = record.consistency.iter().enumerate().map(|(index, one)| {
        let own = |key: &str| from(at, &format!("/consistency/{index}/{key}"));
        let found = &one.consistency;
        vec![
            cell(&one.of),
            told(&own("log_evidence_ratio"), Some(found.log_evidence_ratio), |value| format!("{value:+.2}")),
            told(&own("suspiciousness"), Some(found.suspiciousness), |value| format!("{value:+.2}")),
            told(&own("tail_probability"), found.tail_probability, probability),
        ]
    });
    let best = record.best_of.iter().enumerate().map(|(index, one)| {
        let own = |key: &str| from(at, &format!("/best_of/{index}/{key}"));
        vec![
            cell(&one.of),
            cell(&one.best),
            told(&own("number"), Some(one.number as f64), |number| format!("{number:.0}")),
            told(&own("local"), Some(one.tail.local), probability),
            told(&own("global"), Some(one.tail.global), probability),
        ]
    });
    html! {
        @if !record.consistency.is_empty() {
            h3 { "One departure for all, or one each?" }
            (table("Consistency", &["of", "ln evidence ratio", "ln suspiciousness", "p"], consistency.collect()))
        }
        @if !record.best_of.is_empty() {
            h3 { "The best of several is the best by chance, too" }
            (table("Tails, alone and as the best of all", &["of", "best", "of how many", "p alone", "p as the best"], best.collect()))
        }
    }
}
