//! From what was typed to what can be used: names resolved, rules checked, every index known.

mod affine;
mod checker;
mod covariances;
mod departure;
mod design;
mod hypothesis;
mod link;
mod names;
mod redshifts;
mod restrict;
mod systematics;
mod templates;
mod values;

use std::path::Path;

use oddwell_likelihood::LengthUnit;

pub use affine::AffineForm;
pub(crate) use covariances::is_pattern;
pub use hypothesis::{FreeParameter, FreePrior, Hypothesis, JointBlock, ResolvedQuantity, State};
pub use restrict::Restriction;
pub use systematics::Move;
pub(crate) use values::{QuantityRule, rule_of};

use crate::error::{Location, Problem, StudyError};
use crate::fault::Fault;
use crate::file::{HypothesisSection, Located, Override, Quantity, QuantityPlace, StudyFile, SurveySection};
use crate::nearest::Nearest;
use checker::{Checker, name_covers};

/// A quantity under its dotted name.
#[derive(Clone, Debug)]
struct Entry {
    name: String,
    given: Located<Quantity>,
}

/// A study that can be used.
#[derive(Clone, Debug)]
pub struct Study {
    /// What was typed, with `--set` in place.
    pub file: StudyFile,
    /// Every hypothesis, in the order of the file; at least one.
    pub hypotheses: Vec<Hypothesis>,
    default: usize,
    overrides: Vec<Override>,
    absent: Vec<SurveySection>,
    restriction: Restriction,
    /// The file as it was, where surveys or bins are left out of this one.
    whole: Option<Box<StudyFile>>,
}

impl Study {
    /// Reads a study file and resolves it.
    ///
    /// # Errors
    /// As [`StudyFile::read`] and [`Study::resolve`].
    pub fn read(path: impl AsRef<Path>, overrides: &[Override]) -> Result<Self, StudyError> {
        Self::resolve(StudyFile::read(path)?, overrides)
    }

    /// Resolves a study file, for all its hypotheses, after putting the overrides of the command line in place.
    ///
    /// # Errors
    /// [`StudyError::Problems`]: names that are doubled or cannot be names, held values outside their range, ties and
    /// systematics that lead nowhere, two priors of one quantity, departures that the rest of the study excludes, an
    /// override of a quantity that no hypothesis has.
    pub fn resolve(mut file: StudyFile, overrides: &[Override]) -> Result<Self, StudyError> {
        gather_joint(&mut file);
        // Before the overrides: `--set departure.tau=0.5` shall not send the user to another hypothesis.
        let default = file.hypotheses.iter().position(|section| infers(&file, section)).unwrap_or(0);
        let elsewhere: Vec<&Override> =
            overrides.iter().filter(|each| !file.set(&each.name, &each.quantity)).collect();
        let entries: Vec<Entry> = file
            .places()
            .into_iter()
            .filter_map(|(name, place)| match place {
                QuantityPlace::Given(given) => Some(Entry { name, given: given.clone() }),
                QuantityPlace::Optional(given) => given.clone().map(|given| Entry { name, given }),
            })
            .collect();
        let mut checker = Checker::new(&file, overrides);
        names::check(&file, &mut checker);
        values::check_quantities(&entries, &mut checker);
        values::check_surveys(&file, &mut checker);
        covariances::check(&file, &mut checker);
        if !checker.is_clean() {
            // Dotted names may be ambiguous, and what follows looks them up.
            return StudyError::unless_none(checker.problems, None);
        }
        let own: Vec<Vec<Entry>> =
            file.hypotheses.iter().map(|section| departure::entries(&file, section, overrides)).collect();
        let departures: Vec<String> = own.iter().flatten().map(|entry| entry.name.clone()).collect();
        for each in elsewhere {
            if !departures.iter().any(|name| name_covers(&each.name, name)) {
                let known = entries.iter().map(|entry| &entry.name).chain(&departures);
                let (name, nearest) = (each.name.clone(), Nearest::find(&each.name, known));
                let fault = Fault::UnknownQuantity { subject: "`--set`".to_owned(), name, nearest };
                checker.fault(crate::file::Origin::Set, &each.name, fault);
            }
        }
        let moves = systematics::moves(&file, &entries, &mut checker);
        let integrable = templates::integrable(&file, &entries, &moves);
        let shared = (&moves[..], &integrable[..]);
        let mut hypotheses = Vec::new();
        for (section, own) in file.hypotheses.iter().zip(own) {
            let all = entries.iter().cloned().chain(own).collect();
            let linked = link::link(section, all, shared, &file.joint_priors, &departures, &mut checker);
            if let Some(hypothesis) = linked {
                departure::check(&file, section, &hypothesis, &mut checker);
                hypotheses.push(hypothesis);
            }
        }
        check_units(&file, &hypotheses, &mut checker);
        let problems = checker.problems;
        let (absent, restriction) = (Vec::new(), Restriction::default());
        let overrides = overrides.to_vec();
        let study = Self { file, hypotheses, default, overrides, absent, restriction, whole: None };
        StudyError::unless_none(problems, Some(study))
    }

    /// Surveys of the file that a restriction leaves out.
    pub fn absent(&self) -> &[SurveySection] {
        &self.absent
    }

    /// What the command line changed.
    pub fn overrides(&self) -> &[Override] {
        &self.overrides
    }

    /// The hypothesis that `fit` takes without being told: the first whose departure the file infers, else the first.
    pub fn default_hypothesis(&self) -> &Hypothesis {
        &self.hypotheses[self.default]
    }

    /// The hypothesis of that name; without a name, [`Study::default_hypothesis`].
    ///
    /// # Errors
    /// [`StudyError::Problems`] for a name that the study does not have, and for an override of a quantity that this
    /// hypothesis does not have.
    pub fn hypothesis(&self, name: Option<&str>) -> Result<&Hypothesis, StudyError> {
        let file = || self.file.source.name().to_owned();
        let chosen = match name {
            None => self.default_hypothesis(),
            Some(name) => match self.hypotheses.iter().find(|hypothesis| hypothesis.name == name) {
                Some(hypothesis) => hypothesis,
                None => {
                    let known = self.hypotheses.iter().map(|hypothesis| &hypothesis.name);
                    let (name, nearest) = (name.to_owned(), Nearest::find(name, known));
                    let fault = Fault::UnknownHypothesis { name, nearest };
                    let location = Location::WholeFile { file: file() };
                    return Err(StudyError::Problems(vec![Problem { location, fault }]));
                }
            },
        };
        let names = || chosen.quantities.iter().map(|quantity| &quantity.name);
        let problems: Vec<Problem> = self
            .overrides
            .iter()
            .filter(|each| !names().any(|name| name_covers(&each.name, name)))
            .map(|each| Problem {
                location: Location::Option { option: each.option.clone() },
                fault: Fault::SetElsewhere {
                    hypothesis: chosen.name.clone(),
                    name: each.name.clone(),
                    nearest: Nearest::find(&each.name, names()),
                },
            })
            .collect();
        StudyError::unless_none(problems, Some(chosen))
    }
}

/// Surveys that share a covariance stand together, in the file's order, behind the first of them: their rows then follow
/// each other.
fn gather_joint(file: &mut StudyFile) {
    let first_of = |name: &str, names: &[String]| -> usize {
        let joint =
            file.joint_covariances.iter().find(|joint| joint.surveys.value.iter().any(|each| each == name));
        let member = |each: &String| joint.is_none_or(|joint| joint.surveys.value.contains(each));
        match joint {
            Some(_) => names.iter().position(member).unwrap_or(usize::MAX),
            None => names.iter().position(|each| each == name).unwrap_or(usize::MAX),
        }
    };
    let names: Vec<String> = file.surveys.iter().map(|survey| survey.name.value.clone()).collect();
    let places: Vec<usize> = names.iter().map(|name| first_of(name, &names)).collect();
    let mut surveys: Vec<_> = places.into_iter().zip(std::mem::take(&mut file.surveys)).collect();
    // Stable, so that members keep the file's order among themselves.
    surveys.sort_by_key(|(place, _)| *place);
    file.surveys = surveys.into_iter().map(|(_, survey)| survey).collect();
}

/// Whether a departure has a prior, its own or a joint one.
fn infers(file: &StudyFile, section: &HypothesisSection) -> bool {
    section.parameters.iter().any(|(key, given)| {
        let name = format!("departure.{key}");
        matches!(given.value, Quantity::Prior(_))
            || file.joint_priors.iter().flat_map(|joint| &joint.of.value).any(|of| name_covers(&name, of))
    })
}

/// Lengths in Mpc are converted once, so h must be known: the fiducial one, or else a held one.
fn check_units(file: &StudyFile, hypotheses: &[Hypothesis], checker: &mut Checker<'_>) {
    let inferred = hypotheses
        .iter()
        .filter_map(|hypothesis| hypothesis.quantity("background.h"))
        .any(|h| !h.form.is_held());
    for survey in file.surveys.iter().filter(|survey| survey.unit.value == LengthUnit::Megaparsec) {
        let given = survey.fiducial.as_ref().is_some_and(|fiducial| fiducial.h.is_some());
        if inferred && !given {
            let fault = Fault::UnitNeedsHeldH { survey: survey.name.value.clone() };
            checker.fault(survey.unit.origin, "unit", fault);
        }
    }
}
