//! What came out, what it means, and what it does not mean.

use maud::{Markup, html};
use oddwell_study::record::{ParameterSummary, Summary};
use oddwell_study::review::{ParameterPicture, Review};

use super::parts::{Sheet, cell, in_summary, key, key_as, missing, prose, table, told};
use super::{Runs, label};
use crate::closing;
use crate::figure::{
    Anchor, BAND, Dash, Figure, Frame, Labels, MUTED, Mark, RELATIVITY, Scale, Stroke, range,
};
use crate::numbers::{UNKNOWN, rounded, share, significant, two_digits};
use crate::weigh::verdict_words;

pub(super) fn section(runs: &Runs<'_>, sheet: &mut Sheet) -> Markup {
    let run = runs.first();
    let at = runs.principal;
    html! {
        (headline(run, at))
        (picture(run, sheet))
        (claims(run, at))
        (clocks(run, at))
        (mimics(run))
        (odds(runs))
        p { (prose(&closing::limits_text(&run.summary))) }
        (others(runs))
    }
}

fn departures(summary: &Summary) -> Vec<(&str, &ParameterSummary)> {
    let names = summary.departure_parameters.iter();
    names.filter_map(|name| Some((name.as_str(), summary.parameters.get(name)?))).collect()
}

fn headline(run: &Review, at: usize) -> Markup {
    let summary = &run.summary;
    let found = departures(summary);
    match &found[..] {
        [] => {
            html! { p.headline { "No departure is inferred here: the question is how well general relativity fits." } }
        }
        [(name, only)] => html! {
            p.headline {
                (key_as(name, &symbol(name))) " = "
                (value(at, name, only, summary.blinded)) " ± "
                (told(&pointer(at, name, "sd"), only.sd, two_digits))
            }
            @if !summary.blinded {
                p { "68 %: " (interval(at, name, only, "interval68")) ". 95 %: " (interval(at, name, only, "interval95")) ". "
                    (prose(&closing::general_relativity_text(summary))) }
            }
            p.note {
                "τ multiplies what gravitational redshift adds to the odd multipoles: 0 is general relativity, −1 no "
                "gravitational redshift at all (where light feels it)."
            }
        },
        several => html! {
            (table("The departure", &["", "mean", "sd", "68 %", "95 %"], several.iter().map(|(name, parameter)| vec![
                key(name),
                value(at, name, parameter, summary.blinded),
                told(&pointer(at, name, "sd"), parameter.sd, two_digits),
                interval(at, name, parameter, "interval68"),
                interval(at, name, parameter, "interval95"),
            ]).collect()))
            @if !summary.blinded { p { (prose(&closing::general_relativity_text(summary))) } }
        },
    }
}

/// τ for `departure.tau`, else the name behind `departure.`.
fn symbol(name: &str) -> String {
    name.strip_prefix("departure.").unwrap_or(name).replace("tau", "τ")
}

fn pointer(at: usize, name: &str, key: &str) -> String {
    in_summary(at, &format!("/parameters/{name}/{key}"))
}

fn value(at: usize, name: &str, parameter: &ParameterSummary, blinded: bool) -> Markup {
    if blinded {
        return html! { em { "hidden" } };
    }
    told(&pointer(at, name, "mean"), parameter.mean, |mean| rounded(mean, parameter.sd.unwrap_or(f64::NAN)))
}

fn interval(at: usize, name: &str, parameter: &ParameterSummary, which: &str) -> Markup {
    let found = if which == "interval68" { parameter.interval68 } else { parameter.interval95 };
    let error = parameter.sd.unwrap_or(f64::NAN);
    match found {
        None => html! { (UNKNOWN) },
        Some([low, high]) => html! {
            (told(&pointer(at, name, &format!("{which}/0")), Some(low), |low| rounded(low, error)))
            " to "
            (told(&pointer(at, name, &format!("{which}/1")), Some(high), |high| rounded(high, error)))
        },
    }
}

/// The posterior of the one departure, or of each of several.
fn picture(run: &Review, sheet: &mut Sheet) -> Markup {
    let summary = &run.summary;
    if summary.blinded {
        return html! { p.missing { "The picture of the posterior is not shown while the measurements are blinded." } };
    }
    let pictures: Vec<&ParameterPicture> = run.pictures.iter().filter(|picture| picture.departure).collect();
    html! {
        div.grid {
            @for picture in pictures {
                @if let Some(figure) = posterior_figure(summary, picture) {
                    (sheet.figure(figure, html! {
                        "Posterior of " (key(&picture.name)) ": dark 68 %, light 95 %. Dashed: general relativity. Dotted: prior."
                    }))
                }
            }
        }
    }
}

fn posterior_figure(summary: &Summary, picture: &ParameterPicture) -> Option<Figure> {
    let density = picture.posterior.as_ref()?;
    let parameter = summary.parameters.get(&picture.name)?;
    let relativity = picture.name.starts_with("departure.tau").then_some(0.0);
    let (width, height) = (460.0, 260.0);
    let ends = range(density.at.iter().copied().chain(relativity), 0.02);
    let peak = density.density.iter().copied().fold(0.0, f64::max);
    let frame = Frame {
        x: Scale::linear(ends, (20.0, width - 20.0)),
        y: Scale::linear((0.0, 1.12 * peak), (height - 44.0, 24.0)),
    };
    let mut marks = frame.axes(Labels { x: &picture.name, bare_y: true, ..Labels::default() }, (7, 0));
    let points: Vec<(f64, f64)> = density.at.iter().copied().zip(density.density.iter().copied()).collect();
    let inside = |[low, high]: [f64; 2]| -> Vec<(f64, f64, f64)> {
        points.iter().filter(|(x, _)| (low..=high).contains(x)).map(|&(x, y)| (x, 0.0, y)).collect()
    };
    for (interval, opacity) in [(parameter.interval95, 0.18), (parameter.interval68, 0.42)] {
        if let Some(interval) = interval {
            marks.push(frame.band(&inside(interval), BAND, opacity));
        }
    }
    if let Some(prior) = &picture.prior {
        let line = density.at.iter().copied().zip(prior.iter().copied());
        marks.push(frame.line(line, Stroke::solid(MUTED, 1.5).dashed(Dash::Short)));
    }
    marks.push(frame.line(points.iter().copied(), Stroke::solid(BAND, 2.0)));
    let tip = format!(
        "{}: {} ± {}",
        picture.name,
        number(parameter.mean, parameter.sd),
        parameter.sd.map_or(UNKNOWN.to_owned(), two_digits)
    );
    if let Some(mean) = parameter.mean {
        let mark = Mark::about(&[&picture.name], &tip, vec![frame.up(mean, Stroke::solid(BAND, 2.0))]);
        marks.push(mark);
    }
    let mut description = format!("Posterior density. {tip}.");
    if let Some([low, high]) = parameter.interval68 {
        let (low, high) = (number(Some(low), parameter.sd), number(Some(high), parameter.sd));
        description.push_str(&format!(" 68 %: {low} to {high}."));
    }
    if let Some([low, high]) = parameter.interval95 {
        let (low, high) = (number(Some(low), parameter.sd), number(Some(high), parameter.sd));
        description.push_str(&format!(" 95 %: {low} to {high}."));
    }
    if let Some(relativity) = relativity {
        marks.push(frame.up(relativity, Stroke::solid(RELATIVITY, 2.0).dashed(Dash::Long)));
        let x = frame.x.at(relativity);
        let right = x < 0.6 * width;
        let (x, anchor) = if right { (x + 6.0, Anchor::Start) } else { (x - 6.0, Anchor::End) };
        marks.push(Mark::words((x, 20.0), "general relativity", 12.0, anchor, RELATIVITY));
        description.push_str(" General relativity is at 0.");
    }
    Some(Figure {
        name: format!("posterior-{}", super::parts::slug(&picture.name)),
        title: format!("Posterior of {}", picture.name),
        description,
        width,
        height,
        marks,
    })
}

fn number(value: Option<f64>, error: Option<f64>) -> String {
    rounded(value.unwrap_or(f64::NAN), error.unwrap_or(f64::NAN))
}

/// Any odd signal, gravitational redshift, departure from general relativity: three claims with three numbers.
fn claims(run: &Review, at: usize) -> Markup {
    let summary = &run.summary;
    let verdicts = run.beside_data.as_ref().ok().and_then(|beside| beside.check.verdicts.as_ref());
    let sigma = |value: Option<f64>| value.map_or(UNKNOWN.to_owned(), |value| format!("{value:.1} σ"));
    let hidden = || html! { em { "hidden" } };
    let mut rows = Vec::new();
    if let Some(verdicts) = verdicts {
        if let Some(any) = &verdicts.any_odd_signal {
            rows.push(vec![
                cell("There is an odd signal, whatever its cause"),
                cell(format!("signal-to-noise {:.1}", any.signal_to_noise)),
                cell(sigma(any.sigma)),
            ]);
        }
        if let Some(redshift) = &verdicts.gravitational_redshift {
            let amount = redshift.value.map_or("hidden".to_owned(), |value| rounded(value, redshift.sd));
            rows.push(vec![
                cell("There is gravitational redshift (1 in general relativity, 0 without)"),
                cell(format!("{amount} ± {}", two_digits(redshift.sd))),
                if redshift.value.is_some() { cell(sigma(redshift.sigma)) } else { hidden() },
            ]);
        }
    }
    if let [(name, parameter)] = departures(summary)[..] {
        rows.push(vec![
            cell("The time distortion departs from general relativity (0 there)"),
            html! { (value(at, name, parameter, summary.blinded)) " ± " (told(&pointer(at, name, "sd"), parameter.sd, two_digits)) },
            if summary.blinded { hidden() } else {
                told(&in_summary(at, "/general_relativity/sigma"), summary.general_relativity.sigma, |sigma| format!("{:.1} σ", sigma.abs()))
            },
        ]);
    }
    if rows.is_empty() {
        return html! {};
    }
    html! {
        h3 { "Three claims, three numbers" }
        (table("Each claim has its own number; none stands for another", &["claim", "amount", "from none"], rows))
        p.note { "The first two are linear estimates from data, covariances and priors; the third is the posterior." }
    }
}

fn clocks(run: &Review, at: usize) -> Markup {
    let summary = &run.summary;
    if summary.blinded || summary.clocks.is_empty() {
        return html! {};
    }
    let rows = summary.clocks.iter().enumerate().map(|(index, clock)| {
        let place = format!("{}.{}", clock.survey, clock.bin);
        let contrast = &clock.seconds_per_year;
        let error = contrast.sd.unwrap_or(f64::NAN);
        let from = |key: &str| in_summary(at, &format!("/clocks/{index}/{key}"));
        vec![
            key(&place),
            told(&from("seconds_per_year/mean"), contrast.mean, |mean| rounded(mean, error)),
            told(&from("seconds_per_year/sd"), contrast.sd, two_digits),
            told(&from("general_relativity"), clock.general_relativity, |value| significant(value, 3)),
            told(&from("share_reached"), clock.share_reached, share),
        ]
    });
    let distance = summary.clocks[0].distance;
    html! {
        h3 { "What it means for clocks" }
        (table(
            &format!("Seconds a year by which clocks {distance} Mpc/h apart differ (rms, comoving)"),
            &["bin", "seconds a year", "sd", "general relativity", "share from scales measured"],
            rows.collect(),
        ))
        p.note { "The share is of the square; the rest is the shape's word about scales that the measurement does not reach." }
    }
}

fn mimics(run: &Review) -> Markup {
    let sentences = closing::mimic_sentences(&run.summary);
    if sentences.is_empty() {
        return html! {};
    }
    html! {
        h3 { "What else would give the same data" }
        ul { @for sentence in sentences { li { (prose(&sentence)) } } }
    }
}

fn odds(runs: &Runs<'_>) -> Markup {
    if runs.blinded() {
        return html! {};
    }
    let hypothesis = &runs.first().summary.hypothesis;
    for (at, weighed) in runs.weighed().iter().enumerate() {
        let own = weighed.record.hypotheses.iter().enumerate().find(|(_, known)| known.name == *hypothesis);
        let Some((index, found)) = own.filter(|(_, found)| found.odds.is_some()) else { continue };
        let from = |key: &str| format!("w{at}:weigh.json:/hypotheses/{index}/{key}");
        let sensitivity = found.sensitivity.as_ref();
        return html! {
            p {
                "Odds of " code { (hypothesis) } " against " code { (weighed.record.reference) } ": "
                strong { (told(&from("odds"), found.odds, |odds| significant(odds, 2))) }
                @if !found.agree { " (the estimators of the evidence do not agree: do not quote it)" }
                @if let Some(width) = sensitivity.and_then(|sensitivity| sensitivity.turning_width) {
                    "; a prior of width " (told(&from("sensitivity/turning_width"), Some(width), |width| significant(width, 2)))
                    " would turn them, " (told(&from("sensitivity/width"), sensitivity.map(|known| known.width), |width| significant(width, 2))) " was used"
                } @else if sensitivity.is_some() { "; no width of its prior turns them" }
                @if let Some(sensitivity) = sensitivity {
                    ": " strong { (prose(&verdict_words(sensitivity.verdict, &weighed.record.reference))) }
                }
                ". " a href="#weighed" { "More in section 7" } "."
            }
        };
    }
    missing(
        "How the hypotheses compare was not asked: a posterior takes its own hypothesis for granted. The odds are made by",
        &format!("oddwell weigh {}", runs.first().manifest.study_file),
    )
}

/// The other runs in a line each.
fn others(runs: &Runs<'_>) -> Markup {
    let rows: Vec<Vec<Markup>> = runs
        .others()
        .flat_map(|(at, run)| {
            departures(&run.summary).into_iter().map(move |(name, parameter)| {
                vec![
                    html! { (label(run)) },
                    key(name),
                    html! { (value(at, name, parameter, run.summary.blinded)) " ± " (told(&pointer(at, name, "sd"), parameter.sd, two_digits)) },
                    if run.summary.blinded { html! { em { "hidden" } } } else { interval(at, name, parameter, "interval95") },
                ]
            })
        })
        .collect();
    if rows.is_empty() {
        return html! {};
    }
    html! {
        h3 { "Under the other hypotheses of this page" }
        (table("The departure in the other runs", &["run", "parameter", "mean ± sd", "95 %"], rows))
    }
}
