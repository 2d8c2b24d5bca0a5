//! The manual's pages as text.

use oddwell_study::check::{KINDS, Rate, thresholds};
use oddwell_study::{DataPage, ManualPage, data_pages, estimator_families, manual_pages};

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
    out.push_str(&format!("\n{}\n", style.strong("Measurements")));
    let about_data = data_pages();
    let width = about_data.iter().map(|page| page.name.chars().count()).max().unwrap_or(0);
    for page in &about_data {
        out.push_str(&wrapped(&format!("  {}   ", padded(page.name, width)), width + 5, page.summary));
    }
    out.push_str(&format!("\n{}\n", style.strong("Commands")));
    out.push_str("  check   what each of its warnings looks at, and where it draws the line\n");
    out.push_str("  weigh   what evidences and odds are, what they hang on, and what they cannot bear\n");
    out.push_str(&format!("\n{}\n", style.strong("Estimators of the evidence")));
    let width = estimator_families().iter().map(|family| family.name.chars().count()).max().unwrap_or(0);
    for family in estimator_families() {
        let first = format!("  {}   ", padded(family.name, width));
        out.push_str(&wrapped(&first, width + 5, family.summary));
    }
    out.push_str("\n`oddwell manual TOPIC` prints the page of one of them.\n");
    out
}

/// A page about the measurements: keys with what they mean, then what else there is to know.
pub fn manual_data(page: &DataPage, style: Style) -> String {
    let mut out = format!("{}\n", wrapped(&style.strong(page.name), 2, &format!(": {}", page.summary)));
    for (key, meaning) in &page.entries {
        out.push_str(&wrapped(&format!("  {key}: "), 6, meaning));
    }
    out.push('\n');
    out.push_str(&wrapped("  ", 2, page.text));
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

/// The page of `weigh`.
pub fn manual_weigh(style: Style) -> String {
    let mut out = format!("{}\n", style.strong("oddwell weigh"));
    for paragraph in WEIGH {
        out.push('\n');
        out.push_str(&wrapped("  ", 2, paragraph));
    }
    out.push_str(&format!("\n{}\n", style.strong("Estimators")));
    for family in estimator_families() {
        out.push_str(&wrapped(&format!("  {}: ", family.name), 4, family.summary));
    }
    out
}

/// What `weigh` does and what its result cannot bear.
const WEIGH: [&str; 7] = [
    "The evidence of a hypothesis is the probability of the data under it, its priors included: the likelihood averaged over the \
     prior. Two hypotheses' evidences, times their prior odds (`weight` in [[hypothesis]]), are the odds that the data leave.",
    "Every estimator that applies computes it anew, once the quantities that enter linearly are integrated out exactly (normal noise, \
     normal or flat priors). They agree where none differs from another by more than 4 of their combined standard errors and 0.02. If \
     they do not, the text and exit status 3 say so: quote no odds then. Those that do not vote are shown in brackets.",
    "An evidence falls as the prior of the departure widens beyond what the data ask for. So odds come with the width at which \
     they turn, found from the draws at hand: where that lies within a factor of 3 of the width used, the verdict is \
     `inconclusive: the prior decides`. The largest ratio that any width gives stands beside it, and the bound of Sellke, Bayarri & \
     Berger (2001) on what the tail probability could be worth to any prior.",
    "A hypothesis whose posterior is its prior is untested: no odds. So is one that everything feels, where odd multipoles alone \
     are kept: they see of it only how matter has grown.",
    "One departure for all against one each: where the study has a `constant` and a `per-bin` (or `per-survey`) hypothesis with the same \
     prior, the ratio of their evidences, which moves with the prior's width, and the suspiciousness, which does not (Handley & Lemos \
     2019), with its degrees of freedom and tail probability.",
    "The best of many bins, or of many shapes, is far out more often than one alone: the global tail stands beside the local one. \
     Averages over hypotheses weigh each by its probability.",
    "With noise `percival` and an exponent that makes no density, only odds are given. A blinded study is not weighed. An evidence \
     is no detection: it knows no hypothesis but those listed.",
];

/// The page of an estimator; `None` for another topic.
pub fn manual_estimator(topic: &str, style: Style) -> Option<String> {
    let family = estimator_families().iter().find(|family| family.name == topic)?;
    let mut out = format!("{}\n\n", style.strong(&format!("estimator `{}`", family.name)));
    out.push_str(&wrapped("  ", 2, family.summary));
    for paragraph in family.manual.split("\n\n") {
        out.push('\n');
        out.push_str(&wrapped("  ", 2, paragraph));
    }
    Some(out)
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
    fn every_estimator_has_a_page_and_a_topic() {
        let (topics, weigh) = (manual_topics(Style::Plain), manual_weigh(Style::Plain));
        for family in estimator_families() {
            assert!(topics.lines().any(|line| line.starts_with(&format!("  {} ", family.name))), "{topics}");
            assert!(weigh.contains(&format!("  {}: ", family.name)), "{weigh}");
            let page = manual_estimator(family.name, Style::Plain).expect("it is registered");
            let flowing = |text: &str| text.split_whitespace().collect::<Vec<_>>().join(" ");
            assert!(flowing(&page).contains(&flowing(family.manual)), "{page}");
            let widest = page.lines().chain(weigh.lines()).map(UnicodeWidthStr::width).max();
            assert!(widest <= Some(PAGE), "{page}");
        }
        assert!(manual_estimator("constant", Style::Plain).is_none());
    }

    #[test]
    fn pages_about_the_measurements_are_listed_and_fit() {
        let topics = manual_topics(Style::Plain);
        for page in data_pages() {
            assert!(topics.contains(&format!("  {} ", page.name)), "{topics}");
            let text = manual_data(&page, Style::Plain);
            let flowing = text.split_whitespace().collect::<Vec<_>>().join(" ");
            assert!(flowing.starts_with(&format!("{}: {}", page.name, page.summary)), "{text}");
            assert!(flowing.contains(&page.text.split_whitespace().collect::<Vec<_>>().join(" ")), "{text}");
            for (key, meaning) in &page.entries {
                assert!(flowing.contains(&format!("{key}: {meaning}")), "{text}");
            }
            assert!(text.lines().map(UnicodeWidthStr::width).max() <= Some(PAGE), "{text}");
        }
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
