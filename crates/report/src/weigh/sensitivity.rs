//! Odds, never without the width of the prior that turns them.

use oddwell_study::WeighVerdict as Verdict;
use oddwell_study::record::{HypothesisRecord, Sensitivity, WeighRecord};

use crate::numbers::{UNKNOWN, probability, significant};
use crate::style::Style;
use crate::text::{Table, wrapped};

pub(super) fn section(record: &WeighRecord, style: Style) -> String {
    let against = format!("odds to `{}`", record.reference);
    let mut table =
        Table::new(&["hypothesis", &against, "probability", "prior width", "turns at", "at most"]);
    for hypothesis in &record.hypotheses {
        let sensitivity = hypothesis.sensitivity.as_ref();
        let held = hypothesis.tested.is_none();
        let cell =
            |value: Option<f64>| value.map_or_else(|| UNKNOWN.to_owned(), |value| significant(value, 2));
        let (odds, share) = if held || sensitivity.is_some() {
            (odds_text(hypothesis), hypothesis.probability.map_or_else(|| UNKNOWN.to_owned(), probability))
        } else {
            (UNKNOWN.to_owned(), UNKNOWN.to_owned())
        };
        table.row(vec![
            hypothesis.name.clone(),
            odds,
            share,
            cell(sensitivity.map(|sensitivity| sensitivity.width)),
            match sensitivity {
                Some(sensitivity) if sensitivity.turning_width.is_none() => "no width".to_owned(),
                _ => cell(sensitivity.and_then(|sensitivity| sensitivity.turning_width)),
            },
            cell(sensitivity.map(|sensitivity| sensitivity.largest)),
        ]);
    }
    let mut out =
        format!("{}\n", style.strong("Odds, and the width of the departure's prior that turns them"));
    out.push_str(&table.render(|line| style.faint(line)));
    for hypothesis in record.hypotheses.iter().filter(|hypothesis| hypothesis.name != record.reference) {
        out.push_str(&wrapped("  - ", 4, &sentence(hypothesis, record, style)));
    }
    out
}

fn odds_text(hypothesis: &HypothesisRecord) -> String {
    let Some(odds) = hypothesis.odds else { return UNKNOWN.to_owned() };
    let error = hypothesis.log_odds_error.unwrap_or(0.0);
    let factor =
        if error > 0.01 { format!(" (× or ÷ {})", significant(error.exp(), 3)) } else { String::new() };
    format!("{}{factor}", ratio(odds))
}

/// Odds as people say them: 3.1 : 1, or 1 : 4.2.
fn ratio(odds: f64) -> String {
    if odds >= 1.0 {
        format!("{} : 1", significant(odds, 2))
    } else {
        format!("1 : {}", significant(odds.recip(), 2))
    }
}

fn sentence(hypothesis: &HypothesisRecord, record: &WeighRecord, style: Style) -> String {
    let name = format!("`{}`", hypothesis.name);
    if hypothesis.tested == Some(false) {
        return format!("{name}: {}; there are no odds.", style.caution("untested"));
    }
    let Some(sensitivity) = &hypothesis.sensitivity else {
        return if hypothesis.tested.is_none() {
            format!("{name}: its departure is held, so no prior of it enters the odds.")
        } else {
            format!("{name}: the width of prior that would turn its odds is not known, so none are given.")
        };
    };
    let words = verdict_words(sensitivity.verdict, &record.reference);
    let verdict = match sensitivity.verdict {
        Verdict::ThePriorDecides => style.caution(&words),
        _ => words,
    };
    format!("{name}: {verdict}. {}{}", turning(sensitivity), at_best(sensitivity))
}

/// What a ratio of evidences to `reference` comes to, in words.
pub(crate) fn verdict_words(verdict: Verdict, reference: &str) -> String {
    match verdict {
        Verdict::ThePriorDecides => "inconclusive: the prior decides".to_owned(),
        Verdict::Departure => "favoured at this width and at any within a factor of 3".to_owned(),
        Verdict::Contained => {
            format!("less probable than `{reference}` at this width and at any within a factor of 3")
        }
    }
}

fn turning(sensitivity: &Sensitivity) -> String {
    match (sensitivity.turning_width, sensitivity.wider_favours_reference) {
        (Some(width), Some(true)) => {
            format!("A prior wider than {} turns the odds against it. ", significant(width, 2))
        }
        (Some(width), _) => {
            format!("A prior narrower than {} turns the odds against it. ", significant(width, 2))
        }
        _ => "No width turns the odds. ".to_owned(),
    }
}

fn at_best(sensitivity: &Sensitivity) -> String {
    let largest = format!(
        "The evidences' ratio is at most {}, at a width of {}",
        significant(sensitivity.largest, 2),
        significant(sensitivity.largest_width, 2)
    );
    match (sensitivity.tail_probability, sensitivity.bound) {
        (Some(tail), Some(bound)) => format!(
            "{largest}; a tail of {} is worth at most {} to any prior.",
            probability(tail),
            significant(bound, 2)
        ),
        _ => format!("{largest}."),
    }
}
