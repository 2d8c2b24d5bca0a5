//! What evidences do not mean.

use oddwell_study::record::WeighRecord;

use crate::style::Style;
use crate::text::wrapped;

pub(super) fn section(record: &WeighRecord, style: Style) -> String {
    let mut out = format!("{}\n", style.strong("What this does not mean"));
    out.push_str(&wrapped(
        "  ",
        2,
        "An evidence is no detection: it says how the data shift the odds between the hypotheses listed here, each with its \
         priors, and nothing of any other. It grows and falls with the width of the departure's prior, so a prior can decide it. \
         All of it is linear theory, which ends near 20 Mpc/h, and as good as the priors on evolution and magnification biases.",
    ));
    for note in &record.notes {
        out.push_str(&wrapped("  - ", 4, note));
    }
    out
}
