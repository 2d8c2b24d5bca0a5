//! How far the departure moves when the data are cut or the assumptions changed.

use maud::{Markup, html};
use oddwell_study::record::{Stability, Variation};
use oddwell_study::review::Review;

use super::parts::{Sheet, cell, key_as, missing, table, told};
use super::{Runs, label};
use crate::figure::{
    Anchor, BAND, Figure, Frame, INK, Labels, MUTED, Mark, RELATIVITY, Scale, Shape, Stroke,
};
use crate::numbers::{UNKNOWN, count, rounded, two_digits};

/// Kinds of change, in the order of the figure, with their headings.
const KINDS: [(&str, &str); 6] = [
    ("smallest", "smallest scale moved up"),
    ("largest", "largest scale moved down"),
    ("without", "left out"),
    ("only", "alone"),
    ("noise", "noise model"),
    ("growth", "growth"),
];

pub(super) fn section(runs: &Runs<'_>, sheet: &mut Sheet) -> Markup {
    let manifest = &runs.first().manifest;
    let stable: Vec<(usize, &Review, &Stability)> = runs
        .all()
        .iter()
        .enumerate()
        .filter_map(|(at, run)| Some((at, run, run.stability.as_ref()?)))
        .collect();
    if stable.is_empty() {
        return missing(
            "No run with other cuts of the data was made. They are made, with the run itself, by",
            &format!(
                "oddwell fit {} --hypothesis {} --stability --replace",
                manifest.study_file, manifest.hypothesis
            ),
        );
    }
    html! {
        @for (at, run, stability) in stable { (of_run(at, run, stability, sheet)) }
        p.note {
            "Bars: the difference from the whole run. Grey: one and two standard deviations of the scatter that nested subsets of "
            "the same data must show anyway, √(σ² of the subset − σ² of the whole) (Gratton & Challinor 2020). With this many cuts "
            "one or two beyond two standard deviations are no surprise: no cut is better for the number that it gives. Where the data "
            "are the same (noise, growth), nothing is expected by chance, and the difference is what the assumption is worth."
        }
    }
}

/// The difference in units of its expected scatter.
fn deviations(variation: &Variation) -> Option<f64> {
    let scatter = variation.expected_scatter.filter(|scatter| *scatter > 0.0)?;
    Some(variation.difference? / scatter)
}

fn of_run(at: usize, run: &Review, stability: &Stability, sheet: &mut Sheet) -> Markup {
    let nested: Vec<f64> = stability.variations.iter().filter_map(deviations).collect();
    let beyond = nested.iter().filter(|deviation| deviation.abs() > 2.0).count();
    let largest =
        nested.iter().copied().fold(0.0, |most: f64, one| if one.abs() > most.abs() { one } else { most });
    let rows = stability.variations.iter().enumerate().map(|(index, variation)| {
        let from = |key: &str| format!("{at}:stability.json:/variations/{index}/{key}");
        let sd = variation.found.as_ref().and_then(|point| point.sd);
        let error = sd.unwrap_or(f64::NAN);
        let mean = variation.found.as_ref().and_then(|point| point.mean);
        vec![
            words(variation),
            cell(
                variation.found.as_ref().map_or(UNKNOWN.to_owned(), |point| count(point.data_points as u64)),
            ),
            if stability.blinded {
                html! { em { "hidden" } }
            } else {
                told(&from("found/mean"), mean, |mean| rounded(mean, error))
            },
            told(&from("found/sd"), sd, two_digits),
            told(&from("difference"), variation.difference, |difference| format!("{difference:+.2}")),
            told(&from("expected_scatter"), variation.expected_scatter, two_digits),
            cell(deviations(variation).map_or(UNKNOWN.to_owned(), |deviation| format!("{deviation:+.1}"))),
        ]
    });
    let failed: Vec<&Variation> =
        stability.variations.iter().filter(|variation| variation.found.is_none()).collect();
    let unfinished: Vec<&Variation> = stability
        .variations
        .iter()
        .filter(|variation| variation.found.as_ref().is_some_and(|point| !point.converged))
        .collect();
    html! {
        h3 { (label(run)) }
        p {
            (nested.len()) " cuts of the same data; " (beyond) (if beyond == 1 { " moves " } else { " move " })
            (stability.parameter) " by more than twice the scatter expected"
            @if !nested.is_empty() { ", the largest by " (format!("{largest:+.1}")) " times it" }
            ". By chance " (format!("{:.1}", 0.0455 * nested.len() as f64)) " would (cuts overlap, so they are not independent)."
        }
        (sheet.figure(figure(run, stability), html! { "How far " (key_as(&stability.parameter, &stability.parameter)) " moves." }))
        @for variation in failed { p.missing { (variation.text) ": " (variation.reason.as_deref().unwrap_or("no result")) } }
        @for variation in unfinished { p.missing { (variation.text) ": did not converge; do not quote it." } }
        (super::parts::on_demand("The numbers of this figure", table(
            "The departure under other cuts and assumptions",
            &["", "numbers", "mean", "sd", "difference", "expected scatter", "difference over scatter"], rows.collect())))
    }
}

fn words(variation: &Variation) -> Markup {
    match &variation.place {
        Some(place) => key_as(place, &variation.text),
        None => html! { (variation.text) },
    }
}

fn figure(run: &Review, stability: &Stability) -> Figure {
    let (width, row, left) = (640.0, 20.0, 230.0);
    let groups: Vec<(&str, Vec<&Variation>)> = KINDS
        .iter()
        .map(|(kind, heading)| {
            let own = stability
                .variations
                .iter()
                .filter(|variation| variation.kind == *kind && variation.difference.is_some());
            (*heading, own.collect())
        })
        .filter(|(_, own): &(&str, Vec<&Variation>)| !own.is_empty())
        .collect();
    let lines: usize = groups.iter().map(|(_, own)| own.len() + 1).sum();
    let height = 24.0 + row * lines as f64 + 52.0;
    let reach = stability
        .variations
        .iter()
        .filter_map(|variation| {
            Some(variation.difference?.abs().max(2.0 * variation.expected_scatter.unwrap_or(0.0)))
        })
        .fold(0.1, f64::max)
        * 1.06;
    let x = Scale::linear((-reach, reach), (left, width - 84.0));
    let bottom = height - 46.0;
    let frame = Frame { x, y: Scale::linear((0.0, 1.0), (bottom, 10.0)) };
    let label = format!("change of {}", stability.parameter);
    let mut marks = frame.axes(Labels { x: &label, bare_y: true, ..Labels::default() }, (7, 0));
    marks.push(frame.up(0.0, Stroke::solid(MUTED, 1.0)));
    let mut y = 24.0;
    let mut said = Vec::new();
    for (heading, own) in groups {
        marks.push(Mark::words((12.0, y + 4.0), heading, 12.0, Anchor::Start, MUTED));
        y += row;
        for variation in own {
            let difference = variation.difference.unwrap_or(f64::NAN);
            let mut parts =
                vec![Mark::words((left - 8.0, y + 4.0), variation.text.clone(), 11.0, Anchor::End, INK)];
            let mut tip = format!("{}: moves by {difference:+.2}", variation.text);
            if let Some(scatter) = variation.expected_scatter {
                for (times, opacity) in [(2.0, 0.16), (1.0, 0.22)] {
                    let (low, high) = (x.clamped(-times * scatter), x.clamped(times * scatter));
                    let corners = vec![(low, y - 7.0), (high, y - 7.0), (high, y + 7.0), (low, y + 7.0)];
                    parts.push(Mark::Area { points: corners, fill: MUTED, opacity });
                }
                tip.push_str(&format!(", {} expected by chance", two_digits(scatter)));
            }
            let far = deviations(variation).is_some_and(|deviation| deviation.abs() > 2.0);
            let colour = if far { RELATIVITY } else { BAND };
            let shape = if far { Shape::Diamond } else { Shape::Disc };
            parts.push(Mark::line(
                vec![(x.at(0.0), y), (x.clamped(difference), y)],
                Stroke::solid(colour, 2.0),
            ));
            parts.push(Mark::Symbol { at: (x.clamped(difference), y), radius: 4.0, shape, colour });
            let amount =
                deviations(variation).map_or_else(String::new, |deviation| format!("{deviation:+.1} σ"));
            parts.push(Mark::words((width - 76.0, y + 4.0), amount, 11.0, Anchor::Start, INK));
            said.push(tip.clone());
            let keys: Vec<&str> = variation.place.as_deref().into_iter().collect();
            marks.push(Mark::about(&keys, tip, parts));
            y += row;
        }
    }
    Figure {
        name: super::parts::slug(&format!("stability {}", run.summary.hypothesis)),
        title: format!("How far {} moves", stability.parameter),
        description: format!("{}.", said.join("; ")),
        width,
        height,
        marks,
    }
}
