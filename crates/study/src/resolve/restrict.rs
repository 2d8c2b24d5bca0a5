//! A part of a study: some surveys and bins, with the quantities that they depend on.

use super::hypothesis::{FreeParameter, FreePrior, Hypothesis, JointBlock, ResolvedQuantity, State};
use super::systematics::Move;
use super::{AffineForm, Study};
use crate::error::{Location, Problem, StudyError};
use crate::fault::Fault;
use crate::file::{KeepSection, Located, StudyFile, SurveySection};
use crate::nearest::Nearest;

/// Which surveys and bins are left in, each as `SURVEY` or `SURVEY.BIN`.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Restriction {
    /// These alone; empty: all.
    pub only: Vec<String>,
    /// These not.
    pub without: Vec<String>,
}

impl Restriction {
    /// Whether it leaves everything in.
    #[must_use]
    pub fn is_none(&self) -> bool {
        self.only.is_empty() && self.without.is_empty()
    }

    fn leaves(&self, survey: &str, bin: &str) -> bool {
        let covers = |name: &String| {
            name == survey || name.split_once('.').is_some_and(|(of, own)| of == survey && own == bin)
        };
        (self.only.is_empty() || self.only.iter().any(covers)) && !self.without.iter().any(covers)
    }
}

impl Study {
    /// The study with some of its surveys and bins alone. What is left of a hypothesis are the quantities of these bins, the
    /// common ones, and the free parameters that any of them depends on: a tie or a systematic that reaches across keeps its
    /// parameter under its own name, a joint prior its marginal.
    ///
    /// # Errors
    /// [`StudyError::Problems`] for a name that the study does not have, and where nothing is left.
    pub fn restricted(&self, restriction: &Restriction) -> Result<Study, StudyError> {
        if restriction.is_none() {
            return Ok(self.clone());
        }
        let known: Vec<String> = self
            .file
            .surveys
            .iter()
            .flat_map(|survey| {
                let own = &survey.name.value;
                let bins = survey.bins.iter().map(move |bin| format!("{own}.{}", bin.name.value));
                std::iter::once(own.clone()).chain(bins)
            })
            .collect();
        let mut problems = Vec::new();
        for (option, names) in [("--only", &restriction.only), ("--without", &restriction.without)] {
            for name in names.iter().filter(|name| !known.contains(name)) {
                let nearest = Nearest::find(name, &known);
                let fault = Fault::UnknownChoice { what: "survey or bin", value: name.clone(), nearest };
                problems.push(Problem {
                    location: Location::Option { option: format!("{option} {name}") },
                    fault,
                });
            }
        }
        let mut study = self.clone();
        study.restriction = restriction.clone();
        study.whole = Some(Box::new(self.whole_file().clone()));
        study.file.surveys.clear();
        for section in &self.file.surveys {
            match restrict_survey(section, restriction) {
                Some(left) => study.file.surveys.push(left),
                None => study.absent.push(section.clone()),
            }
        }
        if problems.is_empty() && study.file.surveys.is_empty() {
            let option = if restriction.without.is_empty() { "--only" } else { "--without" };
            let location = Location::Option { option: option.to_owned() };
            problems.push(Problem { location, fault: Fault::NothingLeft });
        }
        study.hypotheses = self.hypotheses.iter().map(|each| restrict_hypothesis(each, &study)).collect();
        StudyError::unless_none(problems, Some(study))
    }

    /// The study file with everything that a restriction leaves out.
    #[must_use]
    pub fn whole_file(&self) -> &StudyFile {
        self.whole.as_deref().unwrap_or(&self.file)
    }

    /// What was left in, of the study that was read.
    #[must_use]
    pub fn restriction(&self) -> &Restriction {
        &self.restriction
    }
}

fn restrict_survey(section: &SurveySection, restriction: &Restriction) -> Option<SurveySection> {
    let mut left = section.clone();
    let survey = &section.name.value;
    left.bins.retain(|bin| restriction.leaves(survey, &bin.name.value));
    let names: Vec<String> = left.bins.iter().map(|bin| bin.name.value.clone()).collect();
    let gone = section.bins.iter().map(|bin| bin.name.value.clone()).filter(|bin| !names.contains(bin));
    left.left_out.extend(gone);
    if !left.left_out.is_empty() {
        if left.keep.is_empty() {
            left.keep.push(KeepSection {
                separation: None,
                wavenumber: None,
                multipoles: None,
                bins: None,
                pairs: None,
            });
            // Rows in separation and rows in wavenumber pass entries of their own.
        }
        for keep in &mut left.keep {
            let own = keep.bins.take();
            let mut bins = names.clone();
            if let Some(own) = &own {
                bins.retain(|bin| own.value.contains(bin));
            }
            keep.bins =
                Some(own.map_or_else(|| Located::default_of(bins.clone()), |own| own.map(|_| bins.clone())));
        }
    }
    (!names.is_empty()).then_some(left)
}

/// Whether a quantity is one of a survey or bin that the study no longer has.
fn is_gone(name: &str, study: &Study) -> bool {
    let mut parts = name.split('.');
    let first = parts.next().unwrap_or_default();
    let (survey, bin) = match first {
        "background" | "prediction" | "systematic" => return false,
        // departure.tau, departure.tau.SURVEY, departure.tau.SURVEY.BIN
        "departure" => match parts.nth(1) {
            Some(survey) => (survey, parts.next()),
            None => return false,
        },
        survey => (survey, parts.next().filter(|bin| *bin != "template")),
    };
    let Some(section) = study.file.surveys.iter().find(|section| section.name.value == survey) else {
        return true;
    };
    bin.is_some_and(|bin| section.bins.iter().all(|own| own.name.value != bin))
}

fn restrict_hypothesis(hypothesis: &Hypothesis, study: &Study) -> Hypothesis {
    let all = &hypothesis.quantities;
    let stays: Vec<bool> = all.iter().map(|quantity| !is_gone(&quantity.name, study)).collect();
    let moves_something = |quantity: &ResolvedQuantity| !quantity.name.starts_with("systematic.");
    let used = |parameter: usize| {
        let depends = |quantity: &ResolvedQuantity| quantity.form.coefficient(parameter) != 0.0;
        all.iter().zip(&stays).any(|(each, stays)| *stays && moves_something(each) && depends(each))
    };
    let parameters: Vec<usize> = (0..hypothesis.free.len()).filter(|parameter| used(*parameter)).collect();
    let place = |parameter: usize| parameters.iter().position(|of| *of == parameter);
    // An amplitude that moves nothing any more goes with what it moved.
    let left: Vec<usize> = (0..all.len())
        .filter(|&index| {
            let idle = matches!(all[index].state, State::Free(parameter) if place(parameter).is_none());
            stays[index] && !idle
        })
        .collect();
    let spot = |index: usize| left.iter().position(|of| *of == index);
    let root = |mut index: usize| {
        while let State::Tied(source) = all[index].state {
            index = source;
        }
        index
    };
    let quantities: Vec<ResolvedQuantity> = left
        .iter()
        .map(|&index| {
            let quantity = &all[index];
            let state = match (&quantity.state, &all[root(index)].state) {
                (State::Tied(source), _) if spot(*source).is_some() => {
                    State::Tied(spot(*source).unwrap_or(0))
                }
                (_, State::Free(parameter)) => State::Free(place(*parameter).unwrap_or(0)),
                (_, other) => other.clone(),
            };
            let terms = quantity.form.terms.iter();
            let terms = terms.filter_map(|(parameter, by)| Some((place(*parameter)?, *by))).collect();
            let moves = quantity.moves.iter().filter_map(|each| {
                Some(Move { quantity: spot(each.quantity)?, amplitude: spot(each.amplitude)?, by: each.by })
            });
            ResolvedQuantity {
                state,
                moves: moves.collect(),
                form: AffineForm { constant: quantity.form.constant, terms },
                ..quantity.clone()
            }
        })
        .collect();
    let free = parameters.iter().enumerate().map(|(index, &parameter)| {
        let own = &hypothesis.free[parameter];
        let depends = || quantities.iter().position(|each| each.form.coefficient(index) != 0.0);
        FreeParameter { quantity: spot(own.quantity).or_else(depends).unwrap_or(0), ..own.clone() }
    });
    let mut free: Vec<FreeParameter> = free.collect();
    let mut joint = Vec::new();
    for block in &hypothesis.joint {
        let present: Vec<usize> =
            (0..block.of.len()).filter(|&position| place(block.of[position]).is_some()).collect();
        let pick = |row: &[f64]| present.iter().map(|&position| row[position]).collect::<Vec<f64>>();
        let of: Vec<usize> = present.iter().filter_map(|&position| place(block.of[position])).collect();
        for (position, &parameter) in of.iter().enumerate() {
            if let FreePrior::Joint { block, position: own, .. } = &mut free[parameter].prior {
                (*block, *own) = (joint.len(), position);
            }
        }
        if !of.is_empty() {
            let covariance = present.iter().map(|&position| pick(&block.covariance[position])).collect();
            joint.push(JointBlock { of, mean: pick(&block.mean), covariance, origin: block.origin });
        }
    }
    Hypothesis { quantities, free, joint, ..hypothesis.clone() }
}
