//! The table of evidences, one line a hypothesis, and whether its estimators agree.

use oddwell_study::estimator_families;
use oddwell_study::record::{HypothesisRecord, WeighRecord};

use crate::numbers::{UNKNOWN, count, duration, rounded, two_digits};
use crate::style::Style;
use crate::text::{Table, wrapped};

pub(super) fn section(record: &WeighRecord, style: Style) -> String {
    let mut header = vec!["hypothesis", "ln evidence"];
    header.extend(estimator_families().iter().map(|family| label(family.name)));
    let mut table = Table::new(&header);
    for hypothesis in &record.hypotheses {
        let mut cells = vec![hypothesis.name.clone(), number(hypothesis.log_evidence, hypothesis.error)];
        for family in estimator_families() {
            let estimate = hypothesis.estimators.get(family.name).and_then(Option::as_ref);
            let text = number(
                estimate.map(|estimate| estimate.log_evidence),
                estimate.map(|estimate| estimate.error),
            );
            let silent = estimate.is_some_and(|estimate| !estimate.votes);
            cells.push(if silent { format!("({text})") } else { text });
        }
        table.row(cells);
    }
    let mut out = table.render(|line| style.faint(line));
    out.push_str(&wrapped(
        "  ",
        2,
        "(Natural logarithms with standard errors; what stands in brackets does not vote; – does not apply.)",
    ));
    if record.relative {
        let text = format!(
            "The noise is no density, so an evidence means nothing by itself: estimates are relative to `{}`.",
            record.reference
        );
        out.push_str(&wrapped("  ", 2, &text));
    }
    out.push_str(&agreement(record, style));
    out.push_str(&cost(record));
    out
}

fn label(name: &str) -> &str {
    match name {
        "density_ratio" => "density ratio",
        "closed_form" => "closed form",
        name => name,
    }
}

fn number(value: Option<f64>, error: Option<f64>) -> String {
    match (value, error) {
        // Digits beyond a thousandth of a nat say nothing to anybody.
        (Some(value), Some(error)) if error < 1e-3 => format!("{value:.3}"),
        (Some(value), Some(error)) => format!("{} ± {}", rounded(value, error), two_digits(error)),
        _ => UNKNOWN.to_owned(),
    }
}

fn agreement(record: &WeighRecord, style: Style) -> String {
    if record.agree {
        return wrapped("  ", 2, "The estimators agree within their errors.");
    }
    let mut out = format!("  {}\n", style.fault("THE ESTIMATORS DO NOT AGREE"));
    for hypothesis in record.hypotheses.iter().filter(|hypothesis| !hypothesis.agree) {
        for line in reasons(hypothesis) {
            out.push_str(&wrapped("  - ", 4, &format!("`{}`: {line}", hypothesis.name)));
        }
    }
    out.push_str(&wrapped(
        "  ",
        2,
        "Quote no odds that hang on these. Narrow priors that are far wider than the data need, or look for separate modes.",
    ));
    out
}

fn reasons(hypothesis: &HypothesisRecord) -> Vec<String> {
    let mut lines: Vec<String> = hypothesis
        .disagreements
        .iter()
        .map(|pair| {
            format!(
                "{} and {} differ by {:.2}, {:.1} of their errors",
                label(&pair.between[0]),
                label(&pair.between[1]),
                pair.difference,
                (pair.difference / pair.error).abs()
            )
        })
        .collect();
    for (name, estimate) in &hypothesis.estimators {
        if let Some(doubt) = estimate.as_ref().and_then(|estimate| estimate.doubt.as_ref()) {
            lines.push(format!("{}: {doubt}", label(name)));
        }
    }
    if lines.is_empty() {
        lines.push("no estimator applies".to_owned());
    }
    lines
}

fn cost(record: &WeighRecord) -> String {
    let of = |hypothesis: &HypothesisRecord| {
        format!("`{}` {} in {}", hypothesis.name, count(hypothesis.evaluations), duration(hypothesis.seconds))
    };
    let each: Vec<String> = record.hypotheses.iter().map(of).collect();
    let text =
        format!("Likelihood evaluations, and seconds of work: {}; seed {}.", each.join(", "), record.seed);
    wrapped("  ", 2, &text)
}
