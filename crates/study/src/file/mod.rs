//! The study file as typed: every value with its place, nothing looked up yet.

mod background;
mod blinding;
mod covariance;
mod design;
mod fiducial;
mod hypothesis;
mod joint_covariance;
mod joint_prior;
mod keep;
mod overrides;
mod places;
mod quantity;
mod sampling;
mod section;
mod source;
mod survey;
mod systematic;
mod template;

use std::path::{Path, PathBuf};

use toml_edit::Document;

pub use background::{BackgroundSection, PowerChoice, PredictionSection};
pub use blinding::BlindingSection;
pub use covariance::EmptyBlock;
pub use design::{BinDesignSection, DesignSection};
pub use fiducial::FiducialSection;
pub use hypothesis::{HypothesisSection, Shape};
pub use joint_covariance::JointCovarianceSection;
pub use joint_prior::JointPriorSection;
pub use keep::KeepSection;
pub use overrides::Override;
pub(crate) use places::{QuantityPlace, template_name};
pub use quantity::{PriorSpec, Quantity};
pub use sampling::SamplingSection;
pub use source::{Located, Origin, Place, Source};
pub use survey::{BinSection, SurveySection, TracerSection};
pub use systematic::{MoveEntry, SystematicSection};
pub use template::TemplateSection;

use crate::error::StudyError;
use crate::fault::Fault;
use section::{Reader, Section};

/// A study file as typed.
#[derive(Clone, Debug, PartialEq)]
pub struct StudyFile {
    /// The text and its name, for messages and for the manifest.
    pub source: Source,
    /// The folder that relative paths start from.
    pub folder: PathBuf,
    /// `title`; by default the file's name without extension.
    pub title: Located<String>,
    /// `[background]`.
    pub background: BackgroundSection,
    /// `[prediction]`.
    pub prediction: PredictionSection,
    /// `[[survey]]`, at least one.
    pub surveys: Vec<SurveySection>,
    /// `[[joint_covariance]]`.
    pub joint_covariances: Vec<JointCovarianceSection>,
    /// `[[systematic]]`.
    pub systematics: Vec<SystematicSection>,
    /// `[[joint_prior]]`.
    pub joint_priors: Vec<JointPriorSection>,
    /// `[[hypothesis]]`, at least one.
    pub hypotheses: Vec<HypothesisSection>,
    /// `[sampling]`.
    pub sampling: SamplingSection,
    /// `[blinding]`, where the measurements are blinded.
    pub blinding: Option<BlindingSection>,
}

impl StudyFile {
    /// Reads a study file.
    ///
    /// # Errors
    /// [`StudyError::Unreadable`] where there is no such file, it is a folder or not UTF-8; else as [`StudyFile::parse`].
    pub fn read(path: impl AsRef<Path>) -> Result<Self, StudyError> {
        let path = path.as_ref();
        let unreadable = |reason: String| StudyError::Unreadable { path: path.to_owned(), reason };
        if path.is_dir() {
            return Err(unreadable("it is a folder".to_owned()));
        }
        let bytes = std::fs::read(path).map_err(|error| match error.kind() {
            std::io::ErrorKind::NotFound => unreadable("there is no such file".to_owned()),
            _ => unreadable(error.to_string()),
        })?;
        let text = String::from_utf8(bytes).map_err(|_| unreadable("it is not UTF-8 text".to_owned()))?;
        let folder = path.parent().map(Path::to_owned).unwrap_or_default();
        Self::parse(&path.display().to_string(), text, folder)
    }

    /// Reads the text of a study file; `name` is what errors call it.
    ///
    /// # Errors
    /// [`StudyError::Problems`] with every broken rule that can be told apart: text that is not TOML, unknown keys,
    /// missing keys, values of the wrong kind or outside their range, priors that their family refuses.
    pub fn parse(
        name: &str,
        text: impl Into<String>,
        folder: impl Into<PathBuf>,
    ) -> Result<Self, StudyError> {
        let source = Source::of_file(name, text);
        let reader = Reader::new(&source);
        let folder = folder.into();
        let read = match Document::parse(source.text()) {
            Ok(document) => {
                let root = Section::new(&reader, document.as_table(), None, "study", "the study file");
                Parts::read(root, &source)
            }
            Err(error) => {
                let message = error.message().lines().collect::<Vec<_>>().join(", ");
                reader.fault(error.span(), Fault::Syntax { message });
                None
            }
        };
        let parts = StudyError::unless_none(reader.into_problems(), read)?;
        let Parts {
            title,
            background,
            prediction,
            surveys,
            joint_covariances,
            systematics,
            joint_priors,
            hypotheses,
            sampling,
            blinding,
        } = parts;
        Ok(Self {
            source,
            folder,
            title,
            background,
            prediction,
            surveys,
            joint_covariances,
            systematics,
            joint_priors,
            hypotheses,
            sampling,
            blinding,
        })
    }

    /// The joint covariance that speaks for a survey.
    pub fn joint_covariance_of(&self, survey: &str) -> Option<&JointCovarianceSection> {
        self.joint_covariances.iter().find(|joint| joint.surveys.value.iter().any(|name| name == survey))
    }

    /// The noise model of a survey's rows: its own, or that of the surveys that it shares volume with.
    pub fn noise_of(&self, survey: &SurveySection) -> &'static str {
        let joint = self.joint_covariance_of(&survey.name.value);
        joint.map_or(survey.noise.value, |joint| joint.noise.value)
    }

    /// Where a path that is written in the study leads.
    pub fn path_of(&self, written: &str) -> PathBuf {
        self.folder.join(written)
    }
}

/// What [`StudyFile`] is read into while its text is borrowed.
struct Parts {
    title: Located<String>,
    background: BackgroundSection,
    prediction: PredictionSection,
    surveys: Vec<SurveySection>,
    joint_covariances: Vec<JointCovarianceSection>,
    systematics: Vec<SystematicSection>,
    joint_priors: Vec<JointPriorSection>,
    hypotheses: Vec<HypothesisSection>,
    sampling: SamplingSection,
    blinding: Option<BlindingSection>,
}

impl Parts {
    fn read(root: Section<'_>, source: &Source) -> Option<Self> {
        let title = match root.find("title") {
            Some(_) => root.text("title", "\"My surveys\""),
            None => Some(Located::default_of(stem(source.name()))),
        };
        if root.find("background").is_none() {
            root.missing("background", "[background]` with `omega_m`, `omega_b`, `h`, `n_s` and `sigma8");
        }
        for (key, example) in [
            ("survey", "[[survey]]` with its `[[survey.bin]]"),
            ("hypothesis", "[[hypothesis]]`, such as one with `departure = \"none\""),
        ] {
            if root.find(key).is_none() {
                root.missing(key, example);
            }
        }
        let example = "{ omega_m = 0.31, omega_b = 0.049, h = 0.68, n_s = 0.965, sigma8 = 0.81 }";
        let background =
            root.table("background", "background", "[background]", example).and_then(BackgroundSection::read);
        let prediction = match root.find("prediction") {
            Some(_) => root
                .table("prediction", "prediction", "[prediction]", "{ wide_angle = true }")
                .and_then(PredictionSection::read),
            None => Some(PredictionSection::defaults()),
        };
        let surveys = all(&root, "survey", "[[survey]]", SurveySection::read);
        let joint_covariances =
            all(&root, "joint_covariance", "[[joint_covariance]]", JointCovarianceSection::read);
        let systematics = all(&root, "systematic", "[[systematic]]", SystematicSection::read);
        let joint_priors = all(&root, "joint_prior", "[[joint_prior]]", JointPriorSection::read);
        let hypotheses = all(&root, "hypothesis", "[[hypothesis]]", HypothesisSection::read);
        let sampling = match root.find("sampling") {
            Some(_) => root
                .table("sampling", "sampling", "[sampling]", "{ effective_samples = 4000 }")
                .and_then(SamplingSection::read),
            None => Some(SamplingSection::defaults()),
        };
        let blinding = match root.find("blinding") {
            Some(_) => root
                .table("blinding", "blinding", "[blinding]", "{ commitment = \"…\" }")
                .and_then(BlindingSection::read)
                .map(Some),
            None => Some(None),
        };
        root.finish();
        Some(Self {
            title: title?,
            background: background?,
            prediction: prediction?,
            surveys: surveys?,
            joint_covariances: joint_covariances?,
            systematics: systematics?,
            joint_priors: joint_priors?,
            hypotheses: hypotheses?,
            sampling: sampling?,
            blinding: blinding?,
        })
    }
}

/// Reads every table of an array of tables, whatever is wrong with the others.
fn all<T>(
    root: &Section<'_>,
    kind: &'static str,
    label: &str,
    read: impl Fn(Section<'_>) -> Option<T>,
) -> Option<Vec<T>> {
    let read: Vec<Option<T>> =
        root.tables(kind, kind, label, "[{ name = \"…\" }]").into_iter().map(read).collect();
    read.into_iter().collect()
}

fn stem(name: &str) -> String {
    Path::new(name).file_stem().map_or_else(|| "study".to_owned(), |stem| stem.to_string_lossy().into_owned())
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Every (section, key) that is read.
    fn asked(text: &str) -> std::collections::BTreeSet<(&'static str, String)> {
        let source = Source::of_file("study.toml", text);
        let reader = Reader::new(&source);
        let document = Document::parse(source.text()).unwrap();
        Parts::read(Section::new(&reader, document.as_table(), None, "study", "the study file"), &source);
        reader.asked.take()
    }

    /// A text with every section, so that each asks for its keys; whether it makes a study does not matter.
    const EVERY_SECTION: &str = "
        background = { omega_m = { normal = [0.3, 0.1] } }
        prediction = {}
        sampling = {}
        blinding = {}
        joint_covariance = [{}]
        joint_prior = [{}]
        systematic = [{ moves = [{}] }]
        [[survey]]
        name = \"windmere\"
        fiducial = {}
        columns = {}
        keep = [{}]
        template = [{}]
        design = { separation = { low = 1.0 } }
        [[survey.bin]]
        design = {}
        first = {}
        second = {}
    ";

    /// The schema knows the keys that are read, and no others.
    #[test]
    fn the_schema_has_the_keys_that_are_read() {
        let mut text = EVERY_SECTION.to_owned();
        for shape in oddwell_model::departures::registry() {
            text.push_str(&format!("[[hypothesis]]\nname = \"h\"\ndeparture = \"{}\"\n", shape.name()));
        }
        let read = asked(&text);
        let told: std::collections::BTreeSet<(&'static str, String)> = crate::schema::study_keys()
            .into_iter()
            .flat_map(|keys| keys.keys.into_iter().map(move |key| (keys.section, key.name.to_owned())))
            .collect();
        let missing: Vec<_> = read.difference(&told).collect();
        assert!(missing.is_empty(), "the schema lacks {missing:?}");
        // Which family a prior is of is not asked key by key.
        let extra: Vec<_> = told.difference(&read).filter(|(section, _)| *section != "prior").collect();
        assert!(extra.is_empty(), "nobody reads {extra:?}");
    }

    #[test]
    fn the_template_explains_every_key_that_is_read() {
        let text = crate::template::study_text();
        let asked = asked(&text);
        assert!(asked.len() > 50, "{asked:?}");
        // Nobody writes `[blinding]` by hand.
        let written = |(section, key): &(&str, String)| *section != "columns" && key != "blinding";
        for (section, key) in asked.into_iter().filter(written) {
            let shown = text.contains(&format!("{key} = "))
                || text.contains(&format!("[{key}]"))
                || text.contains(&format!(".{key}]"))
                || (section == "keep"
                    && text.lines().any(|line| line.starts_with("# An entry") && line.contains(&key)));
            assert!(shown, "`{key}` of {section}");
        }
    }
}
