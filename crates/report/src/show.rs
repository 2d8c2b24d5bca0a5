//! The resolved study as a table: every quantity, held, inferred, tied or derived, with where it was given.

use oddwell_study::{Hypothesis, Kind, Study, describe};

use crate::style::Style;
use crate::text::padded;

/// The quantities of a hypothesis, a line each: name, held or inferred or tied, where it was given, and the value, prior
/// or source with what systematics add to it. The value stands last because it may be long.
pub fn show_table(study: &Study, hypothesis: &Hypothesis, style: Style) -> String {
    let quantities = describe(study, hypothesis);
    let cells =
        |name: &str, state: &str, origin: &str, value: &str| [name, state, origin, value].map(str::to_owned);
    let rows: Vec<(Kind, [String; 4])> = quantities
        .iter()
        .map(|each| (each.kind, cells(&each.name, each.kind.word(), &each.origin, &each.value)))
        .collect();
    let header = cells("quantity", "is", "given in", "value, prior or source");
    let width = |column: usize| {
        let widths = rows.iter().map(|(_, row)| row[column].chars().count());
        widths.chain([header[column].chars().count()]).max().unwrap_or(0)
    };
    let widths = [width(0), width(1), width(2)];
    let line = |row: &[String; 4]| {
        let mut out = String::new();
        for (cell, width) in row.iter().zip(widths) {
            out.push_str(&padded(cell, width));
            out.push_str("  ");
        }
        out.push_str(&row[3]);
        out
    };
    let inferred = rows.iter().filter(|(kind, _)| *kind == Kind::Inferred).count();
    let mut out = format!(
        "{}\n{}; {inferred} of {} quantities inferred\n\n{}\n",
        style.strong(&study.file.title.value),
        who(hypothesis),
        rows.iter().filter(|(kind, _)| *kind != Kind::Derived).count(),
        style.strong(&line(&header)),
    );
    for (kind, row) in &rows {
        let line = line(row);
        out.push_str(&match kind {
            Kind::Inferred => line,
            Kind::Held | Kind::Tied | Kind::Derived => style.faint(&line),
        });
        out.push('\n');
    }
    out
}

/// The same as JSON: a list of objects with `name`, `kind`, `value`, `line` (null for a default or `--set`), `origin`.
pub fn show_json(study: &Study, hypothesis: &Hypothesis) -> serde_json::Value {
    let quantities = describe(study, hypothesis);
    quantities
        .iter()
        .map(|each| {
            serde_json::json!({
                "name": each.name,
                "kind": each.kind.word(),
                "value": each.value,
                "line": each.line,
                "origin": each.origin,
            })
        })
        .collect()
}

fn who(hypothesis: &Hypothesis) -> String {
    let (name, shape) = (&hypothesis.name, hypothesis.shape.name());
    if hypothesis.shape.parameters().is_empty() && shape == "none" {
        return format!("hypothesis `{name}`: no departure");
    }
    format!("hypothesis `{name}`: departure {shape}, felt by {}", hypothesis.felt_by.name())
}

#[cfg(test)]
mod tests {
    use super::*;
    use oddwell_study::{Override, StudyFile};

    const STUDY: &str = r#"title = "One invented survey"
[background]
omega_m = 0.31
omega_b = 0.049
h = 0.68
n_s = 0.965
sigma8 = { normal = [0.81, 0.01] }
[[survey]]
name = "larkfield"
multipoles = "larkfield.csv"
[[survey.bin]]
name = "near"
redshift = 0.35
first = { bias = 2.1, magnification = 0.5, evolution = { normal = [0.0, 0.3] } }
second = { bias = 1.2, magnification = 0.2, evolution = { same_as = "larkfield.near.first.evolution" } }
[[systematic]]
name = "counts"
amplitude = { normal = [0.0, 1.0] }
moves = [{ quantity = "larkfield.near.first.evolution", by = 0.3 }]
[[hypothesis]]
name = "gr"
departure = "none"
[[hypothesis]]
name = "constant"
departure = "constant"
felt_by = "light"
tau = { uniform = [-30.0, 30.0] }
"#;

    fn study() -> Study {
        let file = StudyFile::parse("study.toml", STUDY, "").expect("valid TOML");
        let set = Override::parse("larkfield.near.offset=10.0").expect("a number");
        Study::resolve(file, &[set]).expect("a valid study")
    }

    #[test]
    fn every_quantity_stands_on_a_line() {
        let study = study();
        assert_eq!(
            show_table(&study, &study.hypotheses[1], Style::Plain),
            "\
One invented survey
hypothesis `constant`: departure constant, felt by light; 4 of 22 quantities inferred

quantity                             is        given in  value, prior or source
background.omega_m                   held      line 3    0.31
background.omega_b                   held      line 4    0.049
background.h                         held      line 5    0.68
background.n_s                       held      line 6    0.965
background.sigma8                    inferred  line 7    { normal = [0.81, 0.01] }
background.omega_k                   held      default   0.0
background.w0                        held      default   -1.0
background.wa                        held      default   0.0
prediction.damping                   held      default   0.5
prediction.smearing                  held      default   0.0
prediction.clock_distance            held      default   50.0
larkfield.near.offset                held      --set     10.0
larkfield.near.first.bias            held      line 14   2.1
larkfield.near.first.magnification   held      line 14   0.5
larkfield.near.first.evolution       inferred  line 14   { normal = [0.0, 0.3] } + 0.3 * systematic.counts
larkfield.near.first.bias_slope      held      default   0.0
larkfield.near.second.bias           held      line 15   1.2
larkfield.near.second.magnification  held      line 15   0.2
larkfield.near.second.evolution      tied      line 15   same as larkfield.near.first.evolution
larkfield.near.second.bias_slope     held      default   0.0
systematic.counts                    inferred  line 18   { normal = [0.0, 1.0] }
departure.tau                        inferred  line 27   { uniform = [-30.0, 30.0] }
"
        );
    }

    #[test]
    fn no_departure_is_said() {
        let study = study();
        let text = show_table(&study, &study.hypotheses[0], Style::Plain);
        assert_eq!(text.lines().nth(1), Some("hypothesis `gr`: no departure; 3 of 21 quantities inferred"));
    }

    #[test]
    fn only_what_is_held_or_tied_is_faint() {
        let study = study();
        let text = show_table(&study, &study.hypotheses[1], Style::Coloured);
        for line in text.lines().skip(4) {
            assert_eq!(line.contains("\u{1b}[2m"), !line.contains(" inferred "), "{line}");
        }
    }

    #[test]
    fn json_says_the_same() {
        let study = study();
        let json = show_json(&study, &study.hypotheses[1]);
        let list = json.as_array().expect("a list");
        assert_eq!(list.len(), describe(&study, &study.hypotheses[1]).len());
        assert_eq!(
            list.iter().find(|each| each["name"] == "background.sigma8"),
            Some(&serde_json::json!({
                "name": "background.sigma8",
                "kind": "inferred",
                "value": "{ normal = [0.81, 0.01] }",
                "line": 7,
                "origin": "line 7",
            }))
        );
        let offset = list.iter().find(|each| each["name"] == "larkfield.near.offset");
        assert_eq!(
            offset.map(|each| (&each["line"], &each["origin"])),
            Some((&serde_json::Value::Null, &"--set".into()))
        );
    }
}
