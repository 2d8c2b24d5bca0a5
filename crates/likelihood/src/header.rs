//! Which field of a line is which of our columns.

use std::collections::BTreeMap;

use crate::error::{DataError, listed, nearest};
use crate::records::Records;

/// A column of the file that nothing reads.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct IgnoredColumn {
    /// Its header.
    pub name: String,
    /// A known column that is absent and whose name is near: perhaps a slip of the pen, worth a warning.
    pub resembles: Option<String>,
}

/// Fields of the known columns, by our names.
#[derive(Debug)]
pub(crate) struct Header {
    line: u64,
    names: Vec<String>,
    fields: BTreeMap<&'static str, usize>,
    mapped: BTreeMap<String, String>,
    pub(crate) ignored: Vec<IgnoredColumn>,
}

impl Header {
    /// Reads the first record as a header; `columns` maps our names to the file's.
    pub(crate) fn new(
        records: &Records,
        known: &[&'static str],
        columns: &BTreeMap<String, String>,
    ) -> Result<Self, DataError> {
        let file = || records.file.clone();
        if let Some(name) = columns.keys().find(|name| !known.contains(&name.as_str())) {
            return Err(DataError::UnknownColumnName {
                file: file(),
                name: name.clone(),
                nearest: nearest(name, known.iter().copied()),
                known: listed(known.iter().copied()),
            });
        }
        let first = &records.records[0];
        let names: Vec<String> = first.fields.iter().map(str::to_owned).collect();
        for (second, name) in names.iter().enumerate() {
            if let Some(earlier) = names[..second].iter().position(|other| other == name) {
                return Err(DataError::DuplicateColumn {
                    place: records.place(first.line, name),
                    first: earlier + 1,
                    second: second + 1,
                });
            }
        }
        let mut header = Self {
            line: first.line,
            names,
            fields: BTreeMap::new(),
            mapped: columns.clone(),
            ignored: Vec::new(),
        };
        for name in known.iter().copied() {
            let in_file = header.in_file(name).to_owned();
            match header.names.iter().position(|other| *other == in_file) {
                Some(field) => {
                    if let Some((other, _)) = header.fields.iter().find(|(_, used)| **used == field) {
                        return Err(DataError::ColumnUsedTwice {
                            place: records.place(header.line, &in_file),
                            first: (*other).to_owned(),
                            second: name.to_owned(),
                        });
                    }
                    header.fields.insert(name, field);
                }
                None if columns.contains_key(name) => return Err(header.missing(records, &[name])),
                None => {}
            }
        }
        let absent: Vec<&str> = known.iter().copied().filter(|name| header.field(name).is_none()).collect();
        header.ignored = (0..header.names.len())
            .filter(|field| !header.fields.values().any(|used| used == field))
            .map(|field| IgnoredColumn {
                name: header.names[field].clone(),
                resembles: nearest(&header.names[field], absent.iter().copied()),
            })
            .collect();
        Ok(header)
    }

    /// The file's header for one of our names.
    pub(crate) fn in_file<'a>(&'a self, name: &'a str) -> &'a str {
        self.mapped.get(name).map_or(name, String::as_str)
    }

    /// Field number of one of our columns.
    pub(crate) fn field(&self, name: &str) -> Option<usize> {
        self.fields.get(name).copied()
    }

    /// At least one of these columns must be there.
    pub(crate) fn require(&self, records: &Records, any_of: &[&str]) -> Result<(), DataError> {
        match any_of.iter().any(|name| self.fields.contains_key(name)) {
            true => Ok(()),
            false => Err(self.missing(records, any_of)),
        }
    }

    fn missing(&self, records: &Records, any_of: &[&str]) -> DataError {
        let unused = (0..self.names.len()).filter(|field| !self.fields.values().any(|used| used == field));
        let unused: Vec<&str> = unused.map(|field| self.names[field].as_str()).collect();
        let near = any_of
            .iter()
            .find_map(|name| nearest(self.in_file(name), unused.iter().copied()).map(|near| (*name, near)));
        let way_out = match near {
            Some((name, near)) => {
                format!(
                    "did you mean `{near}`? rename it, or map it with columns = {{ {name} = \"{near}\" }}"
                )
            }
            None if self.names.len() == 1 => "separate the columns with commas".to_owned(),
            None => {
                format!("add it, or name the column that holds it with columns = {{ {} = \"…\" }}", any_of[0])
            }
        };
        DataError::MissingColumn {
            file: records.file.clone(),
            line: self.line,
            wanted: any_of
                .iter()
                .map(|name| format!("`{}`", self.in_file(name)))
                .collect::<Vec<_>>()
                .join(" or "),
            found: listed(self.names.iter().map(String::as_str)),
            way_out,
        }
    }
}
