//! What can be wrong with a file of bare numbers.

/// A file of bare numbers (covariance, mocks, template) that cannot be used.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum ArrayError {
    /// An ending that no format has.
    #[error(
        "{file}: the format is told from the ending, which must be one of {known}; save or rename the file"
    )]
    UnknownExtension {
        /// The path, as it was given.
        file: String,
        /// The known endings.
        known: String,
    },
    /// Not a file of the format that its name promises.
    #[error("{file}: is no readable {format} file ({reason}); write it again, or correct its ending")]
    Malformed {
        /// The path, as it was given.
        file: String,
        /// The format's name.
        format: &'static str,
        /// What the reader said.
        reason: String,
    },
    /// Ends before its header says.
    #[error(
        "{file}: ends too early: its header announces {announced} bytes of numbers, found {found}; copy or write the file again"
    )]
    Truncated {
        /// The path, as it was given.
        file: String,
        /// Bytes announced.
        announced: u64,
        /// Bytes there.
        found: usize,
    },
    /// Goes on after its numbers.
    #[error(
        "{file}: has {extra} bytes after the last number that its header announces; write the file again, one array a file"
    )]
    TooLong {
        /// The path, as it was given.
        file: String,
        /// Bytes too many.
        extra: usize,
    },
    /// Not floating-point numbers.
    #[error("{file}: must hold floating-point numbers of 32 or 64 bits, found {found}; save it as such")]
    ElementType {
        /// The path, as it was given.
        file: String,
        /// What it holds, in the format's own words.
        found: String,
    },
    /// Neither a list nor a table.
    #[error(
        "{file}: must be an array of two dimensions, found {found}, of shape {shape}; save one table of it"
    )]
    Dimensions {
        /// The path, as it was given.
        file: String,
        /// Number of dimensions.
        found: usize,
        /// The shape, slowest axis first.
        shape: String,
    },
    /// A FITS file without an image.
    #[error(
        "{file}: holds no image, only {found}; save the matrix as an image, in the primary unit or in an extension"
    )]
    NoImage {
        /// The path, as it was given.
        file: String,
        /// What it holds.
        found: String,
    },
    /// An array of no numbers.
    #[error("{file}: is an array without numbers, {rows} × {columns}; save it again with its content")]
    NoNumbers {
        /// The path, as it was given.
        file: String,
        /// Lines.
        rows: usize,
        /// Columns.
        columns: usize,
    },
    /// A number that is not finite.
    #[error(
        "{file}, {line}, column {column}: must be a finite number, found {value}; leave out what was not measured"
    )]
    NotFinite {
        /// The path, as it was given.
        file: String,
        /// The line or row in words.
        line: String,
        /// The column, from 1.
        column: usize,
        /// The value.
        value: f64,
    },
    /// A template with another number of entries.
    #[error(
        "{file}: must have one number for each of the {expected} measured rows, found {rows} × {columns}; give it for all rows of the table, in its order"
    )]
    VectorLength {
        /// The path, as it was given.
        file: String,
        /// Rows it is for.
        expected: usize,
        /// Lines found.
        rows: usize,
        /// Columns found.
        columns: usize,
    },
}
