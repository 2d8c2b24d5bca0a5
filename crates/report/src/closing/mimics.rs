//! What would give the same data without a departure: the sentence that keeps a result honest.

use oddwell_study::record::{Mimic, Summary};

use crate::numbers::{signed, significant, two_digits};
use crate::style::Style;
use crate::text::wrapped;

/// Cosines above this round to 1.00: for every purpose the same data.
const SAME: f64 = 0.995;

/// Below this less than half of the change (its square) is common to both: not a mimic.
const SIMILAR: f64 = 0.7;

pub(super) fn section(summary: &Summary, style: Style) -> String {
    if summary.blinded || summary.mimics.is_empty() {
        return String::new();
    }
    let mut out = format!("{}\n", style.strong("What else would look like this"));
    for sentence in mimic_sentences(summary) {
        out.push_str(&wrapped("  - ", 4, &sentence));
    }
    if summary.mimics.iter().any(|mimic| mimic.likeness < SAME) {
        let text = "(Likeness: the cosine between the two changes of the data in units of the noise; 1 is the same.)";
        out.push_str(&wrapped("  ", 2, text));
    }
    out
}

/// A sentence each; none while blinded.
pub(crate) fn mimic_sentences(summary: &Summary) -> Vec<String> {
    if summary.blinded {
        return Vec::new();
    }
    let bins: usize = summary.best.surveys.iter().map(|survey| survey.bins.len()).sum();
    summary.mimics.iter().map(|mimic| sentence(mimic, bins > 1)).collect()
}

fn sentence(mimic: &Mimic, several_bins: bool) -> String {
    let likeness = format!("{:.2}", mimic.likeness);
    let data = match mimic.likeness {
        same if same >= SAME => "The same data follow".to_owned(),
        nearly if nearly >= SIMILAR => format!("Nearly the same data (likeness {likeness}) follow"),
        _ => format!("Data only partly alike (likeness {likeness}) follow"),
    };
    let (subject, unit) = match mimic.nuisance.as_str() {
        "evolution" => ("both evolution biases are", ""),
        "magnification" => ("both magnification biases are", ""),
        "offset" => ("the redshift offset is", " km/s"),
        other => (other, ""),
    };
    let everywhere = if several_bins { " in every bin at once" } else { "" };
    let shift = signed(&significant(mimic.shift, 2));
    let allowed = match mimic.allowed {
        Some(allowed) if allowed > 0.0 => format!(
            "where the priors allow ± {}{unit} ({} times that)",
            two_digits(allowed),
            significant(mimic.shift.abs() / allowed, 2)
        ),
        _ => "which is held by the study, so no error of it is in the result".to_owned(),
    };
    format!("{data} from general relativity if {subject} off by {shift}{unit}{everywhere}, {allowed}.")
}
