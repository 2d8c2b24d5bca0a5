//! Collects what is wrong, each with its place.

use crate::error::{Location, Problem};
use crate::fault::Fault;
use crate::file::{Origin, Override, StudyFile};

/// The problems found so far, and what is needed to say where they are.
pub(super) struct Checker<'a> {
    file: &'a str,
    overrides: &'a [Override],
    pub(super) problems: Vec<Problem>,
}

impl<'a> Checker<'a> {
    pub(super) fn new(file: &'a StudyFile, overrides: &'a [Override]) -> Self {
        Self { file: file.source.name(), overrides, problems: Vec::new() }
    }

    /// Records a broken rule; `name` is the quantity it is about, or a key.
    pub(super) fn fault(&mut self, origin: Origin, name: &str, fault: Fault) {
        let file = self.file.to_owned();
        let location = match origin {
            Origin::Written(place) => Location::File { file, line: place.line, column: place.column },
            Origin::Default => Location::WholeFile { file },
            Origin::Set => {
                let option = self.overrides.iter().rev().find(|each| name_covers(&each.name, name));
                Location::Option {
                    option: option.map_or_else(|| "--set".to_owned(), |each| each.option.clone()),
                }
            }
        };
        self.problems.push(Problem { location, fault });
    }

    pub(super) fn is_clean(&self) -> bool {
        self.problems.is_empty()
    }
}

/// Whether `name` is what was set, or a bin's or survey's share of it (`departure.tau` and `departure.tau.larkfield`).
pub(super) fn name_covers(set: &str, name: &str) -> bool {
    name == set
        || (set.starts_with("departure.") && name.strip_prefix(set).is_some_and(|rest| rest.starts_with('.')))
}
