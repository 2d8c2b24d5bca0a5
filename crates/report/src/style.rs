//! Colour, only where it is asked for.

/// How text is dressed for a terminal.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Style {
    /// Nothing but the text.
    #[default]
    Plain,
    /// With ANSI escape sequences (ECMA-48, "select graphic rendition").
    Coloured,
}

impl Style {
    /// Headings and headline numbers.
    pub fn strong(self, text: &str) -> String {
        self.dress(text, "1")
    }

    /// What went wrong.
    pub fn fault(self, text: &str) -> String {
        self.dress(text, "1;31")
    }

    /// What to look at.
    pub fn caution(self, text: &str) -> String {
        self.dress(text, "33")
    }

    /// What can be read over.
    pub fn faint(self, text: &str) -> String {
        self.dress(text, "2")
    }

    fn dress(self, text: &str, code: &str) -> String {
        match self {
            Self::Plain => text.to_owned(),
            Self::Coloured => format!("\u{1b}[{code}m{text}\u{1b}[0m"),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_coloured_text_has_escapes() {
        assert_eq!(Style::Plain.fault("no"), "no");
        assert_eq!(Style::Coloured.fault("no"), "\u{1b}[1;31mno\u{1b}[0m");
    }
}
