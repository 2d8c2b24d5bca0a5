//! Averages over hypotheses, consistency, and the best of many.

use oddwell_study::record::WeighRecord;

use crate::numbers::{probability, rounded, significant, two_digits};
use crate::style::Style;
use crate::text::{Table, wrapped};

pub(super) fn average(record: &WeighRecord, style: Style) -> String {
    if record.average.is_empty() {
        return String::new();
    }
    let mut table = Table::new(&["T − 1 in bin", "mean", "sd", "68 %", "95 %"]);
    for (name, summary) in &record.average {
        let interval =
            |[low, high]: [f64; 2]| format!("{} to {}", rounded(low, summary.sd), rounded(high, summary.sd));
        table.row(vec![
            name.strip_prefix("seen_by_light.").unwrap_or(name).to_owned(),
            rounded(summary.mean, summary.sd),
            two_digits(summary.sd),
            interval(summary.interval68),
            interval(summary.interval95),
        ]);
    }
    let mut out = format!("{}\n", style.strong("What light sees of the departure, averaged over hypotheses"));
    out.push_str(&table.render(|line| style.faint(line)));
    out.push_str(&wrapped(
        "  ",
        2,
        "(By their probabilities, so it hangs on the priors' widths as these do.)",
    ));
    out
}

pub(super) fn consistency(record: &WeighRecord, style: Style) -> String {
    if record.consistency.is_empty() {
        return String::new();
    }
    let mut out = format!("{}\n", style.strong("One departure for all, or one each"));
    for entry in &record.consistency {
        let found = &entry.consistency;
        let tail = found.tail_probability.map_or_else(
            || "one each adds nothing that the data determine".to_owned(),
            |tail| format!("as much discord or more has a probability of {}", probability(tail)),
        );
        let text = format!(
            "{}: ln evidence ratio {} ± {} for one and the same (moves with the prior's width); suspiciousness {} ± {} with {} \
             degrees of freedom (does not): {tail}.",
            entry.of,
            rounded(found.log_evidence_ratio, found.error),
            two_digits(found.error),
            rounded(found.suspiciousness, found.suspiciousness_error),
            two_digits(found.suspiciousness_error),
            significant(found.degrees_of_freedom, 2),
        );
        out.push_str(&wrapped("  - ", 4, &text));
    }
    out
}

pub(super) fn best_of(record: &WeighRecord, style: Style) -> String {
    if record.best_of.is_empty() {
        return String::new();
    }
    let mut out = format!("{}\n", style.strong("The best of many"));
    for entry in &record.best_of {
        let bound = if entry.tail.bound { " at most" } else { "" };
        let text = format!(
            "{}: of {}, `{}` lies farthest from general relativity, {} σ: a tail of {} by itself, and{bound} {} for the best of \
             {}.",
            entry.of,
            entry.number,
            entry.best,
            significant(entry.tail.deviate, 2),
            probability(entry.tail.local),
            probability(entry.tail.global),
            entry.number
        );
        out.push_str(&wrapped("  - ", 4, &text));
    }
    out
}
