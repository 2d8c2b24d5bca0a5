//! Runs as a table for a paper, a note, or another program.

use oddwell_study::record::{ParameterSummary, Summary};

use crate::numbers::{probability, rounded, significant, two_digits};

/// How a table is written.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TableFormat {
    /// A `tabular` of LaTeX, rounded.
    Latex,
    /// A table of Markdown, rounded.
    Markdown,
    /// A line a run and parameter, every digit.
    Csv,
}

/// A table of runs: a line a parameter and a column a run (mean and standard deviation, with two digits of the latter), then
/// how each fits; as CSV a line a run and parameter with all that its summary has, every digit.
///
/// What is withheld because measurements are blinded is `hidden` (empty in CSV), what a run does not have is a dash (empty
/// in CSV), and a run that did not converge is marked.
#[must_use]
pub fn run_table(summaries: &[Summary], format: TableFormat) -> String {
    match format {
        TableFormat::Csv => csv(summaries),
        TableFormat::Markdown => markdown(&Rounded::new(summaries, "–", " ± ")),
        TableFormat::Latex => latex(&Rounded::new(summaries, "--", r" \pm ")),
    }
}

/// The table of rounded numbers, cell by cell.
struct Rounded {
    header: Vec<String>,
    parameters: Vec<Vec<String>>,
    fits: Vec<Vec<String>>,
}

impl Rounded {
    fn new(summaries: &[Summary], dash: &str, plus_minus: &str) -> Rounded {
        let mut names: Vec<&str> = Vec::new();
        for name in summaries.iter().flat_map(|summary| summary.parameters.keys()) {
            if !names.contains(&name.as_str()) {
                names.push(name);
            }
        }
        let heading = |summary: &Summary| match summary.converged {
            true => summary.hypothesis.clone(),
            false => format!("{} (not converged)", summary.hypothesis),
        };
        let value = |summary: &Summary, name: &str| match summary.parameters.get(name) {
            None => dash.to_owned(),
            Some(parameter) => match (parameter.mean, parameter.sd) {
                (Some(mean), Some(sd)) => format!("{}{plus_minus}{}", rounded(mean, sd), two_digits(sd)),
                (None, Some(sd)) if summary.blinded => format!("hidden{plus_minus}{}", two_digits(sd)),
                _ => dash.to_owned(),
            },
        };
        let row = |name: &str, cell: &dyn Fn(&Summary) -> String| -> Vec<String> {
            std::iter::once(name.to_owned()).chain(summaries.iter().map(cell)).collect()
        };
        let or_dash = |text: Option<String>| text.unwrap_or_else(|| dash.to_owned());
        let fits = vec![
            row("chi2", &|summary| format!("{:.1}", summary.best.chi2)),
            row("data points", &|summary| summary.best.data_points.to_string()),
            row("effective parameters", &|summary| {
                or_dash(summary.best.effective_parameters.map(|number| format!("{number:.1}")))
            }),
            row("p-value", &|summary| or_dash(summary.best.p_value.map(probability))),
            row("sigma from general relativity", &|summary| {
                or_dash(summary.general_relativity.sigma.map(|sigma| significant(sigma, 2)))
            }),
        ];
        Rounded {
            header: std::iter::once("parameter".to_owned()).chain(summaries.iter().map(heading)).collect(),
            parameters: names.iter().map(|name| row(name, &|summary| value(summary, name))).collect(),
            fits,
        }
    }
}

fn markdown(table: &Rounded) -> String {
    let line = |cells: &[String]| {
        format!("| {} |\n", cells.iter().map(|cell| cell.replace('|', "\\|")).collect::<Vec<_>>().join(" | "))
    };
    let rule = format!("|---|{}\n", "---:|".repeat(table.header.len() - 1));
    let rows = table.parameters.iter().chain(&table.fits).map(|row| line(row));
    line(&table.header) + &rule + &rows.collect::<String>()
}

fn latex(table: &Rounded) -> String {
    let mut out = format!("\\begin{{tabular}}{{l{}}}\n\\hline\n", "r".repeat(table.header.len() - 1));
    let words = |cells: &[String]| cells.iter().map(|cell| plain(cell)).collect::<Vec<_>>().join(" & ");
    out.push_str(&format!("{} \\\\\n\\hline\n", words(&table.header)));
    let numbers = |row: &[String]| {
        let values = row[1..].iter().map(|cell| match cell.as_str() {
            "--" => "--".to_owned(),
            hidden if hidden.starts_with("hidden") => {
                format!("hidden ${}$", hidden.trim_start_matches("hidden").trim())
            }
            number => format!("${number}$"),
        });
        std::iter::once(format!("\\texttt{{{}}}", plain(&row[0])))
            .chain(values)
            .collect::<Vec<_>>()
            .join(" & ")
    };
    for row in &table.parameters {
        out.push_str(&format!("{} \\\\\n", numbers(row)));
    }
    out.push_str("\\hline\n");
    for row in &table.fits {
        let name = if row[0] == "chi2" { "$\\chi^2$".to_owned() } else { plain(&row[0]) };
        let values =
            row[1..].iter().map(|cell| if cell == "--" { cell.clone() } else { format!("${cell}$") });
        let cells: Vec<String> = std::iter::once(name).chain(values).collect();
        out.push_str(&format!("{} \\\\\n", cells.join(" & ")));
    }
    out + "\\hline\n\\end{tabular}\n"
}

/// Text in which nothing is a command of LaTeX.
fn plain(text: &str) -> String {
    let mut out = String::new();
    for letter in text.chars() {
        match letter {
            '&' | '%' | '$' | '#' | '_' | '{' | '}' => out.extend(['\\', letter]),
            '\\' => out.push_str("\\textbackslash{}"),
            '~' => out.push_str("\\textasciitilde{}"),
            '^' => out.push_str("\\textasciicircum{}"),
            other => out.push(other),
        }
    }
    out
}

fn csv(summaries: &[Summary]) -> String {
    let mut out = String::from(
        "study,hypothesis,converged,blinded,parameter,mean,sd,median,low68,high68,low95,high95,prior_mean,prior_sd,ess,ess_tail,rhat,mcse\n",
    );
    let quoted = |text: &str| match text.contains([',', '"', '\n', '\r']) {
        true => format!("\"{}\"", text.replace('"', "\"\"")),
        false => text.to_owned(),
    };
    for summary in summaries {
        for (name, parameter) in &summary.parameters {
            let ParameterSummary {
                mean,
                sd,
                median,
                interval68,
                interval95,
                prior_mean,
                prior_sd,
                ess,
                ess_tail,
                rhat,
                mcse,
            } = parameter;
            let end = |interval: &Option<[f64; 2]>, index: usize| interval.map(|ends| ends[index]);
            let numbers = [
                *mean,
                *sd,
                *median,
                end(interval68, 0),
                end(interval68, 1),
                end(interval95, 0),
                end(interval95, 1),
                *prior_mean,
                *prior_sd,
                *ess,
                *ess_tail,
                *rhat,
                *mcse,
            ];
            let mut cells = vec![
                quoted(&summary.study),
                quoted(&summary.hypothesis),
                summary.converged.to_string(),
                summary.blinded.to_string(),
                quoted(name),
            ];
            cells.extend(
                numbers.map(|number| number.map_or_else(String::new, |number| format!("{number:?}"))),
            );
            out.push_str(&cells.join(","));
            out.push('\n');
        }
    }
    out
}
