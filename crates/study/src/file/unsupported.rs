//! The one table of what the study file's language has and this version of oddwell cannot honour yet.
//!
//! To support an entry: remove its line here, read the key in its section, honour it.

/// A key, or one value of a key, that is part of the language but not of this version.
pub(crate) struct Unsupported {
    /// The kind of section it stands in, as [`super::section::Section::kind`].
    pub(crate) section: &'static str,
    /// The key.
    pub(crate) key: &'static str,
    /// None: the key as such. `.ext`: a file with this extension. Else: this one value.
    pub(crate) value: Option<&'static str>,
    /// What the user can do instead.
    pub(crate) way_out: &'static str,
}

const fn key(section: &'static str, key: &'static str, way_out: &'static str) -> Unsupported {
    Unsupported { section, key, value: None, way_out }
}

const fn value(
    section: &'static str,
    key: &'static str,
    value: &'static str,
    way_out: &'static str,
) -> Unsupported {
    Unsupported { section, key, value: Some(value), way_out }
}

/// Everything that this version knows of and cannot do.
pub(crate) const UNSUPPORTED: &[Unsupported] = &[
    key("study", "joint_covariance", "remove it, and leave out one of two surveys that share volume"),
    key("survey", "mocks", "remove it, and give the covariance estimated from them, with `mock_count`"),
    value("survey", "noise", "percival", "choose another noise model"),
    key(
        "tracer",
        "observed_density_slope",
        "remove it, and give `evolution` = observed slope - 5 magnification (1 + 1/(r H))",
    ),
];

/// The entry for a key as such.
pub(crate) fn unsupported_key(section: &str, key: &str) -> Option<&'static Unsupported> {
    UNSUPPORTED.iter().find(|entry| entry.section == section && entry.key == key && entry.value.is_none())
}

/// The entry for a value, or for a file's extension, of a key.
pub(crate) fn unsupported_value(section: &str, key: &str, text: &str) -> Option<&'static Unsupported> {
    UNSUPPORTED.iter().find(|entry| {
        entry.section == section
            && entry.key == key
            && entry.value.is_some_and(|value| match value.strip_prefix('.') {
                Some(_) => text.to_ascii_lowercase().ends_with(value),
                None => text == value,
            })
    })
}
