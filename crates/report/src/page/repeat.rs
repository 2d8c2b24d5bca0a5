//! Everything that it takes to get the same numbers again, and whom to cite.

use maud::{Markup, html};
use oddwell_study::review::Review;

use super::parts::{cell, on_demand, table};
use super::{Runs, label};
use crate::numbers::count;
use crate::references::{bibliography, references};

pub(super) fn section(runs: &Runs<'_>) -> Markup {
    let mut texts: Vec<(&str, &str)> = Vec::new();
    for run in runs.all() {
        let (file, text) = (run.manifest.study_file.as_str(), run.manifest.study_text.as_str());
        if texts.iter().all(|(_, known)| *known != text) {
            texts.push((file, text));
        }
    }
    let methods = references()
        .iter()
        .map(|reference| vec![cell(reference.cited()), cell(reference.place()), cell(reference.used_for)]);
    html! {
        @for run in runs.all() { (of_run(run)) }
        p { "This page: " code { (runs.input.command) } ", " (runs.input.version) "." }
        @for (file, text) in texts { (on_demand(&format!("The study file {file}, as read"), html! { pre tabindex="0" { (text) } })) }
        h3 { "Methods, and the publications to cite" }
        (table("Publications", &["publication", "where", "for"], methods.collect()))
        (on_demand("The same as BibTeX", html! { pre tabindex="0" { (bibliography()) } }))
    }
}

fn of_run(run: &Review) -> Markup {
    let manifest = &run.manifest;
    let rows = manifest.inputs.iter().map(|input| vec![cell(&input.path), html! { code { (input.sha256) } }]);
    html! {
        h3 { (label(run)) }
        dl {
            dt { "Command" } dd { code { (manifest.command.join(" ")) } }
            dt { "Version" } dd { (manifest.version) }
            dt { "Seed" } dd { (manifest.seed) " (the same study, seed and version give the same chain on any number of threads)" }
            dt { "When" } dd { (manifest.started) " to " (manifest.ended) }
            dt { "Draws" } dd { (count(run.draws as u64)) " kept, the first " (count(manifest.warm_up)) " steps dropped, every " (manifest.thinning) ". step kept" }
            @if !manifest.overrides.is_empty() { dt { "Changed with --set" } dd { @for each in &manifest.overrides { code { (each) } " " } } }
        }
        (table("Inputs and their SHA-256", &["file", "SHA-256"], rows.collect()))
    }
}
