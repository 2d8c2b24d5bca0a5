//! What a fit says at its end, for a person at a terminal.
//!
//! The order is that of the questions: what came out, whether the parts of the data agree, what it means for clocks, what else would look the same, what it does not mean, whether the
//! model fits, what is suspicious, every parameter, and what the sampling was worth.

mod by_part;
mod clocks;
mod departure;
mod goodness;
mod limits;
mod mimics;
mod parameters;
mod sampling;
mod warnings;

#[cfg(test)]
mod tests;

pub(crate) use departure::general_relativity_text;
pub(crate) use limits::limits_text;
pub(crate) use mimics::mimic_sentences;

use oddwell_study::record::Summary;

use crate::style::Style;
use crate::text::wrapped;

/// The closing summary: plain text of at most 100 columns (unless a name is longer), with escape sequences only in
/// [`Style::Coloured`].
///
/// Values are rounded to two significant digits of their standard deviation. Where the measurements are blinded, nothing
/// is shown that says where the departure lies: not its mean or intervals, nor derived quantities, nor where general
/// relativity lies.
pub fn closing_summary(summary: &Summary, style: Style) -> String {
    let sections = [
        title(summary, style),
        departure::section(summary, style),
        by_part::section(summary, style),
        clocks::section(summary, style),
        mimics::section(summary, style),
        limits::section(summary, style),
        goodness::section(summary, style),
        warnings::section(summary, style),
        parameters::section(summary, style),
        sampling::section(summary, style),
    ];
    let there: Vec<&str> = sections.iter().map(String::as_str).filter(|text| !text.is_empty()).collect();
    there.join("\n")
}

fn title(summary: &Summary, style: Style) -> String {
    let name = format!("{}: hypothesis `{}`", summary.study, summary.hypothesis);
    let mut out = format!("{} ({})\n", style.strong(&name), shape(summary));
    if !(summary.only.is_empty() && summary.without.is_empty()) {
        let of = |word: &str, names: &[String]| match names {
            [] => String::new(),
            names => format!(", {word} {}", names.join(", ")),
        };
        let part = of("only", &summary.only) + &of("without", &summary.without);
        out.push_str(&wrapped(
            "",
            2,
            &format!("A part of the measurements: {}.", part.trim_start_matches(", ")),
        ));
    }
    if summary.blinded {
        out.push_str(&style.fault("BLINDED"));
        out.push_str(": the measurements are shifted by a secret departure; where it lies is not shown.\n");
    }
    if !summary.converged {
        out.push_str(&style.fault("NOT CONVERGED"));
        out.push_str(": the draws do not suffice yet; do not quote the numbers below.\n");
    }
    out
}

fn shape(summary: &Summary) -> String {
    if summary.departure == "none" {
        "no departure".to_owned()
    } else {
        format!("departure {}, felt by {}", summary.departure, summary.felt_by)
    }
}

/// Whether a parameter's place would give away the departure of blinded measurements.
fn hidden(summary: &Summary, name: &str) -> bool {
    summary.blinded && (name.starts_with("departure.") || name.starts_with("derived."))
}
