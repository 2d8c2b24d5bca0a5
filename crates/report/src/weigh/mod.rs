//! What a weighing says at its end, for a person at a terminal.

mod evidences;
mod limits;
mod parts;
mod sensitivity;

pub(crate) use sensitivity::verdict_words;

use oddwell_study::record::WeighRecord;

use crate::style::Style;

/// The verdict as text: evidences by estimator, odds with the width that turns them, what averages over hypotheses, whether
/// surveys and bins agree, and what none of it means.
pub fn weigh_text(record: &WeighRecord, style: Style) -> String {
    let sections = [
        format!("{}\n", style.strong(&format!("{}: the hypotheses weighed", record.study))),
        evidences::section(record, style),
        sensitivity::section(record, style),
        parts::average(record, style),
        parts::consistency(record, style),
        parts::best_of(record, style),
        limits::section(record, style),
    ];
    let there: Vec<&str> = sections.iter().map(String::as_str).filter(|text| !text.is_empty()).collect();
    there.join("\n")
}
