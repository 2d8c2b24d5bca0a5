//! What a result does not mean.

use oddwell_study::record::Summary;

use crate::style::Style;
use crate::text::wrapped;

pub(super) fn section(summary: &Summary, style: Style) -> String {
    let mut text = String::new();
    if summary.warnings.iter().any(|warning| warning.code == "growth-assumed") {
        text.push_str(
            "A departure that light alone feels is quoted as if matter grew as in general relativity. ",
        );
    }
    text.push_str("All of it is linear theory, which ends near 20 Mpc/h. ");
    text.push_str(if summary.departure_parameters.is_empty() {
        "A posterior is not an evidence: it takes the hypothesis for granted and cannot favour it over another."
    } else {
        "A posterior is not an evidence: it says where the departure lies if this hypothesis holds, not whether it \
         holds, and an interval that leaves out zero is no detection."
    });
    format!("{}\n{}", style.strong("What this does not mean"), wrapped("  ", 2, &text))
}
