//! The headline: the departure's intervals, and where general relativity lies in them.

use oddwell_study::record::{ParameterSummary, Summary};

use super::hidden;
use crate::numbers::{UNKNOWN, rounded, share, significant, two_digits};
use crate::style::Style;
use crate::text::{Table, wrapped};

pub(super) fn section(summary: &Summary, style: Style) -> String {
    let there: Vec<(&str, &ParameterSummary)> = summary
        .departure_parameters
        .iter()
        .filter_map(|name| Some((name.as_str(), summary.parameters.get(name)?)))
        .collect();
    match there.as_slice() {
        [] => nothing(summary),
        [(name, only)] => one(summary, name, only, style) + &general_relativity(summary),
        several => many(summary, several, style) + &general_relativity(summary),
    }
}

fn nothing(summary: &Summary) -> String {
    let text = if summary.departure == "none" {
        "No departure is inferred: general relativity is taken to hold, and the question is how well it fits."
    } else {
        "No departure is inferred: the study holds it, and the question is how well that fits."
    };
    wrapped("  ", 2, text)
}

fn one(summary: &Summary, name: &str, parameter: &ParameterSummary, style: Style) -> String {
    let error = sd(parameter);
    if hidden(summary, name) {
        let headline = format!("{name} = (hidden) ± {}", error.map_or(UNKNOWN.to_owned(), two_digits));
        return format!("  {}\n", style.strong(&headline));
    }
    let headline = format!(
        "{name} = {} ± {}",
        rounded(number(parameter.mean), number(error)),
        error.map_or(UNKNOWN.to_owned(), two_digits)
    );
    let mut out = format!("  {}\n", style.strong(&headline));
    for (share, interval) in [("68 %", parameter.interval68), ("95 %", parameter.interval95)] {
        out.push_str(&format!("    {share}:  {}\n", bounds(interval, error)));
    }
    out
}

fn many(summary: &Summary, parameters: &[(&str, &ParameterSummary)], style: Style) -> String {
    let mut table = Table::new(&["departure", "mean", "sd", "68 %", "95 %"]);
    for (name, parameter) in parameters {
        let error = sd(parameter);
        let place = |text: String| if hidden(summary, name) { "hidden".to_owned() } else { text };
        table.row(vec![
            (*name).to_owned(),
            place(rounded(number(parameter.mean), number(error))),
            error.map_or(UNKNOWN.to_owned(), two_digits),
            place(bounds(parameter.interval68, error)),
            place(bounds(parameter.interval95, error)),
        ]);
    }
    table.render(|header| style.strong(header))
}

/// How far out general relativity lies. The number of σ carries the sign of the departure.
fn general_relativity(summary: &Summary) -> String {
    if summary.blinded {
        return String::new();
    }
    wrapped("  ", 2, &general_relativity_text(summary))
}

/// The same as one sentence.
pub(crate) fn general_relativity_text(summary: &Summary) -> String {
    let found = &summary.general_relativity;
    let normal = found.from.as_deref() == Some("normal");
    match (found.tail_probability, found.sigma) {
        (None, _) => "How far general relativity lies in the tail is not said: it is at the end of a prior or beyond it, or \
                      the draws do not suffice."
            .to_owned(),
        (Some(tail), Some(sigma)) => {
            let side = if sigma < 0.0 { "above" } else { "below" };
            let counted = if normal { " (too far out to be counted: as for a normal distribution)" } else { "" };
            format!(
                "General relativity lies {} σ {side} the departure: {} of the posterior is as far out or farther, on \
                 either side{counted}.",
                significant(sigma.abs(), 2),
                share(tail)
            )
        }
        (Some(tail), None) => {
            let counted = if normal { " (as for a normal distribution)" } else { "" };
            format!(
                "General relativity lies where {} of the posterior is as far out or farther{counted}.",
                share(tail)
            )
        }
    }
}

fn bounds(interval: Option<[f64; 2]>, error: Option<f64>) -> String {
    match interval {
        Some([low, high]) => {
            format!("{} to {}", rounded(low, number(error)), rounded(high, number(error)))
        }
        None => UNKNOWN.to_owned(),
    }
}

fn sd(parameter: &ParameterSummary) -> Option<f64> {
    parameter.sd.filter(|sd| sd.is_finite())
}

fn number(value: Option<f64>) -> f64 {
    value.unwrap_or(f64::NAN)
}
