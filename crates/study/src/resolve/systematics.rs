//! Which quantities a `[[systematic]]` moves.

use super::Entry;
use super::checker::Checker;
use crate::fault::Fault;
use crate::file::{MoveEntry, Quantity, StudyFile};
use crate::nearest::Nearest;

/// One systematic moving one quantity: quantity += by · amplitude.
#[derive(Clone, Debug, PartialEq)]
pub struct Move {
    /// Index of the quantity that is moved.
    pub(crate) quantity: usize,
    /// Index of the amplitude, itself a quantity.
    pub(crate) amplitude: usize,
    /// How far an amplitude of 1 moves it.
    pub by: f64,
}

/// Matches the moves of all systematics with the quantities of the file.
///
/// A name must be that of one quantity; a pattern takes every quantity that it matches and that follows no other.
pub(super) fn moves(file: &StudyFile, entries: &[Entry], checker: &mut Checker<'_>) -> Vec<Move> {
    let mut moves = Vec::new();
    for systematic in &file.systematics {
        let name = &systematic.name.value;
        let amplitude_name = format!("systematic.{name}");
        let Some(amplitude) = entries.iter().position(|entry| entry.name == amplitude_name) else {
            continue;
        };
        for entry in &systematic.moves {
            match targets(name, entry, entries) {
                Ok(targets) => {
                    let by = entry.by.value;
                    moves.extend(targets.into_iter().map(|quantity| Move { quantity, amplitude, by }));
                }
                Err(fault) => checker.fault(entry.quantity.origin, "quantity", fault),
            }
        }
    }
    moves
}

fn targets(systematic: &str, entry: &MoveEntry, entries: &[Entry]) -> Result<Vec<usize>, Fault> {
    let (systematic, pattern) = (systematic.to_owned(), entry.quantity.value.clone());
    if ["departure", "systematic"].contains(&pattern.split('.').next().unwrap_or_default()) {
        return Err(Fault::MovesForbidden { systematic, pattern });
    }
    let movable =
        |entry: &Entry| !entry.name.starts_with("systematic.") && entry.name != "prediction.clock_distance";
    let mut targets = Vec::new();
    for (index, entry) in entries.iter().enumerate().filter(|(_, entry)| movable(entry)) {
        if !matches(&pattern, &entry.name) {
            continue;
        }
        match &entry.given.value {
            Quantity::SameAs(_) if pattern.contains('*') => {}
            Quantity::SameAs(source) => {
                let (quantity, source_name) = (entry.name.clone(), source.clone());
                return Err(Fault::MovesTied { systematic, quantity, source_name });
            }
            Quantity::Held(_) | Quantity::Prior(_) => targets.push(index),
        }
    }
    if targets.is_empty() {
        let names = entries
            .iter()
            .filter(|entry| movable(entry) && !matches!(entry.given.value, Quantity::SameAs(_)))
            .map(|entry| with_stars(&pattern, &entry.name));
        let mut known: Vec<String> = Vec::new();
        for name in names {
            if !known.contains(&name) {
                known.push(name);
            }
        }
        let nearest = Nearest::find(&pattern, known);
        return Err(Fault::MovesNothing { systematic, pattern, nearest });
    }
    Ok(targets)
}

/// Whether a pattern matches a dotted name: part by part, `*` any part.
fn matches(pattern: &str, name: &str) -> bool {
    let (pattern, name) = (pattern.split('.'), name.split('.'));
    pattern.clone().count() == name.clone().count()
        && pattern.zip(name).all(|(wanted, part)| wanted == "*" || wanted == part)
}

/// The name with a star wherever the pattern has one, for a suggestion in the pattern's own style.
fn with_stars(pattern: &str, name: &str) -> String {
    let parts: Vec<&str> = name.split('.').collect();
    let wanted: Vec<&str> = pattern.split('.').collect();
    if parts.len() != wanted.len() {
        return name.to_owned();
    }
    let starred: Vec<&str> =
        parts.iter().zip(&wanted).map(|(part, wanted)| if *wanted == "*" { "*" } else { part }).collect();
    starred.join(".")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_star_is_one_part_and_no_more() {
        assert!(matches("larkfield.*.first.evolution", "larkfield.near.first.evolution"));
        assert!(matches("*.*.first.evolution", "northmoor.far.first.evolution"));
        assert!(!matches("larkfield.*.evolution", "larkfield.near.first.evolution"));
        assert!(!matches("larkfield.*.first.evolution", "larkfield.near.second.evolution"));
        assert!(!matches("lark*.near.first.evolution", "larkfield.near.first.evolution"));
        assert!(!matches("*", "background.h"));
    }

    #[test]
    fn suggestions_keep_the_stars() {
        assert_eq!(with_stars("a.*.first.evolutoin", "a.near.first.evolution"), "a.*.first.evolution");
        assert_eq!(with_stars("a.*", "a.near.offset"), "a.near.offset");
    }
}
