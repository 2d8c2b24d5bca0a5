//! Whether the numbers can be believed: warnings, convergence, goodness of fit, the data's own verdicts.

use maud::{Markup, html};
use oddwell_study::check::Verdicts;
use oddwell_study::record::{ParameterSummary, Summary};
use oddwell_study::review::{BesideData, Review, Trace};

use super::parts::{Sheet, cell, in_summary, key, on_demand, prose, slug, table, told};
use super::{Runs, label};
use crate::figure::{CATEGORIES, Figure, Frame, Labels, Mark, Scale, Stroke, range};
use crate::numbers::{UNKNOWN, count, duration, probability, rounded, share, significant, two_digits, whole};

/// Traces shown of a run that the page is not about.
const FEW: usize = 4;

pub(super) fn section(runs: &Runs<'_>, sheet: &mut Sheet) -> Markup {
    let (at, run) = (runs.principal, runs.first());
    let others: Vec<(usize, &Review)> = runs.others().collect();
    html! {
        (of_run(run, at, true, sheet))
        @for (at, run) in others {
            (on_demand(&format!("The same of {}", label(run)), of_run(run, at, false, sheet)))
        }
    }
}

fn of_run(run: &Review, at: usize, all_traces: bool, sheet: &mut Sheet) -> Markup {
    html! {
        (warnings(&run.summary))
        (convergence(run, at))
        (traces(run, all_traces, sheet))
        (goodness(&run.summary, at))
        @match &run.beside_data {
            Ok(beside) => {
                (predictive(beside))
                @if let Some(verdicts) = &beside.check.verdicts { (on_demand("The data's own verdicts, before any fit", verdicts_of(beside, verdicts))) }
            }
            Err(error) => { p.missing { "No posterior-predictive checks and no verdicts of the data: " (prose(&error.to_string())) "." } }
        }
    }
}

fn warnings(summary: &Summary) -> Markup {
    html! {
        h3 { "Look at this before you believe it" }
        @if summary.warnings.is_empty() { p { "The run gave no warning." } }
        ul.warnings {
            @for warning in &summary.warnings {
                li { strong { (warning.code) } ": " (prose(&warning.text)) @if !warning.place.is_empty() { " (" (key(&warning.place)) ")" } }
            }
        }
    }
}

fn convergence(run: &Review, at: usize) -> Markup {
    let summary = &run.summary;
    let sampler = &summary.sampler;
    let by = |value: fn(&ParameterSummary) -> Option<f64>| {
        summary
            .parameters
            .iter()
            .filter_map(move |(name, parameter)| Some((name.as_str(), value(parameter)?)))
    };
    let largest = by(|parameter| parameter.rhat).max_by(|one, other| one.1.total_cmp(&other.1));
    let smallest = by(|parameter| parameter.ess).min_by(|one, other| one.1.total_cmp(&other.1));
    let rows = summary.parameters.iter().map(|(name, parameter)| {
        let from = |key: &str| in_summary(at, &format!("/parameters/{name}/{key}"));
        let hidden = summary.blinded && (name.starts_with("departure.") || name.starts_with("derived."));
        let sd = parameter.sd.unwrap_or(f64::NAN);
        vec![
            key(name),
            if hidden {
                html! { em { "hidden" } }
            } else {
                told(&from("mean"), parameter.mean, |mean| rounded(mean, sd))
            },
            told(&from("sd"), parameter.sd, two_digits),
            told(&from("prior_sd"), parameter.prior_sd, two_digits),
            told(&from("ess"), parameter.ess, whole),
            told(&from("ess_tail"), parameter.ess_tail, whole),
            told(&from("rhat"), parameter.rhat, |rhat| format!("{rhat:.3}")),
            told(&from("mcse"), parameter.mcse, two_digits),
        ]
    });
    html! {
        h3 { "Convergence" }
        p {
            strong { (if summary.converged { "Converged" } else { "Not converged" }) }
            @if let Some((name, rhat)) = largest { ": largest R̂ " (format!("{rhat:.3}")) " (" (key(name)) ")" }
            @if let Some((name, ess)) = smallest { ", smallest effective sample size " (whole(ess)) " (" (key(name)) ")" }
            ". " (count(sampler.evaluations)) " evaluations in " (duration(sampler.wall_seconds)) ": " (sampler.ensembles)
            " ensembles of " (sampler.walkers) " walkers, " (count(sampler.steps)) " steps, the first " (count(sampler.warm_up)) " dropped"
            @if let Some(accepted) = sampler.acceptance { ", " (share(accepted)) " accepted" }
            @if sampler.rejected_evaluations > 0 { "; " (count(sampler.rejected_evaluations)) " evaluations gave no likelihood" }
            "."
        }
        div.tall {
            (table("Every parameter, with what its draws are worth",
                &["parameter", "mean", "sd", "prior sd", "ESS", "tail ESS", "R̂", "error of the mean"], rows.collect()))
        }
    }
}

fn traces(run: &Review, all: bool, sheet: &mut Sheet) -> Markup {
    let summary = &run.summary;
    let rhat = |name: &str| {
        summary.parameters.get(name).and_then(|parameter| parameter.rhat).unwrap_or(f64::INFINITY)
    };
    let mut shown: Vec<&Trace> =
        run.traces.iter().filter(|trace| all || !trace.name.starts_with("derived.")).collect();
    if !all {
        shown.sort_by(|one, other| rhat(&other.name).total_cmp(&rhat(&one.name)));
        shown.truncate(FEW);
    }
    let words = if all {
        "Traces of every parameter".to_owned()
    } else {
        format!("Traces of the {} parameters of largest R̂", shown.len())
    };
    let prefix = if all { String::new() } else { summary.hypothesis.clone() };
    on_demand(
        &words,
        html! {
            p.note { "The median of each ensemble's walkers in stretches of steps, in posterior standard deviations from the mean of all." }
            div.grid.small {
                @for trace in shown {
                    (sheet.figure(trace_figure(trace, summary, &prefix), html! { (key(&trace.name)) }))
                }
            }
        },
    )
}

fn trace_figure(trace: &Trace, summary: &Summary, prefix: &str) -> Figure {
    let (width, height) = (260.0, 96.0);
    let middles = || trace.ensembles.iter().flatten().map(|band| band.middle);
    let steps = || trace.ensembles.iter().flatten().map(|band| band.step);
    // From the draws alone: while blinded, the summary has no mean.
    let mean = middles().sum::<f64>() / middles().count().max(1) as f64;
    let sd = summary
        .parameters
        .get(&trace.name)
        .and_then(|parameter| parameter.sd)
        .filter(|sd| *sd > 0.0)
        .unwrap_or(1.0);
    let in_sds = |value: f64| (value - mean) / sd;
    let reach = middles().map(|middle| in_sds(middle).abs()).fold(1.0, f64::max);
    let frame = Frame {
        x: Scale::linear(range(steps(), 0.0), (26.0, width - 6.0)),
        y: Scale::linear((-reach, reach), (height - 22.0, 8.0)),
    };
    let mut marks = frame.axes(Labels::default(), (4, 3));
    for (index, bands) in trace.ensembles.iter().enumerate() {
        let stroke = Stroke::solid(CATEGORIES[(1 + index) % CATEGORIES.len()], 1.2);
        let line = frame.line(bands.iter().map(|band| (band.step, in_sds(band.middle))), stroke);
        marks.push(Mark::keyed(&[&trace.name], vec![line]));
    }
    let parameter = summary.parameters.get(&trace.name);
    let description = format!(
        "Medians of {} ensembles along their steps, within {reach:.2} standard deviations of their mean. R̂ {}, effective sample size {}.",
        trace.ensembles.len(),
        parameter
            .and_then(|parameter| parameter.rhat)
            .map_or(UNKNOWN.to_owned(), |rhat| format!("{rhat:.3}")),
        parameter.and_then(|parameter| parameter.ess).map_or(UNKNOWN.to_owned(), whole)
    );
    Figure {
        name: slug(&format!("trace {prefix} {}", trace.name)),
        title: format!("Trace of {}", trace.name),
        description,
        width,
        height,
        marks,
    }
}

fn goodness(summary: &Summary, at: usize) -> Markup {
    let best = &summary.best;
    let mut rows = Vec::new();
    let mut row =
        |name: Markup,
         pointer: String,
         (chi2, points, effective, p_value): (f64, usize, Option<f64>, Option<f64>)| {
            let from = |key: &str| in_summary(at, &format!("{pointer}/{key}"));
            rows.push(vec![
                name,
                told(&from("chi2"), Some(chi2), |chi2| format!("{chi2:.1}")),
                told(&from("data_points"), Some(points as f64), |_| count(points as u64)),
                told(&from("effective_parameters"), effective, |effective| format!("{effective:.1}")),
                told(&from("p_value"), p_value, probability),
            ]);
        };
    for (index, survey) in best.surveys.iter().enumerate() {
        let pointer = format!("/best/surveys/{index}");
        row(
            key(&survey.name),
            pointer.clone(),
            (survey.chi2, survey.data_points, survey.effective_parameters, survey.p_value),
        );
        for (inner, bin) in survey.bins.iter().enumerate() {
            let place = format!("{}.{}", survey.name, bin.name);
            row(
                key(&place),
                format!("{pointer}/bins/{inner}"),
                (bin.chi2, bin.data_points, bin.effective_parameters, bin.p_value),
            );
        }
    }
    row(
        cell("all"),
        "/best".to_owned(),
        (best.chi2, best.data_points, best.effective_parameters, best.p_value),
    );
    html! {
        h3 { "Does the best point fit?" }
        (table("Goodness of fit at the best point", &["", "χ²", "numbers", "effective parameters", "p"], rows))
        p.note { "A bin's χ² is by its own block of the covariance, so the bins need not add up to their survey." }
    }
}

fn predictive(beside: &BesideData) -> Markup {
    let rows = beside.predictive.iter().map(|check| {
        vec![
            key(&check.place),
            cell(count(check.rows as u64)),
            cell(format!("{:.1}", check.mean_chi_squared)),
            cell(check.p_value.map_or(UNKNOWN.to_owned(), probability)),
        ]
    });
    html! {
        h3 { "Would data like these come out again?" }
        (table("Posterior-predictive checks: the chance of a χ² at least as large", &["", "numbers", "mean χ²", "p"], rows.collect()))
        p.note {
            "For each draw, the probability that new data scatter at least as far about its prediction; averaged (Gelman, Meng & "
            "Stern 1996). It uses the data twice and errs towards 0.5: a small value is worth more than it says."
        }
    }
}

fn verdicts_of(beside: &BesideData, verdicts: &Verdicts) -> Markup {
    let sigma = |value: Option<f64>| value.map_or(UNKNOWN.to_owned(), |value| format!("{value:.1} σ"));
    let or = |text: Option<String>| cell(text.unwrap_or_else(|| UNKNOWN.to_owned()));
    let surveys = verdicts.surveys.iter().map(|survey| {
        let covariance = &survey.covariance;
        vec![
            key(&survey.name),
            cell(count(survey.rows_kept as u64)),
            cell(count(survey.rows_cut as u64)),
            cell(&survey.noise),
            or(covariance.mocks.map(|mocks| count(mocks as u64))),
            or(covariance.error_growth.map(|growth| format!("× {growth:.2}"))),
            or(covariance.condition.map(|condition| significant(condition, 3))),
            or(covariance.scale.map(|scale| format!("× {}", significant(scale, 3)))),
            or(covariance.scale_p_value.map(probability)),
        ]
    });
    let signals = verdicts.signals.iter().map(|signal| {
        let place = signal.place.split(' ').next().unwrap_or_default();
        vec![
            super::parts::key_as(place, &signal.place),
            cell(count(signal.rows as u64)),
            cell(format!("{:.1}", signal.signal_to_noise)),
            cell(sigma(signal.sigma)),
        ]
    });
    html! {
        @for warning in &beside.check.warnings { p { strong { (warning.code) } ": " (prose(&warning.text)) } }
        @if beside.check.warnings.is_empty() { p { code { "check" } " has no warning." } }
        (table("Rows and covariances",
            &["survey", "rows kept", "cut", "noise", "mocks", "errors grow", "condition", "covariance wants", "p"], surveys.collect()))
        (table("Signal, whatever it is", &["", "rows", "signal-to-noise", "any signal"], signals.collect()))
        @if let Some(turned) = &verdicts.orientation {
            p { "Swapping the tracers changes −2 ln L by " (format!("{:+.1}", turned.difference)) " (about " (format!("{:+.1}", turned.expected)) " is expected where they stand right)." }
        }
        @if let Some(normal) = verdicts.normality {
            p { "Whitened residuals normal (Anderson–Darling): p " (probability(normal)) "." }
        }
    }
}
