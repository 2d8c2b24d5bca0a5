//! Keys that a [[survey]] and a [[joint_covariance]] have in common: noise, and what is made of a covariance.

use oddwell_likelihood::noise_families;
use toml_edit::{Item, Value};

use super::section::Section;
use super::source::Located;

/// Two names between which a covariance is declared empty.
pub type EmptyBlock = (String, String);

/// `noise`, one of [`noise_families`]; default `gaussian`.
pub(super) fn read_noise(section: &Section<'_>) -> Option<Located<&'static str>> {
    if section.find("noise").is_none() {
        return Some(Located::default_of("gaussian"));
    }
    let choices: Vec<_> = noise_families().iter().map(|family| (family.name, family.name)).collect();
    section.choice("noise", "noise model", &choices, "\"gaussian\"")
}

/// `mock_count`.
pub(super) fn read_mock_count(section: &Section<'_>) -> Option<Located<u64>> {
    section.count("mock_count", (2, u64::from(u32::MAX)), "at least 2", "600")
}

/// `determined`.
pub(super) fn read_determined(section: &Section<'_>) -> Option<Located<u64>> {
    section.count("determined", (1, u64::from(u32::MAX)), "at least 1", "5")
}

/// `empty_blocks`, a list of pairs of names. None: wrong. Some(None): not given.
pub(super) fn read_empty_blocks(section: &Section<'_>) -> Option<Option<Located<Vec<EmptyBlock>>>> {
    let Some((_, item)) = section.find("empty_blocks") else { return Some(None) };
    let pair = |value: &Value| match value.as_array()?.iter().collect::<Vec<_>>()[..] {
        [one, other] => Some((one.as_str()?.to_owned(), other.as_str()?.to_owned())),
        _ => None,
    };
    let list = item.as_array().filter(|list| !list.is_empty());
    let Some(value) = list.and_then(|list| list.iter().map(pair).collect::<Option<Vec<_>>>()) else {
        wrong_blocks(section, item);
        return None;
    };
    Some(Some(Located { value, origin: section.origin("empty_blocks", item) }))
}

fn wrong_blocks(section: &Section<'_>, item: &Item) {
    section.wrong_type("empty_blocks", "a list of pairs of names", item, "[[\"near\", \"far\"]]");
}
