//! `[survey.design]` and `design` of a bin: how a survey is made, for `simulate` to draw its measurements from.

use toml_edit::{Item, Value};

use super::section::{Section, numbers_of};
use super::source::{Located, Origin};
use crate::fault::Fault;

/// More rows than this of one multipole of one bin are a slip of the width.
const MOST_ROWS: usize = 1000;

/// `[survey.design]`: which multipoles, in which shells.
#[derive(Clone, Debug, PartialEq)]
pub struct DesignSection {
    /// Multipoles of the cross-correlation, 0 to 4, none twice; default 1 and 3.
    pub multipoles: Located<Vec<u8>>,
    /// Edges of shells, Mpc/h, or of wavenumber bins, h/Mpc; rising, at least two.
    pub edges: Located<Vec<f64>>,
    /// Whether the edges are wavenumbers.
    pub fourier: bool,
    /// Square degrees on the sky, of bins whose `design` gives redshifts.
    pub area: Option<Located<f64>>,
    /// Where it stands.
    pub origin: Origin,
}

/// `design` of a bin: how much was seen of it, and how densely.
#[derive(Clone, Debug, PartialEq)]
pub struct BinDesignSection {
    /// (Mpc/h)³; given exactly where `redshifts` is not.
    pub volume: Option<Located<f64>>,
    /// The redshifts between which the bin lies; its volume follows from the survey's `area`.
    pub redshifts: Option<Located<(f64, f64)>>,
    /// Number density of the first tracer, (h/Mpc)³.
    pub first_density: Located<f64>,
    /// Number density of the second tracer, (h/Mpc)³.
    pub second_density: Located<f64>,
    /// Where it stands.
    pub origin: Origin,
}

const SHELLS: &str = "{ low = 24.0, high = 144.0, width = 8.0 }";

impl DesignSection {
    /// Reads the key `design` of a survey, where it is there. None: wrong.
    pub(super) fn read(survey: &Section<'_>) -> Option<Option<Self>> {
        let Some((_, item)) = survey.find("design") else {
            return Some(None);
        };
        let example = "{ separation = { low = 24.0, high = 144.0, width = 8.0 } }";
        let section = survey.table("design", "design", "[survey.design]", example)?;
        let multipoles = read_multipoles(&section);
        let (separation, wavenumber) = (section.find("separation"), section.find("wavenumber"));
        let fourier = wavenumber.is_some();
        let edges = match (separation, wavenumber) {
            (None, None) => {
                section.missing("separation", &format!("separation = {SHELLS}"));
                None
            }
            (Some(_), Some(_)) => {
                let (one, other) = ("separation", "wavenumber");
                let way_out = "a design is of one space; give the other a survey of its own";
                section.fault_at("wavenumber", Fault::Excluded { one, other, way_out });
                None
            }
            (Some((_, item)), None) => read_edges(&section, "separation", item),
            (None, Some((_, item))) => read_edges(&section, "wavenumber", item),
        };
        let area = match section.find("area") {
            Some(_) => section.number("area", "5000.0").map(Some),
            None => Some(None),
        };
        section.finish();
        let origin = survey.origin("design", item);
        Some(Some(Self { multipoles: multipoles?, edges: edges?, fourier, area: area?, origin }))
    }

    /// What stands at the middle of each shell, with its edges.
    pub fn shells(&self) -> impl Iterator<Item = (f64, (f64, f64))> + '_ {
        self.edges.value.windows(2).map(|edges| (0.5 * (edges[0] + edges[1]), (edges[0], edges[1])))
    }
}

fn read_multipoles(section: &Section<'_>) -> Option<Located<Vec<u8>>> {
    let Some((_, item)) = section.find("multipoles") else {
        return Some(Located::default_of(vec![1, 3]));
    };
    let whole: Option<Vec<i64>> = item
        .as_array()
        .filter(|list| !list.is_empty())
        .and_then(|list| list.iter().map(Value::as_integer).collect());
    let Some(whole) = whole else {
        section.wrong_type("multipoles", "a list of multipoles", item, "[1, 3]");
        return None;
    };
    let mut multipoles = Vec::new();
    for multipole in whole {
        match u8::try_from(multipole) {
            Ok(multipole) if multipole <= 4 && !multipoles.contains(&multipole) => multipoles.push(multipole),
            _ => {
                let (name, rule, value) =
                    ("multipoles".to_owned(), "0, 1, 2, 3 or 4, each once", multipole.to_string());
                let fault = Fault::OutOfRange { name, rule, value, way_out: "remove it from the list" };
                section.fault_at("multipoles", fault);
                return None;
            }
        }
    }
    Some(Located { value: multipoles, origin: section.origin("multipoles", item) })
}

/// A list of edges, or `{ low, high, width }`.
fn read_edges(section: &Section<'_>, key: &'static str, item: &Item) -> Option<Located<Vec<f64>>> {
    let value = match item.as_table_like() {
        Some(_) => regular(section, key)?,
        None => match numbers_of(item).filter(|edges| edges.len() > 1) {
            Some(edges) => edges,
            None => {
                section.wrong_type(key, "edges, or their low end, high end and width", item, SHELLS);
                return None;
            }
        },
    };
    if let Some(value) = value.iter().copied().find(|edge| !edge.is_finite()) {
        section.fault_at(key, Fault::NotFinite { name: key.to_owned(), value });
        return None;
    }
    let out_of_range = |rule, value: String, way_out| {
        section.fault_at(key, Fault::OutOfRange { name: key.to_owned(), rule, value, way_out });
    };
    if value[0] < 0.0 {
        out_of_range("of edges 0 or above", format!("{:?}", value[0]), "raise the low end");
        return None;
    }
    if let Some(pair) = value.windows(2).find(|pair| pair[0] >= pair[1]) {
        out_of_range("of rising edges", format!("{:?} before {:?}", pair[0], pair[1]), "sort them");
        return None;
    }
    Some(Located { value, origin: section.origin(key, item) })
}

/// Edges from `low` to `high`, as many times `width` as fit.
fn regular(section: &Section<'_>, key: &'static str) -> Option<Vec<f64>> {
    let table = section.table(key, "shells", format!("`{key}` of [survey.design]"), SHELLS)?;
    for (end, example) in [("low", "low = 24.0"), ("high", "high = 144.0"), ("width", "width = 8.0")] {
        if table.find(end).is_none() {
            table.missing(end, example);
        }
    }
    let ends = (table.number("low", "24.0"), table.number("high", "144.0"), table.number("width", "8.0"));
    let read = match ends {
        (Some(low), Some(high), Some(width)) => {
            let (low, high, width) = (low.value, high.value, width.value);
            // A last shell that misses its width by rounding alone is whole.
            let count = ((high - low) / width + 1e-9).floor();
            if width > 0.0 && count >= 1.0 && count <= MOST_ROWS as f64 {
                Some((0..=count as usize).map(|index| low + width * index as f64).collect())
            } else {
                let rule = "above 0, and such that 1 to 1000 shells fit between low and high";
                let (name, value) = ("width".to_owned(), format!("{width:?}"));
                let way_out = "change the width, or the ends";
                table.fault_at("width", Fault::OutOfRange { name, rule, value, way_out });
                None
            }
        }
        _ => None,
    };
    table.finish();
    read
}

impl BinDesignSection {
    /// Reads the key `design` of a bin, where it is there. None: wrong.
    pub(super) fn read(bin: &Section<'_>) -> Option<Option<Self>> {
        let Some((_, item)) = bin.find("design") else {
            return Some(None);
        };
        let example = "{ volume = 2.0e9, first_density = 8.0e-4, second_density = 3.0e-3 }";
        let section = bin.table("design", "bin-design", "`design` of [[survey.bin]]", example)?;
        let volume = match section.find("volume") {
            Some(_) => section.number("volume", "2.0e9").map(Some),
            None => Some(None),
        };
        let redshifts = match section.find("redshifts") {
            Some((_, item)) => match numbers_of(item).as_deref() {
                Some(&[low, high]) => {
                    Some(Some(Located { value: (low, high), origin: section.origin("redshifts", item) }))
                }
                _ => {
                    section.wrong_type("redshifts", "a list of two numbers, [low, high]", item, "[0.3, 0.5]");
                    None
                }
            },
            None => Some(None),
        };
        if section.find("volume").is_none() && section.find("redshifts").is_none() {
            section.missing("volume", "volume = 2.0e9");
        }
        if section.find("volume").is_some() && section.find("redshifts").is_some() {
            let (one, other) = ("volume", "redshifts");
            let way_out = "give the volume, or the redshifts between which the survey's `area` was seen";
            section.fault_at("redshifts", Fault::EitherOr { one, other, way_out });
        }
        let density = |key: &'static str, example: &'static str, line: &str| {
            if section.find(key).is_none() {
                section.missing(key, line);
            }
            section.number(key, example)
        };
        let first_density = density("first_density", "8.0e-4", "first_density = 8.0e-4");
        let second_density = density("second_density", "3.0e-3", "second_density = 3.0e-3");
        section.finish();
        Some(Some(Self {
            volume: volume?,
            redshifts: redshifts?,
            first_density: first_density?,
            second_density: second_density?,
            origin: bin.origin("design", item),
        }))
    }
}
