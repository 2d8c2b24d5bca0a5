//! How far the departure moves when the data are cut or the assumptions changed.

use maud::Markup;

use super::Runs;
use super::parts::{Sheet, missing};

pub(super) fn section(runs: &Runs<'_>, _sheet: &mut Sheet) -> Markup {
    let manifest = &runs.first().manifest;
    missing(
        "No run with other cuts of the data was made. They are made, beside the run itself, by",
        &format!("oddwell fit {} --hypothesis {} --stability", manifest.study_file, manifest.hypothesis),
    )
}
