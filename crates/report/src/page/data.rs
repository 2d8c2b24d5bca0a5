//! Every multipole of every bin: measured, predicted, and what is left.

use maud::{Markup, html};
use oddwell_study::review::{Panel, PanelRow, Review};

use super::parts::{Sheet, cell, key, on_demand, prose, slug, table};
use super::{Runs, label};
use crate::figure::{
    Anchor, BAND, CATEGORIES, Dash, Figure, Frame, INK, Labels, MUTED, Mark, RELATIVITY, Scale, Shape,
    Stroke, range,
};
use crate::numbers::{UNKNOWN, probability, significant};

const WIDTH: f64 = 360.0;

pub(super) fn section(runs: &Runs<'_>, sheet: &mut Sheet) -> Markup {
    let run = runs.first();
    let others: Vec<&Review> = runs.others().map(|(_, run)| run).collect();
    html! {
        (panels_of(run, "", sheet))
        @for run in others {
            (on_demand(&format!("The same under {}", label(run)), panels_of(run, &run.summary.hypothesis, sheet)))
        }
    }
}

/// The panels of a run; `prefix` tells the names of its figures from those of other runs.
fn panels_of(run: &Review, prefix: &str, sheet: &mut Sheet) -> Markup {
    let beside = match &run.beside_data {
        Ok(beside) => beside,
        Err(error) => {
            return html! { p.missing { "The measurements are not shown: " (prose(&error.to_string())) "." } };
        }
    };
    let mut bins: Vec<(String, Vec<&Panel>)> = Vec::new();
    for panel in &beside.panels {
        let place = format!("{}.{}", panel.survey, panel.bin);
        match bins.iter_mut().find(|(known, _)| *known == place) {
            Some((_, panels)) => panels.push(panel),
            None => bins.push((place, vec![panel])),
        }
    }
    html! {
        p.note {
            @if run.summary.blinded {
                "Blinded: only what is left after the best prediction is shown, in units of each error. "
            } @else {
                "Points with errors: measured. Line and bands: the best prediction, 68 % and 95 % of the posterior. Dashed: the "
                "same without the departure. Beneath: what is left, in units of each error. "
            }
            "Errors of neighbouring points are correlated; χ² takes that into account, the eye does not."
        }
        @for (place, panels) in bins {
            h3 { (key(&place)) }
            div.grid {
                @for panel in &panels {
                    (sheet.figure(panel_figure(panel, prefix, run.summary.blinded), caption(panel)))
                }
            }
            @if !run.summary.blinded {
                (on_demand(&format!("Effects and numbers of {place}"), html! {
                    div.grid {
                        @for panel in panels.iter().filter(|panel| panel.multipole % 2 == 1) {
                            (sheet.figure(effects_figure(panel, prefix), html! {
                                "What each physical effect contributes to " (name(panel)) " at the best point."
                            }))
                        }
                    }
                    @for panel in panels { (numbers(panel)) }
                }))
            }
        }
    }
}

fn name(panel: &Panel) -> String {
    let what = match panel.multipole {
        0 => "monopole",
        1 => "dipole",
        2 => "quadrupole",
        3 => "octupole",
        _ => "hexadecapole",
    };
    if panel.pair == "first-second" { what.to_owned() } else { format!("{what} of {}", panel.pair) }
}

fn caption(panel: &Panel) -> Markup {
    html! {
        (name(panel)) ": χ² " (format!("{:.1}", panel.chi_squared)) " for " (panel.rows.len())
        (if panel.rows.len() == 1 { " number" } else { " numbers" })
        @if let Some(effective) = panel.effective_parameters { " and " (format!("{effective:.1}")) " effective parameters" }
        ", p " (panel.p_value.map_or(UNKNOWN.to_owned(), probability))
    }
}

/// What is drawn: ξ s², or P k, which take most of the steepness away.
fn weight(panel: &Panel, at: f64) -> f64 {
    if panel.fourier { at } else { at * at }
}

fn axis_names(panel: &Panel) -> (&'static str, String) {
    let ell = panel.multipole;
    if panel.fourier {
        let what = if ell % 2 == 1 { "k Im P" } else { "k P" };
        ("wavenumber k (h/Mpc)", format!("{what}{ell} ((Mpc/h)²)"))
    } else {
        ("separation s (Mpc/h)", format!("s² ξ{ell} ((Mpc/h)²)"))
    }
}

fn horizontal(panel: &Panel) -> Scale {
    let ends = range(panel.rows.iter().map(|row| row.at), 0.05);
    Scale::linear(ends, (52.0, WIDTH - 10.0))
}

fn keys(panel: &Panel) -> String {
    format!("{}.{}", panel.survey, panel.bin)
}

fn panel_figure(panel: &Panel, prefix: &str, blinded: bool) -> Figure {
    let place = keys(panel);
    let (below, left) = axis_names(panel);
    let x = horizontal(panel);
    let (top, middle, height) = if blinded { (0.0, 0.0, 150.0) } else { (26.0, 212.0, 318.0) };
    let mut marks = Vec::new();
    if !blinded {
        let scaled = |row: &PanelRow, value: f64| value * weight(panel, row.at);
        let all = panel.rows.iter().flat_map(|row| {
            let measured = row.measured.unwrap_or(f64::NAN);
            [measured - row.error, measured + row.error, row.band95[0], row.band95[1], row.general_relativity]
                .map(|value| scaled(row, value))
        });
        let frame = Frame { x, y: Scale::linear(range(all.chain([0.0]), 0.05), (middle, top)) };
        marks.extend(frame.axes(Labels { y: &left, bare_x: true, ..Labels::default() }, (6, 5)));
        marks.push(frame.across(0.0, Stroke::solid(MUTED, 0.8)));
        for (low, high, opacity) in [(0, 1, 0.14), (2, 3, 0.3)] {
            let band: Vec<(f64, f64, f64)> = panel
                .rows
                .iter()
                .map(|row| {
                    let ends = [row.band95[0], row.band95[1], row.band68[0], row.band68[1]];
                    (row.at, scaled(row, ends[low]), scaled(row, ends[high]))
                })
                .collect();
            marks.push(frame.band(&band, BAND, opacity));
        }
        let line = |value: fn(&PanelRow) -> f64| {
            panel.rows.iter().map(move |row| (row.at, scaled(row, value(row)))).collect::<Vec<_>>()
        };
        marks.push(
            frame.line(line(|row| row.general_relativity), Stroke::solid(RELATIVITY, 1.6).dashed(Dash::Long)),
        );
        marks.push(frame.line(line(|row| row.best), Stroke::solid(BAND, 1.8)));
        for row in &panel.rows {
            let Some(measured) = row.measured else { continue };
            let bar = (scaled(row, measured - row.error), scaled(row, measured + row.error));
            let symbol = Mark::Symbol {
                at: (frame.x.at(row.at), frame.y.clamped(scaled(row, measured))),
                radius: 3.0,
                shape: Shape::Disc,
                colour: INK,
            };
            marks.push(Mark::about(
                &[&place],
                tip(panel, row),
                vec![frame.bar(row.at, bar, Stroke::solid(INK, 1.2)), symbol],
            ));
        }
    }
    let largest = panel.rows.iter().map(|row| row.residual.abs()).fold(2.5, f64::max) * 1.08;
    let beneath = Frame { x, y: Scale::linear((-largest, largest), (height - 40.0, middle + 26.0)) };
    marks.extend(beneath.axes(Labels { x: below, y: "residual (σ)", ..Labels::default() }, (6, 3)));
    marks.push(Mark::Area { points: box_of(&beneath, 1.0), fill: MUTED, opacity: 0.12 });
    marks.push(beneath.across(0.0, Stroke::solid(BAND, 1.4)));
    for row in &panel.rows {
        let symbol = Mark::Symbol {
            at: beneath.at((row.at, row.residual)),
            radius: 3.0,
            shape: Shape::Disc,
            colour: INK,
        };
        let stem = beneath.bar(row.at, (0.0, row.residual), Stroke::solid(INK, 1.0));
        marks.push(Mark::about(&[&place], tip(panel, row), vec![stem, symbol]));
    }
    let worst = panel.rows.iter().max_by(|one, other| one.residual.abs().total_cmp(&other.residual.abs()));
    let description = format!(
        "{} of {place}, {} numbers: χ² {:.1}, p {}. The largest residual is {}.",
        name(panel),
        panel.rows.len(),
        panel.chi_squared,
        panel.p_value.map_or(UNKNOWN.to_owned(), probability),
        worst.map_or(UNKNOWN.to_owned(), |row| format!("{:+.1} σ at {}", row.residual, at(panel, row.at)))
    );
    Figure {
        name: slug(&format!("{prefix} {place} {} {}", panel.pair, name(panel))),
        title: format!("{place}: {}", name(panel)),
        description,
        width: WIDTH,
        height,
        marks,
    }
}

fn box_of(frame: &Frame, half: f64) -> Vec<(f64, f64)> {
    let ((left, right), low, high) = (frame.x.ends(), frame.y.at(-half), frame.y.at(half));
    vec![(left, low), (right, low), (right, high), (left, high)]
}

fn at(panel: &Panel, at: f64) -> String {
    let unit = if panel.fourier { "h/Mpc" } else { "Mpc/h" };
    format!("{} {unit}", significant(at, 3))
}

fn tip(panel: &Panel, row: &PanelRow) -> String {
    let place = format!("{}.{} {} at {}", panel.survey, panel.bin, name(panel), at(panel, row.at));
    let left = format!("{:+.2} σ from the best prediction", row.residual);
    match row.measured {
        Some(measured) => format!(
            "{place}: {} ± {}, best {}, {left}",
            significant(measured, 3),
            significant(row.error, 2),
            significant(row.best, 3)
        ),
        None => format!("{place}: {left}"),
    }
}

/// What to call the columns of effects.
fn effect_words(effect: &str) -> String {
    effect.replace('_', " ")
}

fn effects_figure(panel: &Panel, prefix: &str) -> Figure {
    let place = keys(panel);
    let (below, left) = axis_names(panel);
    let x = horizontal(panel);
    let scaled = |row: &PanelRow, value: f64| value * weight(panel, row.at);
    let effects: Vec<&str> = panel
        .rows
        .first()
        .map(|row| row.effects.iter().map(|(effect, _)| effect.as_str()).collect())
        .unwrap_or_default();
    let column =
        |effect: usize| panel.rows.iter().map(move |row| (row.at, scaled(row, row.effects[effect].1)));
    let shown: Vec<usize> =
        (0..effects.len()).filter(|&effect| column(effect).any(|(_, value)| value != 0.0)).collect();
    let legend = 18.0 * shown.len().div_ceil(2) as f64;
    let height = 250.0 + legend;
    let all = shown.iter().flat_map(|&effect| column(effect).map(|(_, value)| value)).chain([0.0]);
    let frame = Frame { x, y: Scale::linear(range(all, 0.05), (height - 44.0, legend + 30.0)) };
    let mut marks = frame.axes(Labels { x: below, y: &left, ..Labels::default() }, (6, 5));
    let mut parts = Vec::new();
    for (line, &effect) in shown.iter().enumerate() {
        let words = effect_words(effects[effect]);
        let stroke =
            Stroke::solid(CATEGORIES[line % CATEGORIES.len()], 1.8).dashed(Dash::ALL[line % Dash::ALL.len()]);
        let (x, y) = (10.0 + 175.0 * (line % 2) as f64, 12.0 + 18.0 * (line / 2) as f64);
        marks.push(Mark::line(vec![(x, y - 4.0), (x + 24.0, y - 4.0)], stroke));
        marks.push(Mark::words((x + 30.0, y), words.clone(), 11.0, Anchor::Start, INK));
        let smallest = panel.rows.first().map_or(f64::NAN, |row| row.effects[effect].1);
        let tip = format!(
            "{words}: {} at {}",
            significant(smallest, 2),
            panel.rows.first().map_or(String::new(), |row| at(panel, row.at))
        );
        parts.push(tip.clone());
        marks.push(Mark::about(&[], tip, vec![frame.line(column(effect), stroke)]));
    }
    Figure {
        name: slug(&format!("{prefix} {place} {} {} effects", panel.pair, name(panel))),
        title: format!("{place}: effects in the {}", name(panel)),
        description: format!("Contributions to the {} of {place}: {}.", name(panel), parts.join("; ")),
        width: WIDTH,
        height,
        marks,
    }
}

fn numbers(panel: &Panel) -> Markup {
    let effects: Vec<&str> = panel
        .rows
        .first()
        .map(|row| row.effects.iter().map(|(effect, _)| effect.as_str()).collect())
        .unwrap_or_default();
    let first = if panel.fourier { "k (h/Mpc)" } else { "s (Mpc/h)" };
    let words: Vec<String> = effects.iter().map(|effect| effect_words(effect)).collect();
    let mut header = vec![first, "measured", "error", "best", "without departure", "residual (σ)"];
    header.extend(words.iter().map(String::as_str));
    let rows = panel.rows.iter().map(|row| {
        let three = |value: f64| cell(significant(value, 3));
        let mut cells = vec![
            cell(significant(row.at, 4)),
            row.measured.map_or_else(|| cell(UNKNOWN), three),
            cell(significant(row.error, 2)),
            three(row.best),
            three(row.general_relativity),
            cell(format!("{:+.2}", row.residual)),
        ];
        cells.extend(row.effects.iter().map(|(_, value)| three(*value)));
        cells
    });
    table(&format!("{} of {}", name(panel), keys(panel)), &header, rows.collect())
}
