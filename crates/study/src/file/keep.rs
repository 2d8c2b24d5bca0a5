//! An entry of a survey's `keep`: which measured rows are used.

use oddwell_model::Pair;
use toml_edit::Item;

use super::section::{Section, numbers_of};
use super::source::Located;
use crate::fault::Fault;
use crate::nearest::Nearest;

/// One entry of `keep`; a row passes it if it passes every condition that is given.
#[derive(Clone, Debug, PartialEq)]
pub struct KeepSection {
    /// Low and high separation, both included.
    pub separation: Option<Located<(f64, f64)>>,
    /// Low and high wavenumber, both included.
    pub wavenumber: Option<Located<(f64, f64)>>,
    /// Multipoles, 0 to 4.
    pub multipoles: Option<Located<Vec<u8>>>,
    /// Names of bins.
    pub bins: Option<Located<Vec<String>>>,
    /// Pairs.
    pub pairs: Option<Located<Vec<Pair>>>,
}

impl KeepSection {
    pub(super) fn read(section: Section<'_>) -> Option<Self> {
        let separation = read_range(&section, "separation", "[24.0, 144.0]");
        let wavenumber = read_range(&section, "wavenumber", "[0.01, 0.15]");
        let multipoles = read_list(&section, "multipoles", "a list of multipoles", "[1, 3]", |item| {
            let multipole = item.as_integer()?;
            Some(u8::try_from(multipole).ok().filter(|multipole| *multipole <= 4).ok_or_else(|| {
                let (name, value) = ("multipoles".to_owned(), multipole.to_string());
                Fault::OutOfRange { name, rule: "0, 1, 2, 3 or 4", value, way_out: "remove it from the list" }
            }))
        });
        let bins = read_list(&section, "bins", "a list of bin names", "[\"near\"]", |item| {
            item.as_str().map(|name| Ok(name.to_owned()))
        });
        let pairs = read_list(&section, "pairs", "a list of pairs", "[\"first-second\"]", |item| {
            let name = item.as_str()?;
            Some(Pair::parse(name).ok_or_else(|| {
                let nearest = Nearest::find(name, Pair::ALL.map(Pair::name));
                Fault::UnknownChoice { what: "pair", value: name.to_owned(), nearest }
            }))
        });
        section.finish();
        Some(Self {
            separation: separation?,
            wavenumber: wavenumber?,
            multipoles: multipoles?,
            bins: bins?,
            pairs: pairs?,
        })
    }
}

/// None: wrong. Some(None): not given.
type Given<T> = Option<Option<Located<T>>>;

fn read_range(section: &Section<'_>, key: &'static str, example: &'static str) -> Given<(f64, f64)> {
    let Some((_, item)) = section.find(key) else {
        return Some(None);
    };
    let Some(&[low, high]) = numbers_of(item).as_deref() else {
        section.wrong_type(key, "a list of two numbers, [low, high]", item, example);
        return None;
    };
    if let Some(value) = [low, high].into_iter().find(|end| !end.is_finite()) {
        section.fault_at(key, Fault::NotFinite { name: key.to_owned(), value });
        return None;
    }
    if low >= high {
        let fault = Fault::Inverted { name: key.to_owned(), low, high, way_out: "swap or change them" };
        section.fault_at(key, fault);
        return None;
    }
    Some(Some(Located { value: (low, high), origin: section.origin(key, item) }))
}

/// Reads each entry with `read`: none for the wrong type, else the entry or what is wrong with it.
fn read_list<T>(
    section: &Section<'_>,
    key: &'static str,
    expected: &'static str,
    example: &'static str,
    read: impl Fn(&Item) -> Option<Result<T, Fault>>,
) -> Given<Vec<T>> {
    let Some((_, item)) = section.find(key) else {
        return Some(None);
    };
    let entries: Option<Vec<Result<T, Fault>>> = item
        .as_array()
        .filter(|array| !array.is_empty())
        .and_then(|array| array.iter().map(|value| read(&Item::Value(value.clone()))).collect());
    let Some(entries) = entries else {
        section.wrong_type(key, expected, item, example);
        return None;
    };
    match entries.into_iter().collect() {
        Ok(value) => Some(Some(Located { value, origin: section.origin(key, item) })),
        Err(fault) => {
            section.fault_at(key, fault);
            None
        }
    }
}
