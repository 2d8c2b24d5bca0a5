//! `oddwell reveal`.

use super::blind::NOTE_START;
use super::blind::without_keep;
use super::frozen::Frozen;
use super::secret::Phrase;
use crate::assemble::read_rows_only;
use crate::checksum::sha256;
use crate::copy::{STUDY_FILE, StudyCopy};
use crate::file::Source;
use crate::resolve::Study;
use crate::run_error::RunError;
use serde_json::json;
use std::path::{Path, PathBuf};
use time::OffsetDateTime;
use time::format_description::well_known::Rfc3339;

/// A revealed study.
#[derive(Clone, Debug, PartialEq)]
pub struct Revealed {
    /// The study file written.
    pub study: PathBuf,
    /// The secret departure that had been added.
    pub secret: f64,
    /// The log of the reveal, beside the study file.
    pub log: PathBuf,
}

/// Checks the phrase against the commitment of the blinded study in `blinded` (its folder), takes the secret shift out,
/// and writes the study with `reveal.json`: when, the hash of the blinded study as it stood, and its text, which is what was
/// planned before anybody knew.
///
/// # Errors
/// [`RunError::Blinded`] for a study that is not blinded, a wrong phrase, or rows that were not there when it was blinded;
/// and where the study can't be read or the folder can't be written.
pub fn reveal(blinded: &Path, phrase_file: &Path, folder: &Path) -> Result<Revealed, RunError> {
    let path = if blinded.is_dir() { blinded.join(STUDY_FILE) } else { blinded.to_owned() };
    let study = Study::read(&path, &[])?;
    let Some(blinding) = &study.file.blinding else {
        return Err(RunError::Blinded {
            what: "nothing",
            way_out: "give the folder that `oddwell blind` wrote",
        });
    };
    let phrase = Phrase::read(phrase_file)?;
    if phrase.commitment(&blinding.salt.value) != blinding.commitment.value {
        return Err(RunError::WrongPhrase { path: phrase_file.to_owned() });
    }
    let secret = phrase.departure(&blinding.salt.value, blinding.width.value);
    let frozen = Frozen::read(&study.file.path_of(&blinding.frozen.value))?;
    let measurements = read_rows_only(&without_keep(&study))?;
    let changes = frozen.changes(&measurements).map_err(|row| RunError::NotFrozen { row })?;
    let measured =
        measurements.surveys.iter().flat_map(|survey| survey.table.rows.iter().map(|row| row.value));
    let restored: Vec<f64> = measured.zip(&changes).map(|(value, change)| value - secret * change).collect();
    let text = study.file.source.text();
    let now = OffsetDateTime::now_utc().format(&Rfc3339).unwrap_or_default();
    let record = json!({
        "revealed": now,
        "version": concat!("oddwell ", env!("CARGO_PKG_VERSION")),
        "secret_departure": secret,
        "blinded_study_sha256": sha256(text.as_bytes()),
        "original_study_sha256": frozen.study_sha256,
        "planned": text,
    });
    let open = unblinded(&study);
    let copy = StudyCopy::new(
        &open,
        &measurements,
        &restored,
        "REVEALED: the secret shift is taken out again.",
        "",
    )?;
    let content = serde_json::to_vec_pretty(&record).unwrap_or_default();
    let written = copy.with_file("reveal.json", content).write(folder)?;
    Ok(Revealed { log: folder.join("reveal.json"), study: written, secret })
}

/// The study without its `[blinding]` table and the note that said so; blanks in its place, so that every other place in
/// the text stays where it was.
fn unblinded(study: &Study) -> Study {
    let mut open = study.clone();
    let mut text = study.file.source.text().to_owned();
    if let Some(start) = text.find("\n[blinding]") {
        text.truncate(start + 1);
    }
    if text.starts_with(NOTE_START) {
        let end = text.find('\n').unwrap_or(text.len());
        text.replace_range(..end, &" ".repeat(end));
    }
    open.file.source = Source::of_file(study.file.source.name(), text);
    open.file.blinding = None;
    open
}
