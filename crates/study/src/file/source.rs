//! Where in the study file, or on the command line, a value was written.

use std::fmt;
use std::ops::Range;

/// A stretch of the study file's text: line and column of its start, counted from 1 (columns in characters), and its bytes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Place {
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
    /// First byte.
    pub start: usize,
    /// One past the last byte.
    pub end: usize,
}

/// Where a value comes from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Origin {
    /// Written in the study file.
    Written(Place),
    /// Given with `--set`.
    Set,
    /// Not given: the documented default.
    Default,
}

impl Origin {
    /// The line of the study file; none for a default or for `--set`.
    pub fn line(&self) -> Option<usize> {
        match self {
            Self::Written(place) => Some(place.line),
            Self::Set | Self::Default => None,
        }
    }
}

impl fmt::Display for Origin {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Written(place) => write!(out, "line {}", place.line),
            Self::Set => write!(out, "--set"),
            Self::Default => write!(out, "default"),
        }
    }
}

/// A value with where it comes from.
#[derive(Clone, Debug, PartialEq)]
pub struct Located<T> {
    /// The value.
    pub value: T,
    /// Where it comes from.
    pub origin: Origin,
}

impl<T> Located<T> {
    /// A value that the user did not give.
    pub fn default_of(value: T) -> Self {
        Self { value, origin: Origin::Default }
    }

    /// The same origin, another value.
    pub fn map<U>(self, change: impl FnOnce(T) -> U) -> Located<U> {
        Located { value: change(self.value), origin: self.origin }
    }
}

/// The text that is read, and the name under which errors speak of it.
#[derive(Clone, Debug, PartialEq)]
pub struct Source {
    name: String,
    text: String,
    line_starts: Vec<usize>,
    command_line: bool,
}

impl Source {
    /// The text of a study file; `name` is its path as the user gave it.
    pub fn of_file(name: impl Into<String>, text: impl Into<String>) -> Self {
        Self::new(name.into(), text.into(), false)
    }

    /// The value of a command line option; `name` is the option as typed.
    pub(crate) fn of_option(name: impl Into<String>, text: impl Into<String>) -> Self {
        Self::new(name.into(), text.into(), true)
    }

    fn new(name: String, text: String, command_line: bool) -> Self {
        let line_starts =
            std::iter::once(0).chain(text.match_indices('\n').map(|(position, _)| position + 1)).collect();
        Self { name, text, line_starts, command_line }
    }

    /// The path as the user gave it.
    pub fn name(&self) -> &str {
        &self.name
    }

    /// The whole text.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// Turns a range of bytes into a place.
    pub fn place(&self, span: Range<usize>) -> Place {
        let start = span.start.min(self.text.len());
        let line = self.line_starts.partition_point(|&first| first <= start).max(1);
        let first = self.line_starts[line - 1];
        let column = self.text.get(first..start).map_or(start - first, |before| before.chars().count()) + 1;
        Place { line, column, start, end: span.end.clamp(start, self.text.len()) }
    }

    /// The origin of what stands at these bytes.
    pub(crate) fn origin(&self, span: Option<Range<usize>>) -> Origin {
        if self.command_line {
            return Origin::Set;
        }
        Origin::Written(self.place(span.unwrap_or(0..0)))
    }

    /// What the user typed at these bytes, on one line and not longer than 40 characters.
    pub(crate) fn typed(&self, span: Option<Range<usize>>) -> String {
        let text = span.and_then(|span| self.text.get(span)).unwrap_or_default();
        let line = text.split_whitespace().collect::<Vec<_>>().join(" ");
        if line.chars().count() <= 40 { line } else { line.chars().take(39).chain(['…']).collect() }
    }

    pub(crate) fn is_command_line(&self) -> bool {
        self.command_line
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn places_count_from_one_and_in_characters() {
        let source = Source::of_file("s.toml", "a = 1\nµ = \"é\" # x\n");
        assert_eq!(source.place(0..1), Place { line: 1, column: 1, start: 0, end: 1 });
        let quote = source.text().find('"').unwrap();
        assert_eq!((source.place(quote..quote + 4).line, source.place(quote..quote + 4).column), (2, 5));
        let hash = source.text().find('#').unwrap();
        assert_eq!(source.place(hash..hash + 1).column, 9);
        let end = source.text().len();
        assert_eq!((source.place(end..end + 3).line, source.place(end..end + 3).column), (3, 1));
    }
}
