//! `--set NAME=VALUE`: a quantity given on the command line in place of the file's.

use toml_edit::Document;

use super::places::QuantityPlace;
use super::section::{Reader, Section};
use super::source::{Located, Source};
use super::{Quantity, StudyFile};
use crate::error::StudyError;
use crate::fault::Fault;

/// One `--set NAME=VALUE`, parsed.
#[derive(Clone, Debug, PartialEq)]
pub struct Override {
    /// The dotted name.
    pub name: String,
    /// The quantity to use, a number or a prior in TOML.
    pub quantity: Located<Quantity>,
    /// As typed, with `--set` in front: errors begin with it.
    pub option: String,
}

impl Override {
    /// Reads the text behind `--set`.
    ///
    /// # Errors
    /// [`StudyError::Problems`] for a text without `=`, such as `tau`, and a value that is neither a number nor a prior.
    pub fn parse(text: &str) -> Result<Self, StudyError> {
        let option = format!("--set {text}");
        let (name, value) = match text.split_once('=') {
            Some((name, value)) if !name.trim().is_empty() && !value.trim().is_empty() => {
                (name.trim(), value.trim())
            }
            _ => {
                let source = Source::of_option(option, "");
                let reader = Reader::new(&source);
                reader.fault(None, Fault::SetForm { text: text.to_owned() });
                return StudyError::unless_none(reader.into_problems(), None);
            }
        };
        // The name is the key, so that messages about the value speak of it.
        let source = Source::of_option(option.clone(), format!("{} = {value}\n", quoted(name)));
        let reader = Reader::new(&source);
        let quantity = match Document::parse(source.text()) {
            Ok(document) if document.as_table().len() == 1 => {
                Section::new(&reader, document.as_table(), None, "set", "--set").quantity(name)
            }
            _ => {
                let found = format!("`{value}`");
                reader.fault(None, Fault::NotAQuantity { name: name.to_owned(), found });
                None
            }
        };
        let quantity = StudyError::unless_none(reader.into_problems(), quantity)?;
        Ok(Self { name: name.to_owned(), quantity, option })
    }
}

/// A TOML key that is taken as it stands.
fn quoted(name: &str) -> String {
    let escaped: String = name
        .chars()
        .flat_map(|letter| match letter {
            '"' | '\\' => vec!['\\', letter],
            letter => vec![letter],
        })
        .collect();
    format!("\"{escaped}\"")
}

impl StudyFile {
    /// Puts a quantity in the place of the one of that name. Returns whether the file has a place for it; a departure's
    /// parameters have theirs in the hypotheses.
    pub(crate) fn set(&mut self, name: &str, quantity: &Located<Quantity>) -> bool {
        let place = self.places().into_iter().find(|(known, _)| known == name);
        match place {
            Some((_, QuantityPlace::Given(place))) => *place = quantity.clone(),
            Some((_, QuantityPlace::Optional(place))) => *place = Some(quantity.clone()),
            None => return false,
        }
        true
    }
}
