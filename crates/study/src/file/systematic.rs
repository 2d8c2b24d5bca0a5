//! `[[systematic]]`: one error that moves several quantities together.

use super::quantity::Quantity;
use super::section::Section;
use super::source::Located;
use crate::fault::Fault;

/// `[[systematic]]`: every quantity that a move matches gets `by` × amplitude added.
#[derive(Clone, Debug, PartialEq)]
pub struct SystematicSection {
    /// Its amplitude is the parameter `systematic.NAME`.
    pub name: Located<String>,
    /// The amplitude.
    pub amplitude: Located<Quantity>,
    /// What it moves.
    pub moves: Vec<MoveEntry>,
}

/// One entry of `moves`.
#[derive(Clone, Debug, PartialEq)]
pub struct MoveEntry {
    /// Dotted name; `*` stands for any one part between dots.
    pub quantity: Located<String>,
    /// How far an amplitude of 1 moves it, in the quantity's unit; not 0.
    pub by: Located<f64>,
}

impl SystematicSection {
    pub(super) fn read(section: Section<'_>) -> Option<Self> {
        let name = section.required_text("name", "\"luminosity-function\"");
        let amplitude = section.required_quantity("amplitude", "1.0");
        let example = "[{ quantity = \"SURVEY.*.first.evolution\", by = 0.3 }]";
        let moves: Vec<_> = section
            .tables("moves", "move", "an entry of `moves`", example)
            .into_iter()
            .map(MoveEntry::read)
            .collect();
        if section.find("moves").is_none() {
            section.missing("moves", &format!("moves = {example}"));
        } else if section
            .find("moves")
            .is_some_and(|(_, item)| item.as_array().is_some_and(|list| list.is_empty()))
        {
            let fault = Fault::Empty {
                section: "the list `moves`".to_owned(),
                part: "entry",
                example: "what the systematic moves, or remove the systematic",
            };
            section.fault_at("moves", fault);
        }
        section.finish();
        Some(Self { name: name?, amplitude: amplitude?, moves: moves.into_iter().collect::<Option<_>>()? })
    }
}

impl MoveEntry {
    fn read(section: Section<'_>) -> Option<Self> {
        let quantity = section.required_text("quantity", "\"SURVEY.*.first.evolution\"");
        if section.find("by").is_none() {
            section.missing("by", "by = 0.3");
        }
        let by = section.number("by", "0.3");
        if by.as_ref().is_some_and(|by| by.value == 0.0) {
            let fault = Fault::OutOfRange {
                name: "by".to_owned(),
                rule: "different from 0",
                value: "0".to_owned(),
                way_out: "say how far an amplitude of 1 moves the quantity, or remove the entry",
            };
            section.fault_at("by", fault);
        }
        section.finish();
        Some(Self { quantity: quantity?, by: by? })
    }
}
