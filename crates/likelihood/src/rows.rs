//! What a row of a table is about: bin, pair, multipole, and where.

use std::collections::HashMap;

use crate::error::{DataError, Place, nearest, shown};
use crate::header::Header;
use crate::records::{Record, Records, finite_number};

/// The texts of the three pairs; the first is the default.
pub const PAIRS: [&str; 3] = ["first-second", "first-first", "second-second"];

/// Two places `at` closer than this, relatively, are the same place: six digits survive any export, and no two
/// shells lie that close.
pub(crate) const SAME_PLACE: f64 = 1e-6;

/// What a row is measured at.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Axis {
    /// A separation in Mpc/h.
    Separation,
    /// A wavenumber in h/Mpc.
    Wavenumber,
}

impl Axis {
    /// The name of its column.
    pub fn name(self) -> &'static str {
        match self {
            Axis::Separation => "separation",
            Axis::Wavenumber => "wavenumber",
        }
    }
}

/// What identifies a row.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct RowKey {
    pub(crate) bin: String,
    pub(crate) pair: String,
    pub(crate) multipole: u8,
    pub(crate) axis: Axis,
    pub(crate) at: f64,
}

impl std::fmt::Display for RowKey {
    fn fmt(&self, formatter: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let Self { bin, pair, multipole, axis, at } = self;
        write!(formatter, "bin `{bin}`, pair {pair}, multipole {multipole}, {} {at}", axis.name())
    }
}

/// Reads the identifying fields of one line.
pub(crate) struct RowReader<'a> {
    pub(crate) records: &'a Records,
    pub(crate) header: &'a Header,
    pub(crate) record: &'a Record,
}

impl RowReader<'_> {
    /// The text of a column, where the column exists and the field is not empty.
    pub(crate) fn text(&self, name: &str) -> Option<&str> {
        let text = self.record.fields.get(self.header.field(name)?)?;
        (!text.is_empty()).then_some(text)
    }

    pub(crate) fn place(&self, name: &str) -> Place {
        self.records.place(self.record.line, self.header.in_file(name))
    }

    pub(crate) fn needed(&self, name: &str, way_out: &'static str) -> Result<&str, DataError> {
        self.text(name).ok_or_else(|| DataError::EmptyField { place: self.place(name), way_out })
    }

    /// The number of an optional field.
    pub(crate) fn number(&self, name: &str) -> Result<Option<f64>, DataError> {
        self.text(name).map(|text| finite_number(text, || self.place(name))).transpose()
    }

    pub(crate) fn key(&self) -> Result<RowKey, DataError> {
        let (axis, at) = self.at()?;
        Ok(RowKey {
            bin: self.needed("bin", "write the name of a bin of the study")?.to_owned(),
            pair: self.pair()?,
            multipole: self.multipole()?,
            axis,
            at,
        })
    }

    fn multipole(&self) -> Result<u8, DataError> {
        let text = self.needed("multipole", "write 0, 1, 2, 3 or 4")?;
        let value = finite_number(text, || self.place("multipole"))?;
        match [0u8, 1, 2, 3, 4].into_iter().find(|order| f64::from(*order) == value) {
            Some(order) => Ok(order),
            None => Err(DataError::BadMultipole { place: self.place("multipole"), text: shown(text) }),
        }
    }

    fn pair(&self) -> Result<String, DataError> {
        let text = self.text("pair").unwrap_or(PAIRS[0]);
        if PAIRS.contains(&text) {
            return Ok(text.to_owned());
        }
        let way_out = match nearest(text, PAIRS) {
            _ if text == "second-first" => {
                "write first-second, and the odd multipoles with the other sign: they follow the separation from \
                 the first tracer to the second"
                    .to_owned()
            }
            Some(near) => format!("did you mean `{near}`?"),
            None => "an empty field stands for first-second".to_owned(),
        };
        Err(DataError::UnknownPair { place: self.place("pair"), text: shown(text), way_out })
    }

    fn at(&self) -> Result<(Axis, f64), DataError> {
        let (file, line) = (self.records.file.clone(), self.record.line);
        let axis = match (self.text("separation"), self.text("wavenumber")) {
            (Some(_), None) => Axis::Separation,
            (None, Some(_)) => Axis::Wavenumber,
            (Some(separation), Some(wavenumber)) => {
                let (separation, wavenumber) = (separation.to_owned(), wavenumber.to_owned());
                return Err(DataError::TwoAxes { file, line, separation, wavenumber });
            }
            (None, None) => return Err(DataError::NoAxis { file, line }),
        };
        let at = self.number(axis.name())?.unwrap_or_default();
        if at <= 0.0 {
            let way_out = match axis {
                Axis::Separation => "a separation is a length in Mpc/h",
                Axis::Wavenumber => "a wavenumber is counted in h/Mpc",
            };
            return Err(DataError::NotPositive { place: self.place(axis.name()), value: at, way_out });
        }
        Ok((axis, at))
    }
}

/// Bin, pair, multipole and axis.
type Group = (String, String, u8, Axis);

/// Rows by what they are about; finds a row, and so a duplicate.
#[derive(Debug, Default)]
pub(crate) struct RowIndex {
    by_group: HashMap<Group, Vec<(f64, usize)>>,
}

impl RowIndex {
    /// The row for the same thing, `at` compared to one part in a million.
    pub(crate) fn find(&self, key: &RowKey) -> Option<usize> {
        let group = self.by_group.get(&(key.bin.clone(), key.pair.clone(), key.multipole, key.axis))?;
        let same = group.iter().filter(|(at, _)| (at - key.at).abs() <= SAME_PLACE * key.at);
        same.min_by(|left, right| (left.0 - key.at).abs().total_cmp(&(right.0 - key.at).abs()))
            .map(|(_, row)| *row)
    }

    pub(crate) fn insert(&mut self, key: &RowKey, row: usize) {
        let group = (key.bin.clone(), key.pair.clone(), key.multipole, key.axis);
        self.by_group.entry(group).or_default().push((key.at, row));
    }
}
