//! What can be wrong with a file of measurements, and with a request that refers to its rows.

use crate::arrays::ArrayError;
use crate::covariance::CovarianceError;
use crate::mocks::MockError;

/// Where in a file the user wrote something: file as given, line (1-based) and column by its header.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Place {
    /// The path, as it was given.
    pub file: String,
    /// Line number, counted from 1 and with notes and blank lines counted.
    pub line: u64,
    /// The column: its header as it stands in the file, or its number where a file has no header.
    pub column: String,
}

impl std::fmt::Display for Place {
    fn fmt(&self, formatter: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(formatter, "{}, line {}, column `{}`", self.file, self.line, self.column)
    }
}

/// An input file, or a choice of its rows, that cannot be used.
///
/// Every text names the file, the line and the column where there are such, the rule, the value found and a way
/// out.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum DataError {
    /// No file is at the path.
    #[error(
        "{file}: there is no such file; correct the path, which counts from the folder of the study file"
    )]
    Missing {
        /// The path, as it was given.
        file: String,
    },
    /// The file exists and cannot be read.
    #[error("{file}: cannot be read ({reason}); check that it is a file and that you may read it")]
    Unreadable {
        /// The path, as it was given.
        file: String,
        /// What the operating system said.
        reason: std::io::Error,
    },
    /// The file is not text, or not UTF-8 text.
    #[error(
        "{file}, line {line}: must be utf-8 text, found the byte 0x{byte:02x}; save the table as plain csv in utf-8"
    )]
    NotText {
        /// The path, as it was given.
        file: String,
        /// The line of the first such byte.
        line: u64,
        /// The byte.
        byte: u8,
    },
    /// Nothing but notes and blank lines.
    #[error("{file}: is empty, but must hold {wanted}")]
    Empty {
        /// The path, as it was given.
        file: String,
        /// What the file should hold.
        wanted: &'static str,
    },
    /// A header and nothing below.
    #[error("{file}, line {line}: a header with no rows below it; add at least one measured row")]
    NoRows {
        /// The path, as it was given.
        file: String,
        /// The line of the header.
        line: u64,
    },
    /// A needed column is not there.
    #[error("{file}, line {line}: there is no column {wanted}, only {found}; {way_out}")]
    MissingColumn {
        /// The path, as it was given.
        file: String,
        /// The line of the header.
        line: u64,
        /// The column looked for (the user's name where `columns` maps it), in backticks.
        wanted: String,
        /// The columns that are there, in backticks, comma-separated.
        found: String,
        /// What to do; names the nearest column where one is near.
        way_out: String,
    },
    /// `columns` maps a name that no table has.
    #[error("{file}: `columns` maps `{name}`, which is no column of such a table{}; the columns are {known}", did_you_mean(.nearest))]
    UnknownColumnName {
        /// The path, as it was given.
        file: String,
        /// The key in `columns`.
        name: String,
        /// The nearest known name.
        nearest: Option<String>,
        /// All known names.
        known: String,
    },
    /// Two columns have one header.
    #[error("{place}: fields {first} and {second} of the header have the same name; rename one of them")]
    DuplicateColumn {
        /// The header's place.
        place: Place,
        /// Field number of the first, from 1.
        first: usize,
        /// Field number of the second, from 1.
        second: usize,
    },
    /// One column of the file would serve as two.
    #[error(
        "{place}: would be read both as `{first}` and as `{second}`; map each to a column of its own in `columns`"
    )]
    ColumnUsedTwice {
        /// The header's place.
        place: Place,
        /// One use.
        first: String,
        /// The other use.
        second: String,
    },
    /// A line with too few or too many fields.
    #[error(
        "{file}, line {line}: must have {expected} fields as line {like} has, found {found}; add or remove commas"
    )]
    FieldCount {
        /// The path, as it was given.
        file: String,
        /// The line.
        line: u64,
        /// Fields wanted.
        expected: usize,
        /// Fields found.
        found: usize,
        /// The line that sets the number.
        like: u64,
    },
    /// A quote that is opened and not closed on its line.
    #[error("{file}, line {line}: a quote (\") is opened and not closed on this line; close or remove it")]
    OpenQuote {
        /// The path, as it was given.
        file: String,
        /// The line.
        line: u64,
    },
    /// A field that must not be empty is.
    #[error("{place}: is empty; {way_out}")]
    EmptyField {
        /// Where.
        place: Place,
        /// What to write.
        way_out: &'static str,
    },
    /// Text where a number belongs.
    #[error("{place}: must be a number, found `{text}`; write it as 1.25 or 1.25e-3")]
    NotANumber {
        /// Where.
        place: Place,
        /// What stands there.
        text: String,
    },
    /// NaN, an infinity, or a number too large for double precision.
    #[error("{place}: must be a finite number, found `{text}`; leave the row out if it was not measured")]
    NotFinite {
        /// Where.
        place: Place,
        /// What stands there.
        text: String,
    },
    /// A number that must be above zero is not.
    #[error("{place}: must be above 0, found {value}; {way_out}")]
    NotPositive {
        /// Where.
        place: Place,
        /// The number.
        value: f64,
        /// What to do.
        way_out: &'static str,
    },
    /// A shell that begins below zero.
    #[error("{place}: must be 0 or above, found {value}; a shell cannot begin below 0")]
    NegativeEdge {
        /// Where.
        place: Place,
        /// The number.
        value: f64,
    },
    /// A multipole outside 0 … 4.
    #[error(
        "{place}: must be 0, 1, 2, 3 or 4, found `{text}`; remove the row: no other multipole is predicted"
    )]
    BadMultipole {
        /// Where.
        place: Place,
        /// What stands there.
        text: String,
    },
    /// A pair that is none of the three.
    #[error("{place}: must be `first-second`, `first-first` or `second-second`, found `{text}`; {way_out}")]
    UnknownPair {
        /// Where.
        place: Place,
        /// What stands there.
        text: String,
        /// What to do.
        way_out: String,
    },
    /// `low` without `high`, or the reverse.
    #[error(
        "{file}, line {line}: `{present}` is given without `{absent}`; give both ends of the shell or neither"
    )]
    OneEdge {
        /// The path, as it was given.
        file: String,
        /// The line.
        line: u64,
        /// The edge that is there.
        present: String,
        /// The edge that is not.
        absent: String,
    },
    /// A shell of no width, or inside out.
    #[error(
        "{file}, line {line}: low must be below high, found low {low} and high {high}; swap or correct them"
    )]
    EdgesInverted {
        /// The path, as it was given.
        file: String,
        /// The line.
        line: u64,
        /// Lower edge.
        low: f64,
        /// Upper edge.
        high: f64,
    },
    /// The centre of a shell outside the shell.
    #[error(
        "{place}: must lie within its shell, from {low} to {high}, found {at}; correct the centre or the ends"
    )]
    OutsideEdges {
        /// Where.
        place: Place,
        /// The centre.
        at: f64,
        /// Lower edge.
        low: f64,
        /// Upper edge.
        high: f64,
    },
    /// A row with a separation and a wavenumber.
    #[error(
        "{file}, line {line}: has a separation ({separation}) and a wavenumber ({wavenumber}); a row is measured at one of them: leave the other empty"
    )]
    TwoAxes {
        /// The path, as it was given.
        file: String,
        /// The line.
        line: u64,
        /// The separation as written.
        separation: String,
        /// The wavenumber as written.
        wavenumber: String,
    },
    /// A row with neither a separation nor a wavenumber.
    #[error("{file}, line {line}: has neither a separation nor a wavenumber; fill one of them")]
    NoAxis {
        /// The path, as it was given.
        file: String,
        /// The line.
        line: u64,
    },
    /// Two rows for the same thing.
    #[error(
        "{file}, line {line}: measures {row} again, which line {first} has already; remove one of the two"
    )]
    DuplicateRow {
        /// The path, as it was given.
        file: String,
        /// The line of the second.
        line: u64,
        /// The line of the first.
        first: u64,
        /// The row in words.
        row: String,
    },
    /// A covariance file that does not fit the rows it is for.
    #[error(
        "{file}: must be {expected} × {expected}, one line and one column for each of the {expected} rows, found {rows} × {columns}; {way_out}"
    )]
    CovarianceSize {
        /// The path, as it was given.
        file: String,
        /// Rows it is for.
        expected: usize,
        /// Lines found.
        rows: usize,
        /// Fields in the first line.
        columns: usize,
        /// What to do.
        way_out: &'static str,
    },
    /// A line of names above a matrix.
    #[error(
        "{file}, line {line}: a covariance has no header, found `{text}`; begin the line with # to make it a note"
    )]
    MatrixHeader {
        /// The path, as it was given.
        file: String,
        /// The line.
        line: u64,
        /// Its first field.
        text: String,
    },
    /// A measured row that `covariance_rows` does not hold.
    #[error(
        "{file}: has no row for {row}, which {table}, line {line}, measures; add the row, with its line and column in the covariance, or cut it with `keep`"
    )]
    RowNotInCovariance {
        /// The `covariance_rows` file.
        file: String,
        /// The measured row in words.
        row: String,
        /// The table's file.
        table: String,
        /// The table's line.
        line: u64,
    },
    /// A `keep` entry with an interval inside out.
    #[error("entry {entry} of `keep`: {what} must run from low to high, found [{low}, {high}]; swap the two")]
    KeepInverted {
        /// Entry number, from 1.
        entry: usize,
        /// `separation` or `wavenumber`.
        what: &'static str,
        /// Lower end.
        low: f64,
        /// Upper end.
        high: f64,
    },
    /// A `keep` entry that names something that does not exist.
    #[error("entry {entry} of `keep`: there is no {what} `{name}`, only {known}{}", did_you_mean(.nearest))]
    KeepUnknown {
        /// Entry number, from 1.
        entry: usize,
        /// `bin`, `pair` or `multipole`.
        what: &'static str,
        /// What was asked for.
        name: String,
        /// The nearest that there is.
        nearest: Option<String>,
        /// What there is.
        known: String,
    },
    /// No row passes.
    #[error("`keep` leaves none of the {rows} rows of {file}, which reach over {reach}; widen it")]
    NothingKept {
        /// The table's file.
        file: String,
        /// Rows before the cut.
        rows: usize,
        /// The separations and wavenumbers that the table covers, in words.
        reach: String,
    },
    /// A unit of length that is not known.
    #[error("unit must be `Mpc/h` or `Mpc`, found `{text}`{}", did_you_mean(.nearest))]
    UnknownUnit {
        /// What was asked for.
        text: String,
        /// The nearest of the two.
        nearest: Option<String>,
    },
    /// A Hubble constant that cannot convert anything.
    #[error(
        "{file}: converting from Mpc needs h above 0 and finite, found {h}; hold `background.h` or give `fiducial.h`"
    )]
    BadHubble {
        /// The table's file.
        file: String,
        /// The value.
        h: f64,
    },
    /// A file of bare numbers is at fault.
    #[error(transparent)]
    Array(#[from] ArrayError),
    /// Mock measurements are.
    #[error(transparent)]
    Mocks(#[from] MockError),
    /// The covariance itself is at fault.
    #[error(transparent)]
    Covariance(#[from] CovarianceError),
}

/// `; did you mean `x`?` or nothing.
pub(crate) fn did_you_mean(nearest: &Option<String>) -> String {
    nearest.as_ref().map(|name| format!("; did you mean `{name}`?")).unwrap_or_default()
}

/// The candidate nearest to `word`, if one is near: normalised Damerau–Levenshtein similarity of at least 0.6,
/// letters' case aside.
pub(crate) fn nearest<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<String> {
    let lower = word.to_lowercase();
    candidates
        .into_iter()
        .map(|name| (strsim::normalized_damerau_levenshtein(&lower, &name.to_lowercase()), name))
        .filter(|(similarity, _)| *similarity >= 0.6)
        .max_by(|left, right| left.0.total_cmp(&right.0))
        .map(|(_, name)| name.to_owned())
}

/// At most 40 characters of what stands in a file.
pub(crate) fn shown(text: &str) -> String {
    match text.char_indices().nth(40) {
        None => text.to_owned(),
        Some((end, _)) => format!("{}…", &text[..end]),
    }
}

/// Names in backticks, comma-separated.
pub(crate) fn listed<'a>(names: impl IntoIterator<Item = &'a str>) -> String {
    names.into_iter().map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", ")
}
