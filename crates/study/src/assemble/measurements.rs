//! Reads what a study measured.

use super::covariances::{CovarianceKeys, Member, Noisy, read_noise};
use super::survey_rows::SurveyRows;
use super::window::{SurveyWindow, read_window};
use crate::checksum::{InputHashes, file_sha256};
use crate::file::{BinSection, JointCovarianceSection, SurveySection, template_name};
use crate::nearest::Nearest;
use crate::record::InputFile;
use crate::resolve::Study;
use crate::run_error::RunError;
use crate::warnings::Warning;
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{Axis, Covariance, MultipoleTable, NoiseChoice, SurveyLikelihood, read_template};
use oddwell_model::{Pair, Row, Space};
use std::ops::Range;

/// One survey's kept rows and their likelihood.
#[derive(Clone, Debug)]
pub struct SurveyMeasurements {
    /// The survey's name.
    pub name: String,
    /// The rows that `keep` leaves, in the file's order, in Mpc/h.
    pub table: MultipoleTable,
    /// Rows that `keep` cut.
    pub cut: usize,
    /// Data, covariance and noise model of the kept rows by themselves: of a survey that shares volume with others, by its
    /// own block of their covariance.
    pub likelihood: SurveyLikelihood,
    /// Each kept row's index among the study's bins.
    pub bins: Vec<usize>,
    /// The h that converted lengths given in Mpc; none where they were given in Mpc/h.
    pub h: Option<f64>,
    /// What turns predictions into the kept rows, where the survey has a window.
    pub window: Option<SurveyWindow>,
    /// Shapes with amplitudes of their own.
    pub templates: Vec<SurveyTemplate>,
}

/// A template's shape over the kept rows of its survey.
#[derive(Clone, Debug, PartialEq)]
pub struct SurveyTemplate {
    /// The dotted name of its amplitude.
    pub name: String,
    /// One number a kept row, in the unit of the measured values.
    pub shape: DVector<f64>,
}

impl SurveyMeasurements {
    /// Positions of the rows of one bin (index among the study's bins).
    #[must_use]
    pub fn rows_of(&self, bin: usize) -> Vec<usize> {
        (0..self.bins.len()).filter(|&row| self.bins[row] == bin).collect()
    }
}

/// Surveys whose noise is one: a single survey, or those of a `[[joint_covariance]]`.
#[derive(Clone, Debug)]
pub struct NoiseGroup {
    /// Which surveys, by index.
    pub surveys: Range<usize>,
    /// Data, covariance and noise model of all their kept rows. Noise `percival` that leaves n_θ to be counted is `t` here,
    /// until [`Posterior::new`](crate::assemble::Posterior::new) has counted.
    pub likelihood: SurveyLikelihood,
    /// Noise `percival`, where n_θ is still to be counted.
    pub to_be_counted: Option<NoiseChoice>,
    /// The share of the model in the covariance, where an estimate from mocks was shrunk towards one.
    pub shrinkage: Option<f64>,
}

/// Everything a study measured.
#[derive(Clone, Debug)]
pub struct Measurements {
    /// By survey, in the study's order.
    pub surveys: Vec<SurveyMeasurements>,
    /// The same rows by what shares a noise, in the same order.
    pub groups: Vec<NoiseGroup>,
    /// All kept rows, survey after survey: what each measured number is.
    pub rows: Vec<Row>,
    /// Checksums of the files read, the study file first.
    pub inputs: Vec<InputFile>,
    /// What is suspicious.
    pub warnings: Vec<Warning>,
}

impl Measurements {
    /// The rows that a model has to predict: those measured, and in their place those of the window for a survey that
    /// has one.
    #[must_use]
    pub fn model_rows(&self) -> Vec<Row> {
        let mut rows = Vec::new();
        for (first, survey) in self.with_offsets() {
            let own = &self.rows[first..first + survey.table.len()];
            rows.extend(survey.window.as_ref().map_or(own, |window| &window.rows[..]));
        }
        rows
    }

    /// The name of the noise model of a survey, by its index, as the study has it.
    #[must_use]
    pub fn noise_name(&self, survey: usize) -> &'static str {
        let waiting = self.groups.iter().find(|group| group.surveys.contains(&survey));
        let waiting = waiting.and_then(|group| group.to_be_counted.as_ref());
        waiting.map_or_else(|| self.surveys[survey].likelihood.noise().name(), |noise| noise.family.name)
    }

    /// Each survey with the position of its first row.
    pub fn with_offsets(&self) -> impl Iterator<Item = (usize, &SurveyMeasurements)> {
        self.surveys.iter().scan(0, |first, survey| {
            let offset = *first;
            *first += survey.table.len();
            Some((offset, survey))
        })
    }

    /// The same rows with other measured values (simulated ones, say), survey after survey; covariances stay.
    ///
    /// # Panics
    /// Unless there is a value for each row.
    #[must_use]
    pub fn with_values(&self, values: &[f64]) -> Measurements {
        assert_eq!(values.len(), self.len(), "a value for each row");
        let mut changed = self.clone();
        let pick = |first: usize, count: usize| DVector::from_column_slice(&values[first..first + count]);
        let mut first = 0;
        for survey in &mut changed.surveys {
            let own = pick(first, survey.table.len());
            first += own.len();
            survey.table.rows.iter_mut().zip(own.iter()).for_each(|(row, value)| row.value = *value);
            survey.likelihood = survey.likelihood.clone().with_data(own);
        }
        first = 0;
        for group in &mut changed.groups {
            let own = pick(first, group.likelihood.rows());
            first += own.len();
            group.likelihood = group.likelihood.clone().with_data(own);
        }
        changed
    }

    /// How many numbers are kept.
    #[must_use]
    pub fn len(&self) -> usize {
        self.rows.len()
    }

    /// Whether nothing is kept (never: that is an error).
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.rows.is_empty()
    }
}

/// Reads the tables and covariances of all surveys, cuts by `keep`, converts units, and factors the covariances.
///
/// # Errors
/// [`RunError`] for a file that can't be read or breaks a rule, for rows without a bin and bins without a row, and where
/// the covariance does not go with the rows.
pub fn read_measurements(study: &Study) -> Result<Measurements, RunError> {
    read(study, true)
}

/// As [`read_measurements`], with a unit covariance in the place of every one: for predictions of rows whose covariance is
/// of no concern, and may not exist.
///
/// # Errors
/// As [`read_measurements`], covariances and mocks excepted.
pub(crate) fn read_rows_only(study: &Study) -> Result<Measurements, RunError> {
    read(study, false)
}

fn read(study: &Study, with_covariances: bool) -> Result<Measurements, RunError> {
    let mut inputs = InputHashes::new(study);
    let mut warnings = Vec::new();
    let mut tables = Vec::new();
    for section in &study.file.surveys {
        tables.push(SurveyRows::read(study, section, &mut inputs, &mut warnings)?);
    }
    let mut groups = Vec::new();
    let mut surveys = Vec::new();
    let mut first_bin = 0;
    for range in ranges(study) {
        let sections = &study.file.surveys[range.clone()];
        let joint = study.file.joint_covariance_of(&sections[0].name.value);
        let noisy = match with_covariances {
            true => noise_of(study, range.clone(), joint, &tables, &mut inputs, &mut warnings)?,
            false => unit_noise(&tables[range.clone()])?,
        };
        let name =
            sections.iter().map(|section| section.name.value.as_str()).collect::<Vec<_>>().join("` with `");
        let group = NoiseGroup::new(range.clone(), &name, &tables[range.clone()], &noisy)?;
        let mut first = 0;
        for (section, rows) in sections.iter().zip(&tables[range]) {
            let own: Vec<usize> = (first..first + rows.kept.len()).collect();
            first += rows.kept.len();
            let likelihood = match sections {
                [_] => group.likelihood.clone(),
                _ => {
                    likelihood(
                        &section.name.value,
                        rows.kept_table().values(),
                        noisy.covariance.select(&own),
                        &noisy.noise,
                    )?
                    .0
                }
            };
            surveys.push(survey(study, (section, rows, likelihood), first_bin, &mut inputs)?);
            first_bin += section.bins.len();
        }
        groups.push(group);
    }
    let rows = surveys.iter().flat_map(model_rows_of).collect();
    Ok(Measurements { surveys, groups, rows, inputs: inputs.finish(), warnings })
}

/// Surveys that share a noise stand together ([`Study::resolve`] sees to it).
fn ranges(study: &Study) -> Vec<Range<usize>> {
    let mut ranges: Vec<Range<usize>> = Vec::new();
    let surveys = &study.file.surveys;
    for (index, survey) in surveys.iter().enumerate() {
        let joint = study.file.joint_covariance_of(&survey.name.value);
        match ranges.last_mut() {
            Some(last)
                if joint
                    .is_some_and(|joint| joint.surveys.value.contains(&surveys[last.start].name.value)) =>
            {
                last.end = index + 1;
            }
            _ => ranges.push(index..index + 1),
        }
    }
    ranges
}

fn noise_of(
    study: &Study,
    range: Range<usize>,
    joint: Option<&JointCovarianceSection>,
    tables: &[SurveyRows],
    inputs: &mut InputHashes,
    warnings: &mut Vec<Warning>,
) -> Result<Noisy, RunError> {
    let Some(joint) = joint else {
        let (section, rows) = (&study.file.surveys[range.start], &tables[range.start]);
        let keys = CovarianceKeys::of_survey(section);
        return read_noise(
            study,
            &keys,
            (&[Member { section, rows, present: true }], &[0]),
            inputs,
            warnings,
        );
    };
    // Surveys that a restriction leaves out still take their place in the arrays.
    let mut absent: Vec<Option<(&SurveySection, SurveyRows)>> = Vec::new();
    for name in &joint.surveys.value {
        let section = study.absent().iter().find(|section| section.name.value == *name);
        absent.push(match section {
            Some(section) => Some((section, SurveyRows::read(study, section, inputs, warnings)?)),
            None => None,
        });
    }
    let mut members = Vec::new();
    let mut order: Vec<(usize, usize)> = Vec::new();
    for (name, absent) in joint.surveys.value.iter().zip(&absent) {
        if let Some((section, rows)) = absent {
            members.push(Member { section, rows, present: false });
            continue;
        }
        let here = range.clone().find(|&index| study.file.surveys[index].name.value == *name);
        if let Some(index) = here {
            order.push((index, members.len()));
            members.push(Member { section: &study.file.surveys[index], rows: &tables[index], present: true });
        }
    }
    order.sort_unstable();
    let order: Vec<usize> = order.into_iter().map(|(_, member)| member).collect();
    read_noise(study, &CovarianceKeys::of_joint(joint), (&members, &order), inputs, warnings)
}

fn unit_noise(tables: &[SurveyRows]) -> Result<Noisy, RunError> {
    let rows = tables.iter().map(|rows| rows.kept.len()).sum();
    let covariance = Covariance::new(DMatrix::identity(rows, rows), "unit covariance")
        .map_err(|error| RunError::Likelihood { survey: "all".to_owned(), source: error.into() })?;
    Ok(Noisy { covariance, noise: NoiseChoice::gaussian(), shrinkage: None })
}

/// A likelihood; where its noise waits for n_θ, with noise `t` meanwhile, and the noise that is waited for.
fn likelihood(
    name: &str,
    values: DVector<f64>,
    covariance: Covariance,
    noise: &NoiseChoice,
) -> Result<(SurveyLikelihood, Option<NoiseChoice>), RunError> {
    let waits = (noise.family.name == "percival" && noise.determined.is_none()).then_some(*noise);
    let meanwhile = match waits {
        Some(_) => NoiseChoice::new("t", noise.mock_count)
            .map_err(|source| RunError::Noise { survey: name.to_owned(), source })?,
        None => *noise,
    };
    let likelihood = SurveyLikelihood::from_covariance(values, covariance, &meanwhile)
        .map_err(|source| RunError::Likelihood { survey: name.to_owned(), source })?;
    Ok((likelihood, waits))
}

impl NoiseGroup {
    fn new(
        surveys: Range<usize>,
        name: &str,
        tables: &[SurveyRows],
        noisy: &Noisy,
    ) -> Result<NoiseGroup, RunError> {
        let values: Vec<f64> = tables
            .iter()
            .flat_map(|rows| rows.kept_table().values().iter().copied().collect::<Vec<_>>())
            .collect();
        let (likelihood, to_be_counted) =
            likelihood(name, DVector::from_vec(values), noisy.covariance.clone(), &noisy.noise)?;
        Ok(NoiseGroup { surveys, likelihood, to_be_counted, shrinkage: noisy.shrinkage })
    }
}

fn survey(
    study: &Study,
    (section, rows, likelihood): (&SurveySection, &SurveyRows, SurveyLikelihood),
    first_bin: usize,
    inputs: &mut InputHashes,
) -> Result<SurveyMeasurements, RunError> {
    let kept = (&rows.table, &rows.kept[..]);
    let window = read_window(study, section, kept, first_bin, rows.h, &rows.columns, inputs)?;
    let all_bins: Vec<String> = rows.table.bins().iter().map(ToString::to_string).collect();
    let table = rows.kept_table();
    let bins = bins_of_rows(section, &table, first_bin)?;
    check_every_bin_has_rows(study, section, &table, &all_bins)?;
    let factors = rows.factors();
    let mut templates = Vec::new();
    for template in &section.templates {
        let path = study.file.path_of(&template.file.value);
        let shape = read_template(&path, rows.table.len())?.select_rows(&rows.kept);
        inputs.add(&path, file_sha256(&path));
        let shape = DVector::from_fn(shape.len(), |row, _| shape[row] * factors[row]);
        let name = template_name(&section.name.value, &template.name.value);
        templates.push(SurveyTemplate { name, shape });
    }
    let cut = rows.table.len() - rows.kept.len();
    Ok(SurveyMeasurements {
        name: section.name.value.clone(),
        h: rows.h,
        table,
        cut,
        likelihood,
        bins,
        window,
        templates,
    })
}

fn model_rows_of(survey: &SurveyMeasurements) -> Vec<Row> {
    let rows = survey.table.rows.iter().zip(&survey.bins).map(|(row, &bin)| {
        // The table's reader has checked the pair.
        let pair = Pair::parse(&row.pair).unwrap_or(Pair::FirstSecond);
        let space = match row.axis {
            Axis::Separation => Space::Separation,
            Axis::Wavenumber => Space::Fourier,
        };
        Row { bin, pair, multipole: row.multipole, space, at: row.at, edges: row.edges }
    });
    rows.collect()
}

fn bins_of_rows(
    section: &SurveySection,
    table: &MultipoleTable,
    first_bin: usize,
) -> Result<Vec<usize>, RunError> {
    let names = || section.bins.iter().map(|bin| bin.name.value.as_str());
    table
        .rows
        .iter()
        .map(|row| {
            names().position(|name| name == row.bin).map(|position| first_bin + position).ok_or_else(|| {
                let nearest = Nearest::find(&row.bin, names());
                let close = nearest.name().filter(|_| nearest.is_close());
                let suggestion = close.map(|name| format!("; did you mean `{name}`?")).unwrap_or_default();
                RunError::RowWithoutBin {
                    file: table.file.clone(),
                    line: row.line,
                    bin: row.bin.clone(),
                    survey: section.name.value.clone(),
                    known: names().map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", "),
                    suggestion,
                }
            })
        })
        .collect()
}

fn check_every_bin_has_rows(
    study: &Study,
    section: &SurveySection,
    table: &MultipoleTable,
    before_keep: &[String],
) -> Result<(), RunError> {
    let lacks = |bin: &&BinSection| table.rows.iter().all(|row| row.bin != bin.name.value);
    match section.bins.iter().find(lacks) {
        None => Ok(()),
        Some(bin) => Err(RunError::BinWithoutRow {
            study: study.file.source.name().to_owned(),
            line: bin.name.origin.line().unwrap_or(1),
            survey: section.name.value.clone(),
            bin: bin.name.value.clone(),
            file: table.file.clone(),
            after_keep: if before_keep.contains(&bin.name.value) { " that passes `keep`" } else { "" },
        }),
    }
}
