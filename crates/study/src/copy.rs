//! A complete copy of a study with other measurements, in a folder of its own.

use crate::assemble::Measurements;
use crate::file::{Located, Origin, PowerChoice};
use crate::resolve::{Study, is_pattern};
use crate::run_error::RunError;
use oddwell_likelihood::{Axis, LengthUnit, mock_files, with_values};
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
            let own = section.covariance_keys();
            let templates = section.templates.iter().map(|template| &template.file);
            let of_window = [&section.window, &section.window_rows].into_iter().flatten();
            for other in own.chain(of_window).chain(templates) {
                edits.extend(copy.take(study, other, &section.name.value)?);
            }
            if let Some(mocks) = &section.mocks {
                edits.extend(copy.take_mocks(study, mocks, &section.name.value)?);
            }
        }
        for joint in &study.file.joint_covariances {
            for other in joint.covariance_keys() {
                edits.extend(copy.take(study, other, "joint")?);
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

    /// Takes a file in that the study refers to; where that stands, and what to put there.
    fn take(
        &mut self,
        study: &Study,
        written: &Located<String>,
        owner: &str,
    ) -> Result<Option<(usize, usize, String)>, RunError> {
        let content = read(&study.file.path_of(&written.value))?;
        let name = self.add(&written.value, owner, content);
        Ok(edit(written, &name))
    }

    /// Takes mocks in: an array like any file, tables into a folder of their own, which holds nothing else.
    fn take_mocks(
        &mut self,
        study: &Study,
        written: &Located<String>,
        survey: &str,
    ) -> Result<Option<(usize, usize, String)>, RunError> {
        if !is_pattern(&written.value) {
            return self.take(study, written, survey);
        }
        let paths = mock_files(&study.file.folder, &written.value)?;
        let base = |path: &PathBuf| path.file_name().unwrap_or_default().to_string_lossy().into_owned();
        let mut names: Vec<String> = paths.iter().map(base).collect();
        let distinct = names.iter().collect::<std::collections::BTreeSet<_>>().len();
        if distinct < names.len() {
            // Of different folders: numbered in the order of their paths.
            names =
                names.iter().enumerate().map(|(number, name)| format!("{:06}-{name}", number + 1)).collect();
        }
        let folder = format!("{survey}-mocks");
        for (path, name) in paths.iter().zip(names) {
            self.files.push((format!("{folder}/{name}"), read(path)?));
        }
        Ok(edit(written, &format!("{folder}/*")))
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

    /// Gives keys of the survey of this name these texts for values, and removes others, wherever they stand in the copy's
    /// study file.
    ///
    /// # Errors
    /// [`RunError::UnreadableRun`] where the copy is no study file (never: its original was read).
    pub(crate) fn edit_survey(
        &mut self,
        survey: &str,
        texts: &[(&str, String)],
        remove: &[&str],
    ) -> Result<(), RunError> {
        let mut document = self.document()?;
        if let Some(survey) = survey_of(&mut document, survey) {
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
    pub(crate) fn with_mocks(&mut self, survey: &str, mocks: Vec<u8>) -> Result<(), RunError> {
        let text = String::from_utf8_lossy(&self.files[0].1).into_owned();
        let document: Option<DocumentMut> = text.parse().ok();
        let covariance = document.and_then(|mut document| {
            survey_of(&mut document, survey)?.get("covariance")?.as_str().map(str::to_owned)
        });
        self.files.retain(|(name, _)| Some(name) != covariance.as_ref());
        let name = self.add(&format!("{survey}-mocks.npy"), survey, mocks);
        self.edit_survey(survey, &[("mocks", name)], &["covariance", "covariance_rows", "mock_count"])
    }

    /// Every joint covariance is estimated from its surveys' mocks.
    ///
    /// # Errors
    /// As [`StudyCopy::edit_survey`].
    pub(crate) fn with_joint_mocks(&mut self) -> Result<(), RunError> {
        let mut document = self.document()?;
        let mut replaced = Vec::new();
        for joint in tables_of(&mut document, "joint_covariance") {
            let file = joint.remove("file");
            replaced.extend(file.and_then(|file| file.as_str().map(str::to_owned)));
            joint.remove("mock_count");
        }
        self.files[0].1 = document.to_string().into_bytes();
        self.files.retain(|(name, _)| !replaced.contains(name));
        Ok(())
    }

    fn document(&self) -> Result<DocumentMut, RunError> {
        let text = String::from_utf8_lossy(&self.files[0].1);
        text.parse().map_err(|error: TomlError| unreadable(Path::new(STUDY_FILE), error.to_string()))
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
                let path = staging.join(name);
                if let Some(folder) = path.parent() {
                    fs::create_dir_all(folder)?;
                }
                fs::write(path, content)?;
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
fn survey_of<'a>(document: &'a mut DocumentMut, survey: &str) -> Option<&'a mut dyn TableLike> {
    tables_of(document, "survey")
        .into_iter()
        .find(|table| table.get("name").and_then(Item::as_str) == Some(survey))
}

/// The tables of a key that holds several, however they are written.
fn tables_of<'a>(document: &'a mut DocumentMut, key: &str) -> Vec<&'a mut dyn TableLike> {
    match document.get_mut(key) {
        None => Vec::new(),
        Some(Item::ArrayOfTables(tables)) => {
            tables.iter_mut().map(|table| table as &mut dyn TableLike).collect()
        }
        Some(Item::Value(Value::Array(array))) => array
            .iter_mut()
            .filter_map(|value| value.as_inline_table_mut().map(|table| table as &mut dyn TableLike))
            .collect(),
        Some(item) => item.as_table_like_mut().into_iter().collect(),
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
