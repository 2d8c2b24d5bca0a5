//! From entries to a hypothesis: ties followed, joint priors placed, systematics added.

use oddwell_model::FeltBy;

use super::Entry;
use super::affine::AffineForm;
use super::checker::Checker;
use super::hypothesis::{FreeParameter, FreePrior, Hypothesis, JointBlock, ResolvedQuantity, State};
use super::systematics::Move;
use super::templates::MeanAndDeviation;
use crate::fault::Fault;
use crate::file::{HypothesisSection, JointPriorSection, Quantity};
use crate::nearest::Nearest;

/// Links the entries of one hypothesis; none where a tie or a joint prior is wrong.
///
/// `departures` holds the names of the departure quantities of all hypotheses: a joint prior may name one that this
/// hypothesis lacks, and then its marginal over the rest applies. `integrable` holds, for the leading entries, mean and
/// standard deviation of what can be integrated out; it is sampled all the same where nothing else is inferred.
pub(super) fn link(
    section: &HypothesisSection,
    entries: Vec<Entry>,
    (moves, integrable): (&[Move], &[Option<MeanAndDeviation>]),
    joint_priors: &[JointPriorSection],
    departures: &[String],
    checker: &mut Checker<'_>,
) -> Option<Hypothesis> {
    let before = checker.problems.len();
    let sources = sources(&entries, checker);
    let members = joint_members(&entries, joint_priors, departures, checker);
    if checker.problems.len() > before {
        return None;
    }
    let inferred = |index: usize, entry: &Entry| {
        matches!(entry.given.value, Quantity::Prior(_)) || members[index].is_some()
    };
    let integrated = |index: usize| integrable.get(index).copied().flatten();
    let others = entries
        .iter()
        .enumerate()
        .any(|(index, entry)| integrated(index).is_none() && inferred(index, entry));
    let mut free = Vec::new();
    let mut joint: Vec<JointBlock> = Vec::new();
    let mut states = Vec::new();
    let mut parameter_of: Vec<Option<usize>> = vec![None; entries.len()];
    for (index, entry) in entries.iter().enumerate() {
        if let Some((mean, standard_deviation)) = integrated(index).filter(|_| others) {
            states.push(State::IntegratedOut { mean, standard_deviation });
            continue;
        }
        let prior = match (&entry.given.value, members[index]) {
            (Quantity::Held(start), Some((block, position))) => {
                Some(FreePrior::Joint { block, position, start: *start })
            }
            (Quantity::Prior(spec), _) => Some(FreePrior::Own(spec.clone())),
            _ => None,
        };
        let state = match (prior, sources[index], &entry.given.value) {
            (Some(prior), ..) => {
                let (name, origin) = (entry.name.clone(), entry.given.origin);
                parameter_of[index] = Some(free.len());
                free.push(FreeParameter { name, prior, origin, quantity: index });
                State::Free(free.len() - 1)
            }
            (None, Some(source), _) => State::Tied(source),
            (None, None, Quantity::Held(value)) => State::Held(*value),
            // A tie without a source was reported above, and a prior is free.
            (None, None, _) => return None,
        };
        states.push(state);
    }
    for (number, section) in joint_priors.iter().enumerate() {
        // Positions in `of` that this hypothesis has, with their parameters.
        let present: Vec<(usize, usize)> = (0..section.of.value.len())
            .filter_map(|position| {
                let entry = members.iter().position(|member| *member == Some((number, position)))?;
                Some((position, parameter_of[entry]?))
            })
            .collect();
        let pick = |row: &[f64]| present.iter().map(|(position, _)| row[*position]).collect::<Vec<f64>>();
        let block = JointBlock {
            of: present.iter().map(|(_, parameter)| *parameter).collect(),
            mean: pick(&section.mean.value),
            covariance: present
                .iter()
                .map(|(position, _)| pick(&section.covariance.value[*position]))
                .collect(),
            origin: section.of.origin,
        };
        for (position, parameter) in block.of.iter().enumerate() {
            if let FreePrior::Joint { block: number, position: place, .. } = &mut free[*parameter].prior {
                (*number, *place) = (joint.len(), position);
            }
        }
        if !block.of.is_empty() {
            joint.push(block);
        }
    }
    let forms = forms(&states, moves);
    let quantities = entries
        .into_iter()
        .zip(states)
        .zip(forms)
        .enumerate()
        .map(|(index, ((Entry { name, given }, state), form))| {
            let moves = moves.iter().filter(|each| each.quantity == index).cloned().collect();
            ResolvedQuantity { name, given, state, moves, form }
        })
        .collect();
    let shape = section.departure.value;
    let felt_by = if shape.parameters().is_empty() { FeltBy::Light } else { section.felt_by.value };
    Some(Hypothesis { name: section.name.value.clone(), shape, felt_by, quantities, free, joint })
}

/// The index of the quantity that each tied one follows directly.
fn sources(entries: &[Entry], checker: &mut Checker<'_>) -> Vec<Option<usize>> {
    let mut sources = vec![None; entries.len()];
    for (index, entry) in entries.iter().enumerate() {
        let Quantity::SameAs(source) = &entry.given.value else {
            continue;
        };
        sources[index] = entries.iter().position(|other| other.name == *source);
        if sources[index].is_none() {
            let fault = Fault::UnknownQuantity {
                subject: format!("`same_as` of `{}`", entry.name),
                name: source.clone(),
                nearest: Nearest::find(source, entries.iter().map(|entry| entry.name.as_str())),
            };
            checker.fault(entry.given.origin, &entry.name, fault);
        }
    }
    for start in 0..entries.len() {
        // Walking from its first member, a circle comes back to where it began; it is reported from there only.
        let mut chain = vec![start];
        while let Some(next) = sources[chain[chain.len() - 1]] {
            if next == start && chain.iter().all(|member| *member >= start) {
                let chain = chain.iter().chain([&start]).map(|index| entries[*index].name.clone()).collect();
                checker.fault(entries[start].given.origin, &entries[start].name, Fault::Circle { chain });
            }
            if chain.contains(&next) {
                break;
            }
            chain.push(next);
        }
    }
    sources
}

/// For each entry, the joint prior it stands in and its position there.
fn joint_members(
    entries: &[Entry],
    joint_priors: &[JointPriorSection],
    departures: &[String],
    checker: &mut Checker<'_>,
) -> Vec<Option<(usize, usize)>> {
    let mut members: Vec<Option<(usize, usize)>> = vec![None; entries.len()];
    for (number, section) in joint_priors.iter().enumerate() {
        for (position, name) in section.of.value.iter().enumerate() {
            let name = name.clone();
            let fault = match entries.iter().position(|entry| entry.name == name) {
                None if departures.contains(&name) => continue,
                None => {
                    let known = entries.iter().map(|entry| &entry.name).chain(departures);
                    let nearest = Nearest::find(&name, known);
                    Fault::UnknownQuantity { subject: "this [[joint_prior]]".to_owned(), name, nearest }
                }
                Some(index) => match (&entries[index].given.value, members[index]) {
                    (_, Some((other, _))) => {
                        Fault::TwoPriorsJoint { name, first: joint_priors[other].of.origin.to_string() }
                    }
                    (Quantity::Prior(_), None) => {
                        Fault::TwoPriorsJoint { name, first: entries[index].given.origin.to_string() }
                    }
                    (Quantity::SameAs(source), None) => {
                        Fault::JointTied { name, source_name: source.clone() }
                    }
                    (Quantity::Held(_), None) => {
                        members[index] = Some((number, position));
                        continue;
                    }
                },
            };
            checker.fault(section.of.origin, "of", fault);
        }
    }
    members
}

/// The value of each quantity as a function of θ. Ties run in no circle.
fn forms(states: &[State], moves: &[Move]) -> Vec<AffineForm> {
    let root = |mut index: usize| {
        while let State::Tied(source) = states[index] {
            index = source;
        }
        index
    };
    let own = |index: usize| match states[root(index)] {
        State::Free(parameter) => AffineForm::free(parameter),
        State::Held(value) | State::IntegratedOut { mean: value, .. } => AffineForm::held(value),
        State::Tied(_) => AffineForm::default(),
    };
    (0..states.len())
        .map(|index| {
            let mut form = own(index);
            // Nothing moves an amplitude, so its own form is all there is to it.
            for each in moves.iter().filter(|each| each.quantity == root(index)) {
                form.add(each.by, &own(each.amplitude));
            }
            form
        })
        .collect()
}
