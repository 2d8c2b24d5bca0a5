//! Which hypothesis the data prefer, and how far the priors decide that.

use maud::{Markup, html};

use super::Runs;
use super::parts::{Sheet, missing};

pub(super) fn section(runs: &Runs<'_>, _sheet: &mut Sheet) -> Markup {
    if runs.blinded() {
        return html! { p.missing { "Odds against general relativity would tell where the departure lies; not shown while the measurements are blinded." } };
    }
    missing(
        "The hypotheses were not weighed. Evidences and odds are made by",
        &format!("oddwell weigh {}", runs.first().manifest.study_file),
    )
}
