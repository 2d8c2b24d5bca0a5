//! A complete copy of a study with other measurements, in a folder of its own.

use crate::assemble::Measurements;
use crate::file::{Located, Origin, PowerChoice};
use crate::resolve::Study;
use crate::run_error::RunError;
use oddwell_likelihood::{Axis, LengthUnit, with_values};
use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};
use toml_edit::{DocumentMut, Item, TableLike, TomlError, Value, value};

/// What goes into the folder: names and contents, the study file first.
#[derive(Clone, Debug, PartialEq)]
pub struct StudyCopy {
    files: Vec<(String, Vec<u8>)>,
}

/// Name of the study file in the copy.
pub(crate) const STUDY_FILE: &str = "study.toml";

impl StudyCopy {
    /// A copy of `study` with `values` in place of the measured ones (all rows of `measurements`, survey after survey, in
    /// their units: Mpc/h), `note` as comment lines in front of the study file, and `appendix` behind it. All files that
    /// the study refers to come along, and the copy refers to its own.
    ///
    /// # Errors
    /// [`RunError::UnreadableRun`] where a file that was read before can no longer be.
    pub fn new(
        study: &Study,
        measurements: &Measurements,
        values: &[f64],
        note: &str,
        appendix: &str,
    ) -> Result<StudyCopy, RunError> {
        let mut copy = StudyCopy { files: vec![(STUDY_FILE.to_owned(), Vec::new())] };
        let mut edits: Vec<(usize, usize, String)> = Vec::new();
        let mut first = 0;
        for (section, survey) in study.file.surveys.iter().zip(&measurements.surveys) {
            let columns: BTreeMap<String, String> =
                section.columns.iter().map(|(ours, theirs)| (ours.clone(), theirs.value.clone())).collect();
            let lines: Vec<(u64, f64)> = survey
                .table
                .rows
                .iter()
                .zip(&values[first..])
                .map(|(row, value)| {
                    let spectrum =
                        section.unit.value == LengthUnit::Megaparsec && row.axis == Axis::Wavenumber;
                    let factor = if spectrum { survey.h.unwrap_or(1.0).powi(3) } else { 1.0 };
                    (row.line, value / factor)
                })
                .collect();
            first += survey.table.len();
            let path = study.file.path_of(&section.multipoles.value);
            let text = String::from_utf8(read(&path)?).unwrap_or_default();
            let text = with_values(&text, &columns, &lines)
                .ok_or_else(|| unreadable(&path, "its lines have changed meanwhile".to_owned()))?;
            let name = copy.add(&section.multipoles.value, &section.name.value, text.into_bytes());
            edits.extend(edit(&section.multipoles, &name));
            let others =
                [&section.covariance, &section.covariance_rows, &section.window, &section.window_rows];
            for other in others.into_iter().flatten() {
                let content = read(&study.file.path_of(&other.value))?;
                let name = copy.add(&other.value, &section.name.value, content);
                edits.extend(edit(other, &name));
            }
        }
        if let PowerChoice::Table(path) = &study.file.background.power.value {
            let name = copy.add(path, "power", read(&study.file.path_of(path))?);
            edits.extend(edit(&study.file.background.power, &name));
        }
        let mut text = study.file.source.text().to_owned();
        edits.sort_by_key(|(start, ..)| std::cmp::Reverse(*start));
        for (start, end, name) in edits {
            text.replace_range(start..end, &format!("\"{name}\""));
        }
        // Where a note was blanked out.
        let text = text.trim_start();
        let notes: String = note.lines().map(|line| format!("# {line}\n")).collect();
        let separator = if appendix.is_empty() || text.ends_with('\n') { "" } else { "\n" };
        copy.files[0].1 = format!("{notes}{text}{separator}{appendix}").into_bytes();
        Ok(copy)
    }

    /// Takes a file in under its own name, or with `owner` in front where that is taken by another content.
    fn add(&mut self, written: &str, owner: &str, content: Vec<u8>) -> String {
        let base = Path::new(written)
            .file_name()
            .map_or_else(|| "table".to_owned(), |name| name.to_string_lossy().into_owned());
        let mut name = base.clone();
        let mut attempt = 1;
        while let Some((_, known)) = self.files.iter().find(|(known, _)| *known == name) {
            if *known == content {
                return name;
            }
            name = if attempt == 1 { format!("{owner}-{base}") } else { format!("{owner}-{attempt}-{base}") };
            attempt += 1;
        }
        self.files.push((name.clone(), content));
        name
    }

    /// Gives keys of the survey of this index these texts for values, and removes others, wherever they stand in the copy's
    /// study file.
    ///
    /// # Errors
    /// [`RunError::UnreadableRun`] where the copy is no study file (never: its original was read).
    pub(crate) fn edit_survey(
        &mut self,
        index: usize,
        texts: &[(&str, String)],
        remove: &[&str],
    ) -> Result<(), RunError> {
        let text = String::from_utf8_lossy(&self.files[0].1).into_owned();
        let mut document: DocumentMut =
            text.parse().map_err(|error: TomlError| unreadable(Path::new(STUDY_FILE), error.to_string()))?;
        if let Some(survey) = survey_of(&mut document, index) {
            for key in remove {
                survey.remove(key);
            }
            let indent = survey.key("name").and_then(|key| key.leaf_decor().prefix().cloned());
            for (key, text) in texts {
                let known = survey.get(key).and_then(Item::as_str).map(str::to_owned);
                if known.as_deref() == Some(text.as_str()) {
                    continue;
                }
                survey.insert(key, value(text.as_str()));
                if let (Some(mut key), Some(indent)) = (survey.key_mut(key), &indent) {
                    // As the name is, but for notes in front of it.
                    if indent.as_str().is_some_and(|indent| indent.trim().is_empty()) {
                        key.leaf_decor_mut().set_prefix(indent.clone());
                    }
                }
            }
        }
        self.files[0].1 = document.to_string().into_bytes();
        Ok(())
    }

    /// Mocks of a survey in place of its covariance.
    pub(crate) fn with_mocks(&mut self, index: usize, survey: &str, mocks: Vec<u8>) -> Result<(), RunError> {
        let text = String::from_utf8_lossy(&self.files[0].1).into_owned();
        let document: Option<DocumentMut> = text.parse().ok();
        let covariance = document.and_then(|mut document| {
            survey_of(&mut document, index)?.get("covariance")?.as_str().map(str::to_owned)
        });
        self.files.retain(|(name, _)| Some(name) != covariance.as_ref());
        let name = self.add(&format!("{survey}-mocks.npy"), survey, mocks);
        self.edit_survey(index, &[("mocks", name)], &["covariance", "covariance_rows", "mock_count"])
    }

    /// The text of a file of the copy.
    pub(crate) fn text_of(&self, name: &str) -> String {
        let file = self.files.iter().find(|(known, _)| known == name);
        file.map_or_else(String::new, |(_, content)| String::from_utf8_lossy(content).into_owned())
    }

    /// One more file of the copy.
    pub fn with_file(mut self, name: &str, content: Vec<u8>) -> StudyCopy {
        self.files.push((name.to_owned(), content));
        self
    }

    /// Writes everything into a folder that does not exist yet; returns the study file's path.
    ///
    /// # Errors
    /// [`RunError::FolderExists`]; [`RunError::Unwritable`], and then nothing stays behind.
    pub fn write(&self, folder: &Path) -> Result<PathBuf, RunError> {
        if folder.symlink_metadata().is_ok() {
            return Err(RunError::FolderExists { path: folder.to_owned() });
        }
        let staging = match folder.file_name() {
            Some(name) => folder.with_file_name(format!(
                ".{}.unfinished-{}",
                name.to_string_lossy(),
                std::process::id()
            )),
            None => folder.to_owned(),
        };
        let write = || -> std::io::Result<()> {
            fs::create_dir_all(&staging)?;
            for (name, content) in &self.files {
                fs::write(staging.join(name), content)?;
            }
            fs::rename(&staging, folder)
        };
        write().map_err(|error| {
            let _ = fs::remove_dir_all(&staging);
            RunError::Unwritable { path: folder.to_owned(), reason: error.to_string() }
        })?;
        Ok(folder.join(STUDY_FILE))
    }
}

/// A survey's table, however it is written.
fn survey_of(document: &mut DocumentMut, index: usize) -> Option<&mut dyn TableLike> {
    match document.get_mut("survey")? {
        Item::ArrayOfTables(tables) => tables.get_mut(index).map(|table| table as &mut dyn TableLike),
        Item::Value(Value::Array(array)) => {
            array.get_mut(index).and_then(Value::as_inline_table_mut).map(|table| table as &mut dyn TableLike)
        }
        item => item.as_table_like_mut(),
    }
}

fn unreadable(path: &Path, reason: String) -> RunError {
    RunError::UnreadableRun { path: path.to_owned(), reason }
}

fn read(path: &Path) -> Result<Vec<u8>, RunError> {
    fs::read(path).map_err(|error| unreadable(path, error.to_string()))
}

/// Where a path stands in the study file's text, and what goes there.
fn edit<T>(written: &Located<T>, name: &str) -> Option<(usize, usize, String)> {
    match written.origin {
        Origin::Written(place) => Some((place.start, place.end, name.to_owned())),
        Origin::Set | Origin::Default => None,
    }
}
