//! The departure from each survey and each bin, beside the joint one.

use oddwell_study::record::{PartAgreement, PartDeparture, Summary};

use crate::numbers::{UNKNOWN, probability, rounded, two_digits};
use crate::style::Style;
use crate::text::{Table, wrapped};

/// A disagreement below this probability is no chance: one honest study in a thousand.
const EXTREME: f64 = 1e-3;

pub(super) fn section(summary: &Summary, style: Style) -> String {
    let Some(by_part) = summary.by_part.as_ref().filter(|by_part| by_part.bins.len() > 1) else {
        return String::new();
    };
    let mut table = Table::new(&["", "alone", "sd", "together", "sd"]);
    let mut row = |name: String, part: &PartDeparture| {
        let place = |value: Option<f64>, sd: Option<f64>| match (value, sd) {
            (Some(value), Some(sd)) => rounded(value, sd),
            (None, Some(_)) if summary.blinded => "hidden".to_owned(),
            _ => UNKNOWN.to_owned(),
        };
        let error = |sd: Option<f64>| sd.map_or(UNKNOWN.to_owned(), two_digits);
        table.row(vec![
            name,
            place(part.value, part.sd),
            error(part.sd),
            place(part.together, part.together_sd),
            error(part.together_sd),
        ]);
    };
    for survey in &by_part.surveys {
        row(survey.survey.clone(), survey);
    }
    for bin in &by_part.bins {
        row(format!("{}.{}", bin.survey, bin.bin.as_deref().unwrap_or_default()), bin);
    }
    let mut out = format!("{}\n", style.strong("The departure by survey and bin"));
    out.push_str(&table.render(|header| style.faint(header)));
    let verdicts: Vec<String> = [("surveys", &by_part.survey_agreement), ("bins", &by_part.bin_agreement)]
        .into_iter()
        .filter_map(|(what, found)| Some(verdict(what, found.as_ref()?)))
        .collect();
    out.push_str(&wrapped("  ", 2, &verdicts.join(" ")));
    let note = "(Linear about the best point, without the departure's own prior. Alone: from these rows. Together: from all \
                rows, nuisances in common; what parts share is no disagreement.)";
    out.push_str(&wrapped("  ", 2, note));
    out
}

fn verdict(what: &str, found: &PartAgreement) -> String {
    let PartAgreement { chi2, degrees_of_freedom, p_value } = found;
    let p_value = p_value.map_or(UNKNOWN.to_owned(), probability);
    let agree = if found.p_value.is_some_and(|p_value| p_value < EXTREME) { "do not agree" } else { "agree" };
    format!("The {what} {agree}: χ² {chi2:.1} for {degrees_of_freedom} (p = {p_value}).")
}
