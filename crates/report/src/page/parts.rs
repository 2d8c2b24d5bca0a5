//! Pieces that every section of the page uses.

use maud::{Markup, PreEscaped, html};

use crate::figure::Figure;
use crate::numbers::UNKNOWN;

/// What a page is put together with: its figures, each under a name of its own.
#[derive(Debug, Default)]
pub(super) struct Sheet {
    pub(super) figures: Vec<Figure>,
}

impl Sheet {
    /// A figure with its caption. Kept under its name, which must be unique, for whoever wants it as a file.
    pub(super) fn figure(&mut self, figure: Figure, caption: Markup) -> Markup {
        let name = figure.name.clone();
        debug_assert!(self.figures.iter().all(|known| known.name != name), "two figures named {name}");
        let element = figure.element(&name, &[("tabindex", "0")]);
        let wide = figure.width > 500.0;
        self.figures.push(figure);
        html! {
            figure id={ "figure-" (name) } class=[wide.then_some("wide")] {
                div.canvas { (PreEscaped(element)) }
                figcaption { (caption) }
            }
        }
    }
}

/// A number that stands in a JSON file of a run: shown rounded, with the whole value and where it is from beside it.
pub(super) fn told(from: &str, value: Option<f64>, text: impl FnOnce(f64) -> String) -> Markup {
    match value {
        Some(value) if value.is_finite() => html! {
            data value=(format!("{value:?}")) data-from=(from) { (text(value)) }
        },
        _ => html! { span { (UNKNOWN) } },
    }
}

/// Where a number of a run's summary stands: run, file and JSON pointer.
pub(super) fn in_summary(run: usize, pointer: &str) -> String {
    format!("{run}:summary.json:{pointer}")
}

/// A name that can be chosen, and is then highlighted everywhere.
pub(super) fn key(name: &str) -> Markup {
    key_as(name, name)
}

/// The same under other words.
pub(super) fn key_as(name: &str, words: &str) -> Markup {
    html! { button.key type="button" data-key=(name) aria-pressed="false" { (words) } }
}

/// A table with a header. The first cell of every row is the row's own header.
pub(super) fn table(caption: &str, header: &[&str], rows: Vec<Vec<Markup>>) -> Markup {
    html! {
        div.scroll tabindex="0" role="group" aria-label=(caption) {
            table {
                caption { (caption) }
                thead { tr { @for cell in header { th scope="col" { (if cell.is_empty() { "where" } else { cell }) } } } }
                tbody {
                    @for row in rows {
                        tr {
                            @for (index, cell) in row.into_iter().enumerate() {
                                @if index == 0 { th scope="row" { (cell) } } @else { td { (cell) } }
                            }
                        }
                    }
                }
            }
        }
    }
}

/// Plain words as a cell.
pub(super) fn cell(text: impl AsRef<str>) -> Markup {
    html! { (text.as_ref()) }
}

/// Something that is only shown when asked for.
pub(super) fn on_demand(summary: &str, content: Markup) -> Markup {
    html! { details { summary { (summary) } (content) } }
}

/// A sentence about something that is not there, with the command that makes it.
pub(super) fn missing(what: &str, command: &str) -> Markup {
    html! { p.missing { (what) " " code { (command) } } }
}

/// A sentence with `code` in back quotes, as the program's texts have it.
pub(super) fn prose(text: &str) -> Markup {
    html! {
        @for (index, part) in text.split('`').enumerate() {
            @if index % 2 == 1 { code { (part) } } @else { (part) }
        }
    }
}

/// A word for file names and identifiers.
pub(super) fn slug(text: &str) -> String {
    let mut slug = String::new();
    for letter in text.to_lowercase().chars() {
        if letter.is_ascii_alphanumeric() {
            slug.push(letter);
        } else if !slug.ends_with('-') {
            slug.push('-');
        }
    }
    slug.trim_matches('-').to_owned()
}
