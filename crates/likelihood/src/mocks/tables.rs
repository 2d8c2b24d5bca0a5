//! Mock measurements as one table per realisation.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use glob::Pattern;
use nalgebra::DMatrix;

use super::{MockError, MockSet};
use crate::error::DataError;
use crate::rows::RowIndex;
use crate::table::{MultipoleTable, read_multipoles};

/// Mocks read from a table each, and what their names say about them.
#[derive(Clone, Debug)]
pub struct MockTables {
    /// The mocks, rows in the order of the measured table.
    pub mocks: MockSet,
    /// Their files, in the order of the mocks: by the number in the name, or by name where there is none.
    pub files: Vec<PathBuf>,
    /// Names that the numbering of the others leads one to expect and that are not there; worth a warning.
    pub missing: Vec<String>,
}

/// Reads the tables that match `pattern` (`*`, `?`, `[0-9]` and `**` in the usual sense), which counts from `folder`, as
/// one mock each.
///
/// Each is a table as [`read_multipoles`] reads it, with `columns` as for the measured `table`, whose rows are looked up
/// by bin, pair, multipole and place; other rows are passed over. Both must be in the same unit: do this before any
/// conversion. Only `value` is used.
///
/// # Errors
/// A pattern that is none or that no file matches; a file that is no such table; files that lack a row of `table`, all
/// of which are listed; fewer than two mocks.
pub fn read_mock_tables(
    folder: &Path,
    pattern: &str,
    columns: &BTreeMap<String, String>,
    table: &MultipoleTable,
) -> Result<MockTables, DataError> {
    let mut files = mock_files(folder, pattern)?;
    let numbers = numbered(&files);
    if let Some(numbering) = &numbers {
        let mut order: Vec<usize> = (0..files.len()).collect();
        order.sort_by_key(|file| numbering.numbers[*file]);
        files = order.iter().map(|file| files[*file].clone()).collect();
    }
    let mut measurements = DMatrix::zeros(files.len(), table.len());
    let mut lacking = Vec::new();
    for (mock, file) in files.iter().enumerate() {
        let read = read_multipoles(file, columns)?;
        let mut index = RowIndex::default();
        for (position, row) in read.rows.iter().enumerate() {
            index.insert(&row.key(), position);
        }
        for (position, row) in table.rows.iter().enumerate() {
            match index.find(&row.key()) {
                Some(found) => measurements[(mock, position)] = read.rows[found].value,
                None => {
                    lacking.push((file, row));
                    break;
                }
            }
        }
    }
    if let Some((first, row)) = lacking.first() {
        let names = lacking.iter().map(|(file, _)| file.display().to_string());
        return Err(MockError::RowsMissing {
            pattern: pattern.to_owned(),
            files: lacking.len(),
            mocks: files.len(),
            table: table.file.clone(),
            first: first.display().to_string(),
            row: row.description(),
            line: row.line,
            list: at_most_ten(names, lacking.len()),
        }
        .into());
    }
    let mocks = MockSet::new(measurements, pattern)?.with_labels(table.row_labels());
    Ok(MockTables { mocks, files, missing: numbers.map(|numbering| numbering.missing()).unwrap_or_default() })
}

fn at_most_ten(names: impl Iterator<Item = String>, count: usize) -> String {
    let mut list = names.take(10).collect::<Vec<_>>().join(", ");
    if count > 10 {
        list.push_str(&format!(" and {} more", count - 10));
    }
    list
}

/// The files that a pattern matches, sorted by name; it counts from `folder`.
///
/// # Errors
/// A pattern that is none or that no file matches; a folder that can't be read.
pub fn mock_files(folder: &Path, pattern: &str) -> Result<Vec<PathBuf>, DataError> {
    // The folder's own name may hold characters that mean something in a pattern.
    let whole = match Path::new(pattern).is_absolute() {
        true => pattern.to_owned(),
        false => format!("{}/{pattern}", Pattern::escape(&folder.display().to_string())),
    };
    let bad = |error: glob::PatternError| {
        DataError::from(MockError::BadPattern { pattern: pattern.to_owned(), reason: error.msg })
    };
    let mut files = Vec::new();
    for found in glob::glob(&whole).map_err(bad)? {
        let path = found.map_err(|error| DataError::Unreadable {
            file: error.path().display().to_string(),
            reason: error.into(),
        })?;
        if path.is_file() {
            files.push(path);
        }
    }
    match files.is_empty() {
        true => Err(MockError::NoMatch { pattern: pattern.to_owned() }.into()),
        false => Ok(files),
    }
}

/// File names that differ in one number only.
struct Numbering {
    before: String,
    after: String,
    /// Digits of a number written with leading zeros; 0 where there are none.
    width: usize,
    numbers: Vec<u64>,
}

/// More missing numbers than this are no gap but another way to number.
const MOST_MISSING: u64 = 10_000;

impl Numbering {
    /// The names of the numbers between the smallest and the largest that no file has, where they are fewer than the
    /// files or a few.
    fn missing(&self) -> Vec<String> {
        let mut sorted = self.numbers.clone();
        sorted.sort_unstable();
        let gap = |pair: &[u64]| pair[1].saturating_sub(pair[0]).saturating_sub(1);
        let total: u64 = sorted.windows(2).map(gap).fold(0, u64::saturating_add);
        if total > MOST_MISSING.min(sorted.len() as u64) {
            return Vec::new();
        }
        let within = |pair: &[u64]| pair[0] + 1..pair[1];
        let name = |number: u64| format!("{}{number:0width$}{}", self.before, self.after, width = self.width);
        sorted.windows(2).flat_map(within).map(name).collect()
    }
}

/// The numbering of file names, if they have one: all alike but for one run of digits, no number twice.
fn numbered(files: &[PathBuf]) -> Option<Numbering> {
    let names: Vec<String> = files.iter().map(|file| file.display().to_string()).collect();
    let (first, last) = (names.first()?, names.last()?);
    if names.len() < 2 {
        return None;
    }
    let common = first.bytes().zip(last.bytes()).take_while(|(a, b)| a == b).count();
    // The common beginning may end within a number (mock-10, mock-11): step back to where its digits begin.
    let digits = first.as_bytes()[..common].iter().rev().take_while(|byte| byte.is_ascii_digit()).count();
    let start = common - digits;
    let before = first.get(..start)?;
    let rest = |name: &str| -> Option<(u64, String, String)> {
        let rest = name.strip_prefix(before)?;
        let end = rest.bytes().take_while(u8::is_ascii_digit).count();
        Some((rest[..end].parse().ok()?, rest[..end].to_owned(), rest[end..].to_owned()))
    };
    let split: Vec<(u64, String, String)> = names.iter().map(|name| rest(name)).collect::<Option<_>>()?;
    let after = split[0].2.clone();
    if split.iter().any(|(_, _, other)| *other != after) {
        return None;
    }
    let numbers: Vec<u64> = split.iter().map(|(number, _, _)| *number).collect();
    let mut distinct = numbers.clone();
    distinct.sort_unstable();
    distinct.dedup();
    if distinct.len() < numbers.len() {
        return None;
    }
    let padded = split.iter().any(|(_, text, _)| text.len() > 1 && text.starts_with('0'));
    let width = if padded { split[0].1.len() } else { 0 };
    Some(Numbering { before: before.to_owned(), after, width, numbers })
}
