//! `[[joint_covariance]]`: surveys that share volume have one covariance, one number of mocks, one noise.

use toml_edit::Value;

use super::covariance::{EmptyBlock, read_determined, read_empty_blocks, read_mock_count, read_noise};
use super::section::Section;
use super::source::Located;

/// `[[joint_covariance]]`: what surveys that share volume have in place of a covariance and a noise of their own.
#[derive(Clone, Debug, PartialEq)]
pub struct JointCovarianceSection {
    /// Names of the surveys, at least two, in the order of the covariance's rows.
    pub surveys: Located<Vec<String>>,
    /// Path of the covariance, as written; none: estimated from the surveys' `mocks`, realisation by realisation.
    pub file: Option<Located<String>>,
    /// How many mocks the covariance was estimated from.
    pub mock_count: Option<Located<u64>>,
    /// Name of the noise model, one of [`noise_families`](oddwell_likelihood::noise_families); default `gaussian`.
    pub noise: Located<&'static str>,
    /// n_θ of noise `percival`; none: counted.
    pub determined: Option<Located<u64>>,
    /// Path of a covariance to be added, as written.
    pub extra_covariance: Option<Located<String>>,
    /// Path of a model covariance that an estimate from mocks is shrunk towards, as written.
    pub shrink_towards: Option<Located<String>>,
    /// Surveys, or bins as `SURVEY.BIN`, between which the covariance is declared empty.
    pub empty_blocks: Option<Located<Vec<EmptyBlock>>>,
}

impl JointCovarianceSection {
    pub(super) fn read(section: Section<'_>) -> Option<Self> {
        let surveys = read_surveys(&section);
        let file = section.text("file", "\"joint-covariance.csv\"");
        let mock_count = read_mock_count(&section);
        let noise = read_noise(&section);
        let determined = read_determined(&section);
        let extra_covariance = section.text("extra_covariance", "\"theory-covariance.csv\"");
        let shrink_towards = section.text("shrink_towards", "\"model-covariance.csv\"");
        let empty_blocks = read_empty_blocks(&section);
        section.finish();
        Some(Self {
            surveys: surveys?,
            file,
            mock_count,
            noise: noise?,
            determined,
            extra_covariance,
            shrink_towards,
            empty_blocks: empty_blocks?,
        })
    }
}

impl JointCovarianceSection {
    /// The paths of covariances.
    pub(crate) fn covariance_keys(&self) -> impl Iterator<Item = &Located<String>> {
        [&self.file, &self.extra_covariance, &self.shrink_towards].into_iter().flatten()
    }
}

fn read_surveys(section: &Section<'_>) -> Option<Located<Vec<String>>> {
    let example = "[\"one\", \"other\"]";
    let Some((_, item)) = section.find("surveys") else {
        section.missing("surveys", &format!("surveys = {example}"));
        return None;
    };
    let name = |value: &Value| value.as_str().map(str::to_owned);
    let names = item.as_array().and_then(|list| list.iter().map(name).collect::<Option<Vec<_>>>());
    let Some(value) = names.filter(|names| names.len() > 1) else {
        section.wrong_type("surveys", "a list of two surveys or more", item, example);
        return None;
    };
    Some(Located { value, origin: section.origin("surveys", item) })
}
