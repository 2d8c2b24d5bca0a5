//! Rules for names.

use super::checker::Checker;
use crate::fault::Fault;
use crate::file::{Located, StudyFile};

/// First parts of dotted names that are not surveys.
const NOT_A_SURVEY: [&str; 5] = ["background", "prediction", "systematic", "departure", "derived"];
/// `SURVEY.template.NAME` is the amplitude of a template.
const NOT_A_BIN: [&str; 1] = ["template"];
/// `--hypothesis all` means every one.
const NOT_A_HYPOTHESIS: [&str; 1] = ["all"];

/// Checks every name of the study, and that every survey has bins.
pub(super) fn check(file: &StudyFile, checker: &mut Checker<'_>) {
    check_names(checker, "survey", file.surveys.iter().map(|each| &each.name), &NOT_A_SURVEY);
    for survey in &file.surveys {
        check_names(checker, "bin", survey.bins.iter().map(|bin| &bin.name), &NOT_A_BIN);
        check_names(checker, "template", survey.templates.iter().map(|each| &each.name), &[]);
        if survey.bins.is_empty() {
            let fault = Fault::Empty {
                section: format!("survey `{}`", survey.name.value),
                part: "bin",
                example: "a [[survey.bin]] below it",
            };
            checker.fault(survey.name.origin, "name", fault);
        }
    }
    check_names(checker, "systematic", file.systematics.iter().map(|each| &each.name), &[]);
    check_names(checker, "hypothesis", file.hypotheses.iter().map(|each| &each.name), &NOT_A_HYPOTHESIS);
}

fn check_names<'a>(
    checker: &mut Checker<'_>,
    what: &'static str,
    names: impl Iterator<Item = &'a Located<String>>,
    reserved: &[&str],
) {
    let mut seen: Vec<&Located<String>> = Vec::new();
    for located in names {
        let name = located.value.clone();
        let allowed = |letter: char| letter.is_alphanumeric() || letter == '-' || letter == '_';
        let fault = if !name.chars().all(allowed) {
            Some(Fault::BadName { what, name })
        } else if reserved.contains(&name.as_str()) {
            Some(Fault::ReservedName { what, name })
        } else {
            let first = seen.iter().find(|other| other.value == name).and_then(|other| other.origin.line());
            first.map(|first_line| Fault::DuplicateName { what, name, first_line })
        };
        if let Some(fault) = fault {
            checker.fault(located.origin, "name", fault);
        }
        seen.push(located);
    }
}
