//! The manual's pages as text.

use oddwell_study::check::{KINDS, Rate, thresholds};
use oddwell_study::{ManualPage, manual_pages};

use crate::style::Style;
use crate::text::{padded, wrapped};

/// A line a topic: its name and its formula.
pub fn manual_topics(style: Style) -> String {
    let pages = manual_pages();
    let width = pages.iter().map(|page| page.name.chars().count()).max().unwrap_or(0);
    let mut out = format!("{}\n", style.strong("Departures from general relativity"));
    for page in &pages {
        let first = format!("  {}   ", padded(page.name, width));
        out.push_str(&wrapped(&first, width + 5, page.formula));
    }
    out.push_str(&format!("\n{}\n", style.strong("Commands")));
    out.push_str("  check   what each of its warnings looks at, and where it draws the line\n");
    out.push_str("\n`oddwell manual TOPIC` prints the page of one of them.\n");
    out
}

/// The page of `check`: every kind of warning with its threshold.
pub fn manual_check(style: Style) -> String {
    let mut out = format!("{}\n\n{}", style.strong("oddwell check"), wrapped("  ", 2, &thresholds()));
    for (rate, heading) in [
        (Rate::Threshold, "As often as the threshold says, where nothing is wrong"),
        (Rate::Below, "More rarely than the threshold says"),
        (Rate::Never, "Never by chance"),
    ] {
        out.push_str(&format!("\n{}\n", style.strong(heading)));
        for kind in KINDS.iter().filter(|kind| kind.rate == rate) {
            out.push_str(&wrapped(&format!("  {}: ", kind.code), 4, kind.meaning));
        }
    }
    out
}

/// One page: formula, parameters, who feels it, what it is and what can be told of it.
pub fn manual_text(page: &ManualPage, style: Style) -> String {
    let mut out = format!("{}\n\n", style.strong(&format!("departure = \"{}\"", page.name)));
    out.push_str(&wrapped("  ", 4, page.formula));
    out.push('\n');
    out.push_str(&wrapped("  ", 2, page.text));
    out.push_str(&format!("\n{}\n", style.strong("Who feels it")));
    let felt: Vec<String> =
        page.felt_by.iter().map(|word| format!("felt_by = \"{word}\": {}", meaning(word))).collect();
    for line in &felt {
        out.push_str(&wrapped("  ", 4, line));
    }
    if !page.parameters.is_empty() {
        out.push_str(&format!("\n{}\n", style.strong("Parameters")));
        let width = page.parameters.iter().map(|parameter| parameter.name.chars().count()).max().unwrap_or(0);
        for parameter in &page.parameters {
            let first = format!("  {}   ", padded(parameter.name, width));
            out.push_str(&wrapped(&first, width + 5, parameter.meaning));
        }
        let shared = match page.shared_by {
            "survey" => "Each survey has its own, with the same prior: departure.NAME.SURVEY.",
            "bin" => "Each bin has its own, with the same prior: departure.NAME.SURVEY.BIN.",
            _ => "All bins share them: departure.NAME.",
        };
        out.push_str(&wrapped("  ", 2, shared));
    }
    if page.scale_dependent {
        let text = "It depends on scale: growth and time distortion then stand inside the integrals over k, and an \
                    evaluation costs more.";
        out.push('\n');
        out.push_str(&wrapped("  ", 2, text));
    }
    out
}

fn meaning(felt_by: &str) -> &'static str {
    match felt_by {
        "light" => {
            "the potential that light sees is 1 + τ times as deep; matter moves as in general relativity"
        }
        "matter" => {
            "the force on matter is 1 + τ times as strong; light sees the potential of general relativity"
        }
        _ => "both; potential and acceleration cancel in the odd multipoles, and only growth is left",
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::text::PAGE;
    use oddwell_study::manual_page;
    use unicode_width::UnicodeWidthStr;

    #[test]
    fn every_page_says_all_that_the_registry_knows() {
        let topics = manual_topics(Style::Plain);
        let pages = manual_pages();
        assert!(pages.len() >= 10);
        for page in pages {
            assert!(topics.lines().any(|line| line.starts_with(&format!("  {} ", page.name))), "{topics}");
            let text = manual_text(&page, Style::Plain);
            let flowing = text.split_whitespace().collect::<Vec<_>>().join(" ");
            let formula = page.formula.split_whitespace().collect::<Vec<_>>().join(" ");
            assert!(flowing.contains(&formula) && flowing.contains(page.text), "{text}");
            for felt_by in &page.felt_by {
                assert!(text.contains(&format!("felt_by = \"{felt_by}\": ")), "{text}");
            }
            for parameter in &page.parameters {
                let line = format!("{} {}", parameter.name, parameter.meaning);
                assert!(flowing.contains(&line), "{text}");
            }
            assert_eq!(text.contains("inside the integrals"), page.scale_dependent);
            let widest = text.lines().chain(topics.lines()).map(UnicodeWidthStr::width).max();
            assert!(widest <= Some(PAGE), "{text}");
        }
    }

    #[test]
    fn every_kind_of_warning_has_its_line() {
        let text = manual_check(Style::Plain);
        for kind in KINDS {
            assert_eq!(text.matches(&format!("\n  {}: ", kind.code)).count(), 1, "{text}");
        }
        assert!(
            text.contains("0.001") && text.lines().map(UnicodeWidthStr::width).max() <= Some(PAGE),
            "{text}"
        );
    }

    #[test]
    fn a_page_reads_so() {
        let page = manual_page("per-bin").expect("it is registered");
        let text = manual_text(&page, Style::Plain);
        assert_eq!(
            text,
            "departure = \"per-bin\"\n\n  τ = one value a bin\n\n  One value a bin, all with the same prior: nothing is assumed of how a departure changes with time.\n  Goes with light only, since growth would need τ between the bins.\n\nWho feels it\n  felt_by = \"light\": the potential that light sees is 1 + τ times as deep; matter moves as in\n    general relativity\n\nParameters\n  tau   amplitude τ0, dimensionless; 0 is general relativity, −1 felt by light is no gravitational\n        redshift\n  Each bin has its own, with the same prior: departure.NAME.SURVEY.BIN.\n"
        );
        assert_eq!(manual_page("per-bni").unwrap_err().to_string(), "did you mean `per-bin`?");
    }
}
