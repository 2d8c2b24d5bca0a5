//! `[blinding]`: written by `oddwell blind`, not by hand.

use super::section::Section;
use super::source::Located;

/// `[blinding]`: the measurements are shifted by a secret departure.
#[derive(Clone, Debug, PartialEq)]
pub struct BlindingSection {
    /// SHA-256 that commits to the phrase, hexadecimal.
    pub commitment: Located<String>,
    /// What it was salted with, hexadecimal.
    pub salt: Located<String>,
    /// Standard deviation of the secret departure.
    pub width: Located<f64>,
    /// Path of what the shift was computed from, as written.
    pub frozen: Located<String>,
}

impl BlindingSection {
    pub(super) fn read(section: Section<'_>) -> Option<Self> {
        let commitment = section.required_text("commitment", "\"…\"");
        let salt = section.required_text("salt", "\"…\"");
        if section.find("width").is_none() {
            section.missing("width", "width = 3.0");
        }
        let width = section.number("width", "3.0");
        let frozen = section.required_text("frozen", "\"blinding.json\"");
        section.finish();
        Some(Self { commitment: commitment?, salt: salt?, width: width?, frozen: frozen? })
    }
}
