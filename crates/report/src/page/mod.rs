//! The page that is passed round: one self-contained HTML file over one or more runs.
//!
//! Its sections answer a referee's questions in the order in which they are asked. Nothing on it is fetched from anywhere;
//! it reads the same with scripts off, prints, and can be used by keyboard.

mod answer;
mod data;
mod evolution;
mod limits;
mod parts;
mod repeat;
mod stability;
mod trust;
mod weighed;

use maud::{DOCTYPE, Markup, PreEscaped, html};
use oddwell_study::blinding::WITHHELD;
use oddwell_study::review::{Review, Weighing};

use crate::figure::{ALARM, AXIS, BAND, Colour, FIELD, Figure, GRID, INK, MUTED, PAPER, RELATIVITY};
use crate::references::bibliography;
use parts::Sheet;

/// What a page is made from.
#[derive(Clone, Copy, Debug)]
pub struct PageInput<'a> {
    /// The runs, in the order in which they were named; at least one.
    pub runs: &'a [Review],
    /// What `oddwell weigh` has found, if anything.
    pub weighed: &'a [Weighing],
    /// The command that makes the page.
    pub command: &'a str,
    /// The program and its version.
    pub version: &'a str,
}

/// A finished page.
#[derive(Clone, Debug)]
pub struct Page {
    /// The HTML file.
    pub html: String,
    /// Its figures.
    pub figures: Vec<Figure>,
    /// The publications whose methods were used, as BibTeX.
    pub bibliography: String,
}

/// A section: what its heading asks, the word of its anchor, and what it says.
struct Section {
    anchor: &'static str,
    heading: &'static str,
    content: Markup,
}

/// Puts the page together.
///
/// What a run does not have (it was not weighed, has no stability runs, its measurements are gone) is said in a sentence
/// with the command that makes it. Of blinded runs nothing is shown that tells where the departure lies.
#[must_use]
pub fn page(input: &PageInput<'_>) -> Page {
    let mut sheet = Sheet::default();
    let all = Runs::new(input);
    let sections = [
        Section { anchor: "answer", heading: "The answer", content: answer::section(&all, &mut sheet) },
        Section {
            anchor: "redshift",
            heading: "The departure against redshift",
            content: evolution::section(&all, &mut sheet),
        },
        Section {
            anchor: "data",
            heading: "The data against the prediction",
            content: data::section(&all, &mut sheet),
        },
        Section { anchor: "trust", heading: "Can it be trusted?", content: trust::section(&all, &mut sheet) },
        Section { anchor: "limits", heading: "What limits it?", content: limits::section(&all, &mut sheet) },
        Section {
            anchor: "stability",
            heading: "Does it hold still?",
            content: stability::section(&all, &mut sheet),
        },
        Section {
            anchor: "weighed",
            heading: "Hypotheses weighed",
            content: weighed::section(&all, &mut sheet),
        },
        Section { anchor: "repeat", heading: "How to repeat it", content: repeat::section(&all) },
    ];
    let summary = &all.first().summary;
    let html = document(&summary.study, all.blinded(), all.not_converged(), &sections, &all);
    Page { html: html.into_string(), figures: sheet.figures, bibliography: bibliography() }
}

/// The runs of a page, and which of them it is about.
struct Runs<'a> {
    input: &'a PageInput<'a>,
    principal: usize,
}

impl<'a> Runs<'a> {
    fn new(input: &'a PageInput<'a>) -> Runs<'a> {
        let inferred = |run: &Review| run.summary.departure_parameters.len() == 1;
        let any = |run: &Review| !run.summary.departure_parameters.is_empty();
        let position = |test: &dyn Fn(&Review) -> bool| input.runs.iter().position(test);
        let principal = position(&inferred).or_else(|| position(&any)).unwrap_or(0);
        Runs { input, principal }
    }

    fn all(&self) -> &'a [Review] {
        self.input.runs
    }

    /// The run that the page is about: the first that infers one departure, else the first that infers any.
    fn first(&self) -> &'a Review {
        &self.input.runs[self.principal]
    }

    /// The others with their places in the list.
    fn others(&self) -> impl Iterator<Item = (usize, &'a Review)> {
        let principal = self.principal;
        self.input.runs.iter().enumerate().filter(move |(index, _)| *index != principal)
    }

    fn weighed(&self) -> &'a [Weighing] {
        self.input.weighed
    }

    fn blinded(&self) -> bool {
        self.all().iter().any(|run| run.summary.blinded)
    }

    fn not_converged(&self) -> Vec<&'a Review> {
        self.all().iter().filter(|run| !run.summary.converged).collect()
    }
}

/// What a run is called where there are several.
fn label(run: &Review) -> String {
    let summary = &run.summary;
    if summary.departure == "none" {
        return format!("{} (no departure)", summary.hypothesis);
    }
    format!("{} ({}, felt by {})", summary.hypothesis, summary.departure, summary.felt_by)
}

/// The page's colours as CSS knows them.
fn variables() -> String {
    let named: [(&str, Colour); 9] = [
        ("paper", PAPER),
        ("field", FIELD),
        ("ink", INK),
        ("muted", MUTED),
        ("axis", AXIS),
        ("grid", GRID),
        ("fitted", BAND),
        ("relativity", RELATIVITY),
        ("alarm", ALARM),
    ];
    let lines: Vec<String> =
        named.into_iter().map(|(name, colour)| format!("--{name}:{}", colour.css())).collect();
    format!(":root{{{}}}", lines.join(";"))
}

fn document(
    title: &str,
    blinded: bool,
    unfinished: Vec<&Review>,
    sections: &[Section],
    runs: &Runs<'_>,
) -> Markup {
    html! {
        (DOCTYPE)
        html lang="en" {
            head {
                meta charset="utf-8";
                meta name="viewport" content="width=device-width, initial-scale=1";
                // Nothing may be asked for, whatever a study's text contains.
                meta http-equiv="Content-Security-Policy"
                    content="default-src 'none'; style-src 'unsafe-inline'; script-src 'unsafe-inline'; img-src data:";
                link rel="icon" href="data:,";
                title { (title) " – " (runs.first().summary.hypothesis) }
                style { (PreEscaped(variables())) (PreEscaped(include_str!("page.css"))) }
            }
            body class=[blinded.then_some("blinded")] {
                a.skip href="#answer" { "To the answer" }
                @if blinded { (veil()) }
                header {
                    @for run in unfinished { (not_converged(run)) }
                    @if blinded {
                        p.banner role="note" { strong { "BLINDED" } ": " (parts::prose(WITHHELD)) "." }
                    }
                    h1 { (title) }
                    p.subject {
                        "Odd multipoles of galaxy cross-correlations, and what they say of the time distortion. Hypothesis "
                        strong { (label(runs.first())) }
                        @if runs.all().len() > 1 { ", beside " (runs.all().len() - 1) " other " (if runs.all().len() > 2 { "runs" } else { "run" }) }
                        "."
                    }
                    nav aria-label="Sections" {
                        ol { @for section in sections { li { a href={ "#" (section.anchor) } { (section.heading) } } } }
                    }
                }
                main {
                    @for (index, section) in sections.iter().enumerate() {
                        section id=(section.anchor) aria-labelledby={ (section.anchor) "-h" } {
                            h2 id={ (section.anchor) "-h" } { span.count { (index + 1) } " " (section.heading) }
                            (section.content)
                        }
                    }
                }
                div #chosen hidden { span {} button type="button" { "Clear" } }
                div #said role="status" aria-live="polite" {}
                script { (PreEscaped(include_str!("page.js"))) }
            }
        }
    }
}

/// The word across everything, on every sheet of paper too.
fn veil() -> Markup {
    html! {
        svg.veil aria-hidden="true" viewBox="0 0 100 100" preserveAspectRatio="xMidYMid meet" {
            text x="50" y="54" text-anchor="middle" font-size="19" transform="rotate(-32 50 50)" { "BLINDED" }
        }
    }
}

fn not_converged(run: &Review) -> Markup {
    let reason = run.summary.warnings.iter().find(|warning| warning.code == "not-converged");
    let text = reason.map_or("the draws do not suffice yet", |warning| {
        warning.text.strip_prefix("not converged: ").unwrap_or(&warning.text)
    });
    html! {
        p.banner role="note" {
            strong { "NOT CONVERGED" } " (" (run.summary.hypothesis) "): do not quote its numbers. " (parts::prose(text)) "."
        }
    }
}
