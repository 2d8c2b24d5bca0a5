//! Text files of comma-separated fields: notes and blank lines skipped, line numbers kept.

use std::path::Path;

use csv::{ReaderBuilder, StringRecord, Trim};

use crate::arrays::file_bytes;
use crate::error::{DataError, Place, shown};

/// One line of fields.
#[derive(Clone, Debug)]
pub(crate) struct Record {
    pub(crate) line: u64,
    pub(crate) fields: StringRecord,
}

/// The lines of a file that are neither notes nor blank.
#[derive(Clone, Debug)]
pub(crate) struct Records {
    pub(crate) file: String,
    pub(crate) records: Vec<Record>,
}

impl Records {
    /// Reads a file. `wanted` says in an error what an empty file should have held.
    pub(crate) fn read(path: &Path, wanted: &'static str) -> Result<Self, DataError> {
        Self::parse(path.display().to_string(), &file_bytes(path)?, wanted)
    }

    /// Splits text into records.
    ///
    /// The csv crate counts a record's line from the notes before it, so lines are told apart here and only what
    /// remains is handed to it: record n then stands on the n-th remaining line, unless a quote runs over a line
    /// end, which is an error.
    pub(crate) fn parse(file: String, bytes: &[u8], wanted: &'static str) -> Result<Self, DataError> {
        let text = std::str::from_utf8(bytes).map_err(|error| {
            let (before, rest) = bytes.split_at(error.valid_up_to());
            let line = 1 + before.iter().filter(|byte| **byte == b'\n').count() as u64;
            DataError::NotText { file: file.clone(), line, byte: rest.first().copied().unwrap_or(0) }
        })?;
        let text = text.trim_start_matches('\u{feff}').replace("\r\n", "\n").replace('\r', "\n");
        let (lines, kept): (Vec<u64>, Vec<&str>) = (1..)
            .zip(text.split('\n'))
            .filter(|(_, line)| !line.trim().is_empty() && !line.trim_start().starts_with('#'))
            .unzip();
        if kept.is_empty() {
            return Err(DataError::Empty { file, wanted });
        }
        let joined = kept.join("\n");
        let mut reader = ReaderBuilder::new()
            .has_headers(false)
            .flexible(true)
            .trim(Trim::All)
            .from_reader(joined.as_bytes());
        let mut records = Vec::with_capacity(lines.len());
        for (line, fields) in lines.iter().zip(reader.records()) {
            let open_quote = DataError::OpenQuote { file: file.clone(), line: *line };
            let Ok(fields) = fields else {
                return Err(open_quote);
            };
            if kept[records.len()].matches('"').count() % 2 == 1 {
                return Err(open_quote);
            }
            records.push(Record { line: *line, fields });
        }
        match lines.get(records.len()) {
            None => Ok(Self { file, records }),
            // A quote that runs over lines is found above; whatever else hides a line must not lose it.
            Some(line) => Err(DataError::OpenQuote { file, line: *line }),
        }
    }

    /// Place of a field, for an error.
    pub(crate) fn place(&self, line: u64, column: &str) -> Place {
        Place { file: self.file.clone(), line, column: column.to_owned() }
    }

    /// The records below the header, of which there must be one and which must have as many fields as it.
    pub(crate) fn below_header(&self) -> Result<&[Record], DataError> {
        self.check_field_counts()?;
        match self.records.as_slice() {
            [header] => Err(DataError::NoRows { file: self.file.clone(), line: header.line }),
            records => Ok(&records[1..]),
        }
    }

    /// Every record must have as many fields as the first.
    pub(crate) fn check_field_counts(&self) -> Result<(), DataError> {
        let Some(first) = self.records.first() else {
            return Ok(());
        };
        match self.records.iter().find(|record| record.fields.len() != first.fields.len()) {
            None => Ok(()),
            Some(record) => Err(DataError::FieldCount {
                file: self.file.clone(),
                line: record.line,
                expected: first.fields.len(),
                found: record.fields.len(),
                like: first.line,
            }),
        }
    }
}

/// A finite number, or the error that says why not. The place is made only for an error.
pub(crate) fn finite_number(text: &str, place: impl FnOnce() -> Place) -> Result<f64, DataError> {
    match text.parse::<f64>() {
        Err(_) => Err(DataError::NotANumber { place: place(), text: shown(text) }),
        Ok(value) if !value.is_finite() => Err(DataError::NotFinite { place: place(), text: shown(text) }),
        Ok(value) => Ok(value),
    }
}
