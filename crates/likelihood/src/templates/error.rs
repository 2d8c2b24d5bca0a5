//! What can be wrong with templates.

/// Templates that cannot be integrated out.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum TemplateError {
    /// A shape for other rows.
    #[error(
        "template `{name}` must have a number for each of the {expected} measured rows, found {found}; give it for the rows that are kept"
    )]
    Length {
        /// The template.
        name: String,
        /// Measured rows.
        expected: usize,
        /// Numbers.
        found: usize,
    },
    /// A number of the shape or of the prior that is not finite.
    #[error("template `{name}`: {what} must be a finite number, found {value}")]
    NotFinite {
        /// The template.
        name: String,
        /// What it is.
        what: &'static str,
        /// The value.
        value: f64,
    },
    /// A prior of no width.
    #[error(
        "template `{name}`: the standard deviation of the amplitude must be above 0, found {value}; add a held template to the model instead"
    )]
    NoWidth {
        /// The template.
        name: String,
        /// The value.
        value: f64,
    },
    /// Flat amplitudes that the data cannot tell apart.
    #[error(
        "template `{name}` is zero, or a combination of the other templates, in the rows that are kept; give its amplitude a normal prior, or leave it out"
    )]
    Undetermined {
        /// The template.
        name: String,
    },
}
