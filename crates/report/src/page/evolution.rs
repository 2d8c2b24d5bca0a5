//! The departure against redshift: the bands of fitted shapes, and values a bin or survey.

use maud::{Markup, html};
use oddwell_study::record::{DepartureByPart, PartAgreement, PartDeparture};
use oddwell_study::review::{CurvePoint, DepartureCurve, REFERENCE_WAVENUMBER, Review};

use super::parts::{Sheet, cell, in_summary, key, missing, on_demand, table, told};
use super::{Runs, label};
use crate::figure::{
    Anchor, CATEGORIES, Dash, Figure, Frame, INK, Labels, MUTED, Mark, RELATIVITY, Scale, Shape, Stroke,
    range,
};
use crate::numbers::{probability, rounded, significant, two_digits};

/// A run's curve with how it is drawn.
struct Drawn<'a> {
    run: &'a Review,
    curve: &'a DepartureCurve,
    style: usize,
}

/// General relativity's colour is left to it.
const COLOURS: [usize; 5] = [1, 4, 5, 0, 3];

impl Drawn<'_> {
    fn stroke(&self, width: f64) -> Stroke {
        let colour = CATEGORIES[COLOURS[self.style % COLOURS.len()]];
        Stroke::solid(colour, width).dashed(Dash::ALL[self.style % Dash::ALL.len()])
    }

    fn shape(&self) -> Shape {
        Shape::ALL[self.style % Shape::ALL.len()]
    }
}

pub(super) fn section(runs: &Runs<'_>, sheet: &mut Sheet) -> Markup {
    if runs.blinded() {
        return html! { p.missing { "Not shown while the measurements are blinded: it would tell where the departure lies." } };
    }
    let curves =
        runs.all().iter().filter_map(|run| Some((run, run.beside_data.as_ref().ok()?.curve.as_ref()?)));
    let drawn: Vec<Drawn<'_>> =
        curves.enumerate().map(|(style, (run, curve))| Drawn { run, curve, style }).collect();
    if drawn.is_empty() {
        return html! { p.missing { "No run of this page infers a departure and still has its measurements." } };
    }
    let study = &runs.first().manifest.study_file;
    let lacks = |departure: &str| drawn.iter().all(|drawn| drawn.run.summary.departure != departure);
    let scale_dependent = drawn.iter().any(|drawn| drawn.curve.scale_dependent);
    html! {
        @if let Some(figure) = figure(&drawn, runs.first().summary.by_part.as_ref()) {
            (sheet.figure(figure, html! {
                "τ against redshift: for each fitted shape the median and the central 68 % at every redshift; for a value a bin "
                "or survey, mean and one and two standard deviations. Grey squares: each bin alone, one standard deviation, linear. Ticks below: the bins."
            }))
        }
        @if scale_dependent {
            p.note { "Shapes that depend on scale are drawn at " (REFERENCE_WAVENUMBER) " h/Mpc." }
        }
        (on_demand("The numbers of this figure", numbers(&drawn)))
        @if let Some(parts) = &runs.first().summary.by_part { (by_part(parts, runs.principal)) }
        @if lacks("per-bin") {
            (missing("No run of this page gives each bin a departure of its own. A hypothesis with departure = \"per-bin\" does, fitted by",
                &format!("oddwell fit {study} --hypothesis NAME")))
        }
        @if lacks("per-survey") {
            (missing("None gives each survey its own. A hypothesis with departure = \"per-survey\" does, fitted by",
                &format!("oddwell fit {study} --hypothesis NAME")))
        }
    }
}

/// The departure from each part of the data, linear about the best point.
fn by_part(parts: &DepartureByPart, at: usize) -> Markup {
    let rows = |which: &'static str, list: &[PartDeparture]| -> Vec<Vec<Markup>> {
        let row = |(index, part): (usize, &PartDeparture)| {
            let from = |key: &str| in_summary(at, &format!("/by_part/{which}/{index}/{key}"));
            let place =
                part.bin.as_ref().map_or_else(|| part.survey.clone(), |bin| format!("{}.{bin}", part.survey));
            let pair = |(value, sd): (Option<f64>, Option<f64>), names: (&str, &str)| {
                html! {
                    (told(&from(names.0), value, |value| rounded(value, sd.unwrap_or(f64::NAN)))) " ± " (told(&from(names.1), sd, two_digits))
                }
            };
            vec![
                key(&place),
                pair((part.value, part.sd), ("value", "sd")),
                pair((part.together, part.together_sd), ("together", "together_sd")),
            ]
        };
        list.iter().enumerate().map(row).collect()
    };
    let agreement = |what: &str, which: &str, found: &Option<PartAgreement>| match found {
        None => html! {},
        Some(found) => html! {
            p {
                "Do the " (what) " agree? χ² " (told(&in_summary(at, &format!("/by_part/{which}/chi2")), Some(found.chi2), |chi2| format!("{chi2:.1}")))
                " for " (found.degrees_of_freedom) ", p "
                (told(&in_summary(at, &format!("/by_part/{which}/p_value")), found.p_value, probability)) "."
            }
        },
    };
    html! {
        h3 { "From each survey and each bin" }
        @if !parts.surveys.is_empty() { (table("The departure by survey", &["survey", "alone", "together, one each"], rows("surveys", &parts.surveys))) }
        (agreement("surveys", "survey_agreement", &parts.survey_agreement))
        @if !parts.bins.is_empty() { (table("The departure by bin", &["bin", "alone", "together, one each"], rows("bins", &parts.bins))) }
        (agreement("bins", "bin_agreement", &parts.bin_agreement))
        p.note { "Linear about the best point, without the departure's own prior. Together: nuisances in common." }
    }
}

/// Each bin alone, beside its own place: open for the eye, since linear.
fn alone(
    parts: Option<&DepartureByPart>,
    bins: &[(String, f64)],
    frame: &Frame,
    description: &mut String,
) -> Vec<Mark> {
    let mut marks = Vec::new();
    for part in parts.iter().flat_map(|parts| &parts.bins) {
        let (Some(bin), Some(value), Some(sd)) = (&part.bin, part.value, part.sd) else { continue };
        let place = format!("{}.{bin}", part.survey);
        let Some((_, redshift)) = bins.iter().find(|(known, _)| *known == place) else { continue };
        let tip = format!("{place} alone: {} ± {}", rounded(value, sd), two_digits(sd));
        description.push_str(&format!("{tip}. "));
        let x = frame.x.at(*redshift) - 7.0;
        let (low, high) = (frame.y.clamped(value - sd), frame.y.clamped(value + sd));
        let square = Mark::Symbol {
            at: (x, frame.y.clamped(value)),
            radius: 3.6,
            shape: Shape::Square,
            colour: MUTED,
        };
        let bar = Mark::line(vec![(x, low), (x, high)], Stroke::solid(MUTED, 1.4));
        marks.push(Mark::about(&[&place], tip, vec![bar, square]));
    }
    marks
}

fn figure(drawn: &[Drawn<'_>], by_part: Option<&DepartureByPart>) -> Option<Figure> {
    let bins = &drawn[0].curve.bins;
    let highest = bins.iter().map(|(_, redshift)| *redshift).fold(0.0, f64::max) * 1.15;
    let two_sided = |mean: Option<f64>, sd: Option<f64>| {
        let (mean, sd) = (mean.unwrap_or(f64::NAN), sd.unwrap_or(f64::NAN));
        [mean - 2.0 * sd, mean + 2.0 * sd]
    };
    let values = drawn.iter().flat_map(|drawn| {
        let band = drawn.curve.band.iter().flat_map(|point| point.band68);
        let own = drawn.curve.values.iter().flat_map(|(_, _, value)| two_sided(value.mean, value.sd));
        band.chain(own).collect::<Vec<f64>>()
    });
    let parts = by_part.into_iter().flat_map(|parts| &parts.bins);
    let alone_ends = parts.filter_map(|part| Some((part.value?, part.sd?)));
    let alone_ends = alone_ends.flat_map(|(value, sd)| [value - sd, value + sd]);
    let ends = range(values.chain(alone_ends).chain([0.0]), 0.06);
    let legend = 20.0 * (drawn.len() as f64 + 1.0);
    let (width, height) = (480.0, 310.0 + legend);
    let frame = Frame {
        x: Scale::linear((0.0, highest), (56.0, width - 16.0)),
        y: Scale::linear(ends, (height - 48.0, legend + 26.0)),
    };
    let mut marks = frame.axes(Labels { x: "redshift", y: "τ", ..Labels::default() }, (8, 6));
    let mut description = String::new();
    for (line, each) in drawn.iter().enumerate() {
        let stroke = each.stroke(2.0);
        let y = 16.0 + 20.0 * line as f64;
        marks.push(Mark::line(vec![(56.0, y - 4.0), (84.0, y - 4.0)], stroke));
        if !each.curve.values.is_empty() {
            marks.push(Mark::Symbol {
                at: (70.0, y - 4.0),
                radius: 4.0,
                shape: each.shape(),
                colour: stroke.colour,
            });
        }
        marks.push(Mark::words((92.0, y), label(each.run), 12.0, Anchor::Start, INK));
        let band: Vec<(f64, f64, f64)> =
            each.curve.band.iter().map(|point| (point.redshift, point.band68[0], point.band68[1])).collect();
        if !band.is_empty() {
            marks.push(frame.band(&band, stroke.colour, 0.16));
            let middle = each.curve.band.iter().map(|point| (point.redshift, point.median));
            let tip = band_text(each.run, &each.curve.band);
            description.push_str(&format!("{tip} "));
            marks.push(Mark::about(&["departure.tau"], tip, vec![frame.line(middle, stroke)]));
        }
        for (place, [low, high], value) in &each.curve.values {
            let (Some(mean), Some(sd)) = (value.mean, value.sd) else { continue };
            // Several runs with values of their own stand beside each other.
            let x = 0.5 * (low + high) + 0.006 * highest * (line as f64 - 1.0);
            let tip = format!(
                "{}, {place}: {} ± {}",
                each.run.summary.hypothesis,
                rounded(mean, sd),
                two_digits(sd)
            );
            description.push_str(&format!("{tip}. "));
            let thick = Stroke::solid(stroke.colour, 2.4);
            let mut own = vec![
                frame.bar(x, (mean - 2.0 * sd, mean + 2.0 * sd), Stroke::solid(stroke.colour, 1.0)),
                frame.bar(x, (mean - sd, mean + sd), thick),
                Mark::Symbol {
                    at: frame.at((x, mean)),
                    radius: 4.5,
                    shape: each.shape(),
                    colour: stroke.colour,
                },
            ];
            if high > low {
                own.push(frame.line([(*low, mean), (*high, mean)], thick));
            }
            let name = format!("departure.tau.{place}");
            marks.push(Mark::about(&[place, &name], tip, own));
        }
    }
    marks.extend(alone(by_part, bins, &frame, &mut description));
    let y = 16.0 + 20.0 * drawn.len() as f64;
    let dashed = Stroke::solid(RELATIVITY, 2.0).dashed(Dash::Long);
    marks.push(Mark::line(vec![(56.0, y - 4.0), (84.0, y - 4.0)], dashed));
    marks.push(Mark::words((92.0, y), "general relativity", 12.0, Anchor::Start, INK));
    marks.push(frame.across(0.0, dashed));
    for (place, redshift) in bins {
        let (x, bottom) = (frame.x.at(*redshift), frame.y.ends().0);
        let tick = Mark::line(vec![(x, bottom), (x, bottom - 7.0)], Stroke::solid(INK, 2.0));
        marks.push(Mark::about(&[place], format!("{place} at redshift {redshift}"), vec![tick]));
    }
    (highest > 0.0).then(|| Figure {
        name: "departure-against-redshift".to_owned(),
        title: "The departure against redshift".to_owned(),
        description: format!("{description}General relativity is at 0."),
        width,
        height,
        marks,
    })
}

fn band_text(run: &Review, band: &[CurvePoint]) -> String {
    let at = |point: &CurvePoint| {
        let half = 0.5 * (point.band68[1] - point.band68[0]);
        format!(
            "{} ({} to {}) at redshift {}",
            rounded(point.median, half),
            rounded(point.band68[0], half),
            rounded(point.band68[1], half),
            significant(point.redshift, 2)
        )
    };
    match (band.first(), band.last()) {
        (Some(first), Some(last)) => format!("{}: {}, {}.", run.summary.hypothesis, at(first), at(last)),
        _ => run.summary.hypothesis.clone(),
    }
}

fn numbers(drawn: &[Drawn<'_>]) -> Markup {
    let mut rows = Vec::new();
    for each in drawn {
        for point in each.curve.band.iter().step_by(5) {
            let half = 0.5 * (point.band68[1] - point.band68[0]);
            rows.push(vec![
                cell(&each.run.summary.hypothesis),
                cell(format!("redshift {}", significant(point.redshift, 2))),
                cell(rounded(point.median, half)),
                cell(format!("{} to {}", rounded(point.band68[0], half), rounded(point.band68[1], half))),
                cell(format!("{} to {}", rounded(point.band95[0], half), rounded(point.band95[1], half))),
            ]);
        }
        for (place, _, value) in &each.curve.values {
            let sd = value.sd.unwrap_or(f64::NAN);
            let ends = |interval: Option<[f64; 2]>| {
                let [low, high] = interval.unwrap_or([f64::NAN; 2]);
                cell(format!("{} to {}", rounded(low, sd), rounded(high, sd)))
            };
            rows.push(vec![
                cell(&each.run.summary.hypothesis),
                key(place),
                cell(rounded(value.mean.unwrap_or(f64::NAN), sd)),
                ends(value.interval68),
                ends(value.interval95),
            ]);
        }
    }
    table("τ against redshift", &["hypothesis", "where", "median or mean", "68 %", "95 %"], rows)
}
