//! `oddwell new DIR`: a small working study with invented data, every key explained.

use std::path::{Path, PathBuf};

use oddwell_model::departures;

use crate::error::StudyError;

/// Name of the study file in the new folder.
pub const STUDY_FILE: &str = "study.toml";
/// Name of the table of multipoles: bins `near` (redshift 0.30) and `far` (0.55), multipoles 1 and 3 in shells.
pub const MULTIPOLES_FILE: &str = "windmere-multipoles.csv";
/// Name of the covariance of its rows.
pub const COVARIANCE_FILE: &str = "windmere-covariance.csv";

const TEXT: &str = include_str!("study.toml");

/// The text of the template's study file.
///
/// Lines that begin with `#key` are optional keys; uncommented, each block of them still makes a study.
pub fn study_text() -> String {
    let shapes: Vec<String> = departures::registry()
        .iter()
        .map(|shape| {
            let parameters: Vec<&str> = shape.parameters().iter().map(|parameter| parameter.name).collect();
            match parameters.as_slice() {
                [] | ["tau"] => shape.name().to_owned(),
                others => format!("{} ({})", shape.name(), others.join(", ")),
            }
        })
        .collect();
    let mut lines = Vec::new();
    for shapes in shapes.chunks(5) {
        lines.push(shapes.join(", "));
    }
    TEXT.replace("SHAPES", &lines.join(",\n                                 # "))
}

/// The invented measurements of the template's survey, as CSV text.
#[derive(Clone, Copy, Debug)]
pub struct TemplateData<'a> {
    /// The table of multipoles; its first line says, after `#`, that it is invented.
    pub multipoles: &'a str,
    /// The covariance of its rows.
    pub covariance: &'a str,
}

/// Writes the template's study and data into a folder that does not exist or is empty; returns the files, the study first.
///
/// Either all of them are there afterwards or none.
///
/// # Errors
/// [`StudyError::NotEmpty`] for a folder with something in it or a file of that name; [`StudyError::Unwritable`].
pub fn write_template(folder: &Path, data: &TemplateData<'_>) -> Result<Vec<PathBuf>, StudyError> {
    let empty = match std::fs::read_dir(folder) {
        Ok(mut entries) => entries.next().is_none(),
        Err(_) => !folder.exists(),
    };
    if !empty {
        return Err(StudyError::NotEmpty { path: folder.to_owned() });
    }
    let unwritable =
        |error: std::io::Error| StudyError::Unwritable { path: folder.to_owned(), reason: error.to_string() };
    let mut name = std::ffi::OsString::from(".");
    name.push(folder.file_name().unwrap_or_default());
    name.push(format!(".new-{}", std::process::id()));
    let parent = folder.parent().filter(|parent| !parent.as_os_str().is_empty()).unwrap_or(Path::new("."));
    let staging = parent.join(name);
    let files = [
        (STUDY_FILE, study_text()),
        (MULTIPOLES_FILE, data.multipoles.to_owned()),
        (COVARIANCE_FILE, data.covariance.to_owned()),
    ];
    let written = (|| {
        std::fs::create_dir_all(&staging)?;
        for (name, text) in &files {
            std::fs::write(staging.join(name), text)?;
        }
        if folder.exists() {
            std::fs::remove_dir(folder)?;
        }
        std::fs::rename(&staging, folder)
    })();
    if let Err(error) = written {
        // What could not be put in place goes; that it may not go either changes nothing for the user.
        let _ = std::fs::remove_dir_all(&staging);
        return Err(unwritable(error));
    }
    Ok(files.iter().map(|(name, _)| folder.join(name)).collect())
}
