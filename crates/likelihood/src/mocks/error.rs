//! What can be wrong with mock measurements.

/// Mock measurements that cannot be used.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum MockError {
    /// Fewer than two.
    #[error("{origin}: a covariance needs at least two mocks, found {mocks}; give more, or a covariance")]
    TooFew {
        /// Where the mocks come from.
        origin: String,
        /// How many there are.
        mocks: usize,
    },
    /// A number that is not finite.
    #[error(
        "{origin}: row {row} of mock {mock} must be a finite number, found {value}; leave that mock out, or cut the row"
    )]
    NotFinite {
        /// Where the mocks come from.
        origin: String,
        /// The mock, from 1.
        mock: usize,
        /// The row, from 1.
        row: usize,
        /// The value.
        value: f64,
    },
    /// Not a column for each row.
    #[error(
        "{file}: must have a line for each mock and {expected} columns, one for each row, found {lines} lines of {columns}; {way_out}"
    )]
    Columns {
        /// The path, as it was given.
        file: String,
        /// Rows of the table.
        expected: usize,
        /// Lines found.
        lines: usize,
        /// Columns found.
        columns: usize,
        /// What to do.
        way_out: &'static str,
    },
    /// A pattern that is none.
    #[error("`{pattern}` is no pattern of file names ({reason}); write it as mocks/multipoles-*.csv")]
    BadPattern {
        /// The pattern, as it was given.
        pattern: String,
        /// What is wrong with it.
        reason: &'static str,
    },
    /// A pattern that no file matches.
    #[error(
        "`{pattern}`: no file matches; correct the pattern, which counts from the folder of the study file"
    )]
    NoMatch {
        /// The pattern, as it was given.
        pattern: String,
    },
    /// Tables that lack a row of the measurements.
    #[error(
        "{files} of the {mocks} mocks of `{pattern}` lack a row that {table} measures; the first is {first}, without {row} (line {line}): complete these mocks or move them away: {list}"
    )]
    RowsMissing {
        /// The pattern, as it was given.
        pattern: String,
        /// How many files lack a row.
        files: usize,
        /// How many there are.
        mocks: usize,
        /// The measured table.
        table: String,
        /// The first file that lacks a row.
        first: String,
        /// The row in words.
        row: String,
        /// Its line in the measured table.
        line: u64,
        /// The files, at most ten.
        list: String,
    },
    /// Surveys to join with different numbers of mocks.
    #[error(
        "surveys that share volume need the same mocks, but there are {first_count} of {first} and {second_count} of {second}; leave out what only one has"
    )]
    CountsDiffer {
        /// The first survey's mocks.
        first: String,
        /// Their number.
        first_count: usize,
        /// The second survey's mocks.
        second: String,
        /// Their number.
        second_count: usize,
    },
    /// No survey to join.
    #[error("there are no mocks to join; name at least one survey")]
    NothingToJoin,
}
