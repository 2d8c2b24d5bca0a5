//! The covariance of a survey's kept rows, or of the kept rows of surveys that share volume.

use super::survey_rows::SurveyRows;
use crate::checksum::{InputHashes, file_sha256};
use crate::file::{EmptyBlock, JointCovarianceSection, Located, SurveySection};
use crate::resolve::{Study, is_pattern};
use crate::run_error::RunError;
use crate::warnings::Warning;
use oddwell_likelihood::{
    Covariance, MockSet, NoiseChoice, read_covariance, read_extra_covariance, read_mock_tables, read_mocks,
};

/// What the study says of a covariance and its noise.
#[derive(Clone, Copy, Debug)]
pub(super) struct CovarianceKeys<'a> {
    covariance: Option<&'a Located<String>>,
    mock_count: Option<&'a Located<u64>>,
    noise: &'static str,
    determined: Option<&'a Located<u64>>,
    extra: Option<&'a Located<String>>,
    model: Option<&'a Located<String>>,
    empty: &'a [EmptyBlock],
}

impl<'a> CovarianceKeys<'a> {
    pub(super) fn of_survey(section: &'a SurveySection) -> Self {
        CovarianceKeys {
            covariance: section.covariance.as_ref(),
            mock_count: section.mock_count.as_ref(),
            noise: section.noise.value,
            determined: section.determined.as_ref(),
            extra: section.extra_covariance.as_ref(),
            model: section.shrink_towards.as_ref(),
            empty: section.empty_blocks.as_ref().map_or(&[], |blocks| &blocks.value),
        }
    }

    pub(super) fn of_joint(section: &'a JointCovarianceSection) -> Self {
        CovarianceKeys {
            covariance: section.file.as_ref(),
            mock_count: section.mock_count.as_ref(),
            noise: section.noise.value,
            determined: section.determined.as_ref(),
            extra: section.extra_covariance.as_ref(),
            model: section.shrink_towards.as_ref(),
            empty: section.empty_blocks.as_ref().map_or(&[], |blocks| &blocks.value),
        }
    }
}

/// A survey whose rows the covariance has.
#[derive(Clone, Copy, Debug)]
pub(super) struct Member<'a> {
    pub(super) section: &'a SurveySection,
    pub(super) rows: &'a SurveyRows,
    /// Whether its kept rows are part of the likelihood; else it only takes its place in the arrays.
    pub(super) present: bool,
}

/// The covariance of all kept rows of the members that are present, and the noise that goes with it.
#[derive(Clone, Debug)]
pub(super) struct Noisy {
    pub(super) covariance: Covariance,
    pub(super) noise: NoiseChoice,
    /// The share of the model, where an estimate from mocks was shrunk towards one.
    pub(super) shrinkage: Option<f64>,
}

/// Reads covariance, mocks and what goes with them. `members` come in the order of the arrays' rows; the result has their
/// kept rows in the order of `order`, positions in `members`.
///
/// # Errors
/// [`RunError`] for a file that can't be read, is of another size, or holds no covariance.
pub(super) fn read_noise(
    study: &Study,
    keys: &CovarianceKeys<'_>,
    (members, order): (&[Member<'_>], &[usize]),
    inputs: &mut InputHashes,
    warnings: &mut Vec<Warning>,
) -> Result<Noisy, RunError> {
    let mut reader = Reader { study, members, order, inputs, warnings };
    let places = reader.places()?;
    let all: usize = members.iter().map(|member| member.rows.array_rows()).sum();
    let (mut covariance, mock_count, shrinkage) = reader.statistical(keys, &places, all)?;
    let parts = reader.parts();
    for (one, other) in keys.empty {
        let rows_of = |name: &str| -> Vec<usize> {
            let holds = |part: &[String; 3]| part.iter().any(|known| known == name);
            (0..parts.len()).filter(|&row| holds(&parts[row])).collect()
        };
        covariance = covariance.with_empty_block(&rows_of(one), &rows_of(other));
    }
    if let Some(extra) = keys.extra {
        let path = reader.input(&extra.value);
        let extra = read_extra_covariance(path, all)?.select(&places).scaled(&reader.factors());
        covariance = covariance.plus(&extra).map_err(|error| reader.in_surveys(error.into()))?;
    }
    let mut noise = NoiseChoice::new(keys.noise, mock_count)
        .map_err(|source| RunError::Noise { survey: reader.name(), source })?;
    if let Some(determined) = keys.determined {
        noise = noise.with_determined(determined.value as usize);
    }
    Ok(Noisy { covariance, noise, shrinkage })
}

struct Reader<'a, 'b> {
    study: &'a Study,
    members: &'a [Member<'a>],
    order: &'a [usize],
    inputs: &'b mut InputHashes,
    warnings: &'b mut Vec<Warning>,
}

impl<'a> Reader<'a, '_> {
    /// The members that are present, in the order of the result.
    fn present(&self) -> impl Iterator<Item = &'a Member<'a>> {
        let members = self.members;
        self.order.iter().map(move |&index| &members[index]).filter(|member| member.present)
    }

    fn name(&self) -> String {
        let names: Vec<&str> = self.present().map(|member| member.section.name.value.as_str()).collect();
        names.join("` with `")
    }

    fn in_surveys(&self, source: oddwell_likelihood::LikelihoodError) -> RunError {
        RunError::Likelihood { survey: self.name(), source }
    }

    /// The path of an input, which is put on record.
    fn input(&mut self, written: &str) -> std::path::PathBuf {
        let path = self.study.file.path_of(written);
        self.inputs.add(&path, file_sha256(&path));
        path
    }

    /// The place of each row of the result in arrays that hold the rows of all members.
    fn places(&self) -> Result<Vec<usize>, RunError> {
        let mut firsts = Vec::new();
        let mut first = 0;
        for member in self.members {
            firsts.push(first);
            first += member.rows.array_rows();
        }
        let mut places = Vec::new();
        for &index in self.order.iter().filter(|&&index| self.members[index].present) {
            let own = self.members[index].rows.kept_in_array()?;
            places.extend(own.into_iter().map(|place| firsts[index] + place));
        }
        Ok(places)
    }

    fn factors(&self) -> Vec<f64> {
        self.present().flat_map(|member| member.rows.factors()).collect()
    }

    fn labels(&self) -> Vec<String> {
        let several = self.present().count() > 1;
        let labels = self.present().flat_map(|member| {
            let labels = member.rows.kept_table().row_labels().into_iter();
            labels.map(|label| match several {
                true => format!("{} {label}", member.section.name.value),
                false => label,
            })
        });
        labels.collect()
    }

    /// What each row of the result belongs to: its survey, its bin, and both.
    fn parts(&self) -> Vec<[String; 3]> {
        let alone = self.members.len() == 1;
        let parts = self.present().flat_map(|member| {
            let survey = &member.section.name.value;
            let rows = member.rows.kept.iter().map(|&row| &member.rows.table.rows[row].bin);
            // A bin is called by its name alone where there is one survey, and a survey only where there are several.
            rows.map(move |bin| match alone {
                true => [String::new(), bin.clone(), String::new()],
                false => [survey.clone(), String::new(), format!("{survey}.{bin}")],
            })
        });
        parts.collect()
    }

    /// The covariance of the noise of the measurements, the number of mocks behind it, and the share of a model in it.
    fn statistical(
        &mut self,
        keys: &CovarianceKeys<'_>,
        places: &[usize],
        all: usize,
    ) -> Result<(Covariance, Option<usize>, Option<f64>), RunError> {
        let mock_count = keys.mock_count.map(|count| count.value as usize);
        if let Some(path) = keys.covariance {
            let path = self.input(&path.value);
            let covariance = read_covariance(path, all)?.select(places).scaled(&self.factors());
            return Ok((covariance.with_labels(self.labels()), mock_count, None));
        }
        let present: Vec<&Member<'_>> = self.present().collect();
        if let [Member { section: SurveySection { mocks: None, .. }, rows, .. }] = present[..] {
            let covariance =
                Covariance::from_errors(&rows.table).map_err(|error| self.in_surveys(error.into()))?;
            return Ok((covariance.select(&rows.kept), mock_count, None));
        }
        let mut mocks = Vec::new();
        for member in present {
            mocks.push(self.mocks(member)?);
        }
        let mocks = MockSet::joined(&mocks).map_err(oddwell_likelihood::DataError::from)?;
        let mocks = mocks.scaled(&self.factors()).with_labels(self.labels());
        let count = Some(mocks.mock_count());
        let Some(model) = keys.model else { return Ok((mocks.covariance()?, count, None)) };
        let path = self.input(&model.value);
        let model = read_covariance(path, all)?.select(places).scaled(&self.factors());
        let shrunk = mocks.shrunk(&model).map_err(|error| self.in_surveys(error.into()))?;
        Ok((shrunk.covariance, count, Some(shrunk.share)))
    }

    /// A survey's mocks, of its kept rows.
    fn mocks(&mut self, member: &Member<'_>) -> Result<MockSet, RunError> {
        let Member { section, rows, .. } = member;
        // The study was resolved: a survey without a covariance, in company, has mocks.
        let written = section.mocks.as_ref().map_or("", |mocks| mocks.value.as_str());
        if !is_pattern(written) {
            let path = self.input(written);
            return Ok(read_mocks(path, rows.array_rows())?.select(&rows.kept_in_array()?));
        }
        let read = read_mock_tables(&self.study.file.folder, written, &rows.columns, &rows.as_written)?;
        for file in &read.files {
            self.inputs.add(file, file_sha256(file));
        }
        if !read.missing.is_empty() {
            self.warnings.push(Warning::MissingMocks {
                survey: section.name.value.clone(),
                pattern: written.to_owned(),
                found: read.files.len(),
                missing: read.missing,
            });
        }
        Ok(read.mocks.select(&rows.kept))
    }
}
