//! What limits the departure: the error budget, what depends on what, and what the data taught about each nuisance.

use maud::{Markup, html};
use oddwell_study::check::BudgetLine;
use oddwell_study::review::{Dependence, JointPicture, RankedPair, Review};

use super::parts::{Sheet, cell, in_summary, key, on_demand, prose, slug, table, told};
use super::{Runs, label};
use crate::figure::{
    Anchor, BAND, Dash, Figure, Frame, GRID, INK, Labels, MUTED, Mark, RELATIVITY, Scale, Shape, Stroke,
    contours,
};
use crate::numbers::{rounded, share, two_digits};

pub(super) fn section(runs: &Runs<'_>, sheet: &mut Sheet) -> Markup {
    let (at, run) = (runs.principal, runs.first());
    html! {
        (budget(run, sheet))
        (degeneracies(run, sheet))
        (nuisances(run, at, sheet))
        @for (at, run) in runs.others() {
            @if !run.summary.departure_parameters.is_empty() {
                (on_demand(&format!("The strongest degeneracies under {}", label(run)), html! {
                    (ranking("Of the departure, by strength", &run.dependence, &run.dependence.of_departure))
                }))
                (moved_most(run, at))
            }
        }
    }
}

fn budget(run: &Review, sheet: &mut Sheet) -> Markup {
    let beside = match &run.beside_data {
        Ok(beside) => beside,
        Err(error) => {
            return html! { p.missing { "The error budget needs the measurements: " (prose(&error.to_string())) "." } };
        }
    };
    let Some((verdicts, whole)) =
        beside.check.verdicts.as_ref().and_then(|all| Some((all, all.expected_sd?)))
    else {
        return html! { p.missing { "This hypothesis infers no departure, so there is no error of one to share out." } };
    };
    html! {
        h3 { "The error budget" }
        (sheet.figure(budget_figure(whole, &verdicts.error_budget), html! {
            "What the standard deviation of the departure would be with each group of nuisances known exactly; the line is with none "
            "known. From covariances and priors about general relativity, before any data. Groups share errors, so the shares need not add up."
        }))
    }
}

fn budget_figure(whole: f64, lines: &[BudgetLine]) -> Figure {
    let (width, row) = (640.0, 26.0);
    let height = 40.0 + row * lines.len() as f64 + 40.0;
    let x = Scale::linear((0.0, 1.12 * whole), (190.0, width - 120.0));
    let bottom = height - 44.0;
    let frame = Frame { x, y: Scale::linear((0.0, 1.0), (bottom, 26.0)) };
    let mut marks = frame
        .axes(Labels { x: "standard deviation of the departure", bare_y: true, ..Labels::default() }, (6, 0));
    let mut said = Vec::new();
    for (index, line) in lines.iter().enumerate() {
        let y = 44.0 + row * index as f64;
        let end = x.at(line.sd);
        let tip =
            format!("{} known: {} ({} of the variance)", line.group, two_digits(line.sd), share(line.share));
        said.push(tip.clone());
        let bar = Mark::Area {
            points: vec![(190.0, y - 8.0), (end, y - 8.0), (end, y + 6.0), (190.0, y + 6.0)],
            fill: BAND,
            opacity: 0.75,
        };
        marks.push(Mark::words((182.0, y + 4.0), line.group.clone(), 12.0, Anchor::End, INK));
        let words = format!("{} ({})", two_digits(line.sd), share(line.share));
        marks.push(Mark::about(
            &[],
            tip,
            vec![bar, Mark::words((width - 112.0, y + 4.0), words, 12.0, Anchor::Start, INK)],
        ));
    }
    marks.push(frame.up(whole, Stroke::solid(RELATIVITY, 2.0).dashed(Dash::Long)));
    marks.push(Mark::words(
        (x.at(whole), 18.0),
        format!("nothing known: {}", two_digits(whole)),
        12.0,
        Anchor::Middle,
        RELATIVITY,
    ));
    Figure {
        name: "error-budget".to_owned(),
        title: "The error budget of the departure".to_owned(),
        description: format!("With nothing known: {}. {}.", two_digits(whole), said.join("; ")),
        width,
        height,
        marks,
    }
}

fn ranking(caption: &str, dependence: &Dependence, pairs: &[RankedPair]) -> Markup {
    let rows = pairs.iter().map(|pair| {
        let strength = pair.correlation.abs();
        vec![
            html! { (key(&dependence.names[pair.first])) " and " (key(&dependence.names[pair.second])) },
            cell(format!("{:+.2}", pair.correlation).replace('-', "−")),
            html! { meter min="0" max="1" value=(format!("{strength:.3}")) aria-label="strength" { (format!("{strength:.2}")) } },
        ]
    });
    table(caption, &["pair", "correlation", "strength"], rows.collect())
}

fn degeneracies(run: &Review, sheet: &mut Sheet) -> Markup {
    let dependence = &run.dependence;
    html! {
        h3 { "Degeneracies, the strongest first" }
        div.columns {
            @if !dependence.of_departure.is_empty() { (ranking("Of the departure", dependence, &dependence.of_departure)) }
            (ranking("Of all parameters", dependence, &dependence.ranked))
        }
        p.note {
            "Correlations of pairs. What no pair shows: the same error in both evolution biases of every bin is the same as a "
            "departure; section 1 says how large it would have to be."
        }
        div.grid.small {
            @for picture in &dependence.pictures {
                (sheet.figure(joint_figure(run, picture), html! {
                    (key(&dependence.names[picture.pair.first])) " against " (key(&dependence.names[picture.pair.second])) ": 68 % and 95 %"
                }))
            }
        }
        @if dependence.names.len() > 1 {
            (on_demand(&format!("All correlations ({} parameters)", dependence.names.len()), sheet.figure(matrix_figure(dependence), html! {
                "Filled squares: positive; open ones: negative; their side is the strength."
            })))
        }
    }
}

/// While blinded, a departure is shown from its own mean.
fn axis(run: &Review, name: &str, values: &[f64]) -> (String, f64) {
    let hidden = run.summary.blinded && (name.starts_with("departure.") || name.starts_with("derived."));
    if hidden {
        (format!("{name} (from its mean)"), 0.5 * (values[0] + values[values.len() - 1]))
    } else {
        (name.to_owned(), 0.0)
    }
}

fn joint_figure(run: &Review, picture: &JointPicture) -> Figure {
    let names = &run.dependence.names;
    let (first, second) = (&names[picture.pair.first], &names[picture.pair.second]);
    let density = &picture.density;
    let ((below, shift_x), (left, shift_y)) =
        (axis(run, first, &density.first), axis(run, second, &density.second));
    let (width, height) = (300.0, 290.0);
    let ends = |values: &[f64], shift: f64| (values[0] - shift, values[values.len() - 1] - shift);
    let frame = Frame {
        x: Scale::linear(ends(&density.first, shift_x), (50.0, width - 10.0)),
        y: Scale::linear(ends(&density.second, shift_y), (height - 44.0, 26.0)),
    };
    let mut marks = frame.axes(Labels { x: &below, y: &left, ..Labels::default() }, (4, 5));
    for (level, width) in [(density.level68, 2.2), (density.level95, 1.1)] {
        let crossed = contours((&density.first, &density.second), &density.density, level);
        let placed = crossed.into_iter().map(|ends| ends.map(|(x, y)| frame.at((x - shift_x, y - shift_y))));
        marks.push(Mark::Segments { segments: placed.collect(), stroke: Stroke::solid(BAND, width) });
    }
    if second.starts_with("departure.tau") && shift_y == 0.0 && frame.y.covers(0.0) {
        marks.push(frame.across(0.0, Stroke::solid(RELATIVITY, 1.4).dashed(Dash::Long)));
    }
    let correlation = format!("correlation {:+.2}", picture.pair.correlation).replace('-', "−");
    marks.push(Mark::words((width - 12.0, height - 52.0), correlation.clone(), 11.0, Anchor::End, INK));
    Figure {
        name: slug(&format!("joint {first} {second}")),
        title: format!("{first} against {second}"),
        description: format!("Joint posterior of {first} and {second}: {correlation}."),
        width,
        height,
        marks: vec![Mark::keyed(&[first, second], marks)],
    }
}

fn matrix_figure(dependence: &Dependence) -> Figure {
    let names = &dependence.names;
    let (cell, left) = (12.0, 270.0);
    let side = cell * names.len() as f64;
    let (width, height) = (left + side + 30.0, side + 40.0);
    let mut marks = Vec::new();
    for (row, name) in names.iter().enumerate() {
        let y = 30.0 + cell * row as f64;
        let label = format!("{name} {}", row + 1);
        marks.push(Mark::keyed(
            &[name],
            vec![Mark::words((left - 6.0, y + 9.5), label, 9.5, Anchor::End, INK)],
        ));
        if row % 5 == 4 || row == 0 {
            let x = left + cell * (row as f64 + 0.5);
            marks.push(Mark::words((x, 24.0), (row + 1).to_string(), 9.5, Anchor::Middle, MUTED));
        }
        for (column, other) in names.iter().enumerate().take(row) {
            let Some(correlation) = dependence.correlations[row][column] else { continue };
            let half = 0.5 * (cell - 1.0) * correlation.abs();
            if half < 0.3 {
                continue;
            }
            let (x, y) = (left + cell * (column as f64 + 0.5), y + 0.5 * cell);
            let corners =
                vec![(x - half, y - half), (x + half, y - half), (x + half, y + half), (x - half, y + half)];
            let square = if correlation > 0.0 {
                Mark::Area { points: corners, fill: BAND, opacity: 1.0 }
            } else {
                let mut closed = corners.clone();
                closed.push(corners[0]);
                Mark::line(closed, Stroke::solid(RELATIVITY, 1.0))
            };
            let tip = format!("{name} and {other}: {correlation:+.2}");
            marks.push(Mark::about(&[name, other], tip, vec![square]));
        }
    }
    for edge in 0..=names.len() {
        let at = cell * edge as f64;
        marks.insert(
            0,
            Mark::line(vec![(left, 30.0 + at), (left + at.min(side), 30.0 + at)], Stroke::solid(GRID, 0.6)),
        );
    }
    let strongest: Vec<String> = dependence
        .ranked
        .iter()
        .take(5)
        .map(|pair| format!("{} and {} {:+.2}", names[pair.first], names[pair.second], pair.correlation))
        .collect();
    Figure {
        name: "correlations".to_owned(),
        title: "Correlations of all parameters".to_owned(),
        description: format!("The strongest: {}.", strongest.join("; ")),
        width,
        height,
        marks,
    }
}

/// A nuisance's posterior in units of its prior: shift, width, and their names.
struct Learnt<'a> {
    name: &'a str,
    shift: f64,
    width: f64,
}

fn learnt(run: &Review) -> Vec<Learnt<'_>> {
    run.summary
        .parameters
        .iter()
        .filter(|(name, _)| !name.starts_with("departure.") && !name.starts_with("derived."))
        .filter_map(|(name, parameter)| {
            let (mean, sd) = (parameter.mean?, parameter.sd?);
            let (prior_mean, prior_sd) = (parameter.prior_mean?, parameter.prior_sd.filter(|sd| *sd > 0.0)?);
            Some(Learnt { name, shift: (mean - prior_mean) / prior_sd, width: sd / prior_sd })
        })
        .collect()
}

fn nuisances(run: &Review, at: usize, sheet: &mut Sheet) -> Markup {
    let learnt = learnt(run);
    if learnt.is_empty() {
        return html! { p.missing { "No nuisance with a prior of finite width is inferred." } };
    }
    let rows = learnt.iter().map(|each| {
        let from = |key: &str| in_summary(at, &format!("/parameters/{}/{key}", each.name));
        let parameter = run.summary.parameters.get(each.name);
        let (mean, sd) = (parameter.and_then(|known| known.mean), parameter.and_then(|known| known.sd));
        let (prior_mean, prior_sd) = (parameter.and_then(|known| known.prior_mean), parameter.and_then(|known| known.prior_sd));
        vec![
            key(each.name),
            html! { (told(&from("prior_mean"), prior_mean, |mean| rounded(mean, prior_sd.unwrap_or(f64::NAN)))) " ± " (told(&from("prior_sd"), prior_sd, two_digits)) },
            html! { (told(&from("mean"), mean, |mean| rounded(mean, sd.unwrap_or(f64::NAN)))) " ± " (told(&from("sd"), sd, two_digits)) },
            cell(format!("{:+.2}", each.shift)),
            cell(format!("{:.2}", each.width)),
        ]
    });
    html! {
        h3 { "What the data taught about each nuisance" }
        (sheet.figure(learnt_figure(&learnt), html! {
            "Posterior mean and central standard deviation of each nuisance, in standard deviations of its prior (the grey field is one). "
            "A bar as wide as the field learnt nothing; one outside it was pulled."
        }))
        (on_demand("Prior and posterior of every nuisance, in numbers", table(
            "Prior against posterior", &["nuisance", "prior", "posterior", "shift in prior sd", "width over prior sd"], rows.collect())))
    }
}

fn learnt_figure(learnt: &[Learnt<'_>]) -> Figure {
    let (width, row, left) = (640.0, 17.0, 280.0);
    let height = 30.0 + row * learnt.len() as f64 + 48.0;
    let reach = learnt.iter().map(|each| each.shift.abs() + each.width).fold(1.5, f64::max) * 1.05;
    let x = Scale::linear((-reach, reach), (left, width - 14.0));
    let bottom = height - 46.0;
    let frame = Frame { x, y: Scale::linear((0.0, 1.0), (bottom, 16.0)) };
    let field = vec![(x.at(-1.0), 16.0), (x.at(1.0), 16.0), (x.at(1.0), bottom), (x.at(-1.0), bottom)];
    let mut marks = vec![Mark::Area { points: field, fill: MUTED, opacity: 0.13 }];
    marks.extend(frame.axes(
        Labels {
            x: "(posterior − prior mean) / prior standard deviation",
            bare_y: true,
            ..Labels::default()
        },
        (7, 0),
    ));
    marks.push(frame.up(0.0, Stroke::solid(MUTED, 1.0)));
    let mut furthest: Option<&Learnt<'_>> = None;
    for (index, each) in learnt.iter().enumerate() {
        let y = 28.0 + row * index as f64;
        let tip = format!(
            "{}: moved by {:+.2} prior standard deviations, {:.2} times as wide",
            each.name, each.shift, each.width
        );
        let bar = vec![(x.clamped(each.shift - each.width), y), (x.clamped(each.shift + each.width), y)];
        marks.push(Mark::about(
            &[each.name],
            tip,
            vec![
                Mark::words((left - 8.0, y + 3.6), each.name, 10.5, Anchor::End, INK),
                Mark::line(bar, Stroke::solid(BAND, 2.4)),
                Mark::Symbol {
                    at: (x.clamped(each.shift), y),
                    radius: 3.4,
                    shape: Shape::Disc,
                    colour: BAND,
                },
            ],
        ));
        if furthest.is_none_or(|known| each.shift.abs() > known.shift.abs()) {
            furthest = Some(each);
        }
    }
    let said = furthest.map_or(String::new(), |each| {
        format!("Moved most: {} by {:+.2} prior standard deviations. ", each.name, each.shift)
    });
    let tightened = learnt.iter().filter(|each| each.width < 0.7).count();
    Figure {
        name: "nuisances-against-priors".to_owned(),
        title: "Nuisances against their priors".to_owned(),
        description: format!(
            "{said}{tightened} of {} nuisances are known to better than 0.7 of their prior's width.",
            learnt.len()
        ),
        width,
        height,
        marks,
    }
}

/// Of a run that the page is not about: the nuisances that the data moved most.
fn moved_most(run: &Review, at: usize) -> Markup {
    let mut learnt = learnt(run);
    learnt.sort_by(|one, other| other.shift.abs().total_cmp(&one.shift.abs()));
    learnt.truncate(5);
    let rows = learnt.iter().map(|each| {
        let mean = run.summary.parameters.get(each.name).and_then(|known| known.mean);
        let sd = run.summary.parameters.get(each.name).and_then(|known| known.sd).unwrap_or(f64::NAN);
        vec![
            key(each.name),
            told(&in_summary(at, &format!("/parameters/{}/mean", each.name)), mean, |mean| rounded(mean, sd)),
            cell(format!("{:+.2}", each.shift)),
        ]
    });
    on_demand(
        &format!("The nuisances that the data move most under {}", label(run)),
        table("Moved most", &["nuisance", "posterior mean", "shift in prior sd"], rows.collect()),
    )
}
