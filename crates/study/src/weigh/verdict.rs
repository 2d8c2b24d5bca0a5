//! From estimates to the record: evidences, odds, and what they hang on.

use super::Work;
use super::facts::Facts;
use super::pieces::{Outcome, Pieces};
use super::plan::{Departure, is_general_relativity, reference};
use super::{average, best_of, consistency};
use crate::record::{HypothesisRecord, Ordered, Sensitivity, WeighRecord};
use crate::run_error::RunError;
use oddwell_evidence::comparison::{LEAST_DISTANCE, agreement, chosen, largest_odds, odds};
use oddwell_evidence::{Estimate, estimator_families};
use oddwell_model::FeltBy;

pub(super) fn record(work: &Work<'_>, pieces: Vec<Pieces>) -> Result<WeighRecord, RunError> {
    let reference = reference(work.posteriors);
    let relativity = Some(reference).filter(|index| is_general_relativity(&work.posteriors[*index]));
    let weights: Vec<f64> = work.study.file.hypotheses.iter().map(|section| section.weight.value).collect();
    let relative = !work
        .posteriors
        .iter()
        .all(|posterior| posterior.data.surveys().iter().all(|survey| survey.noise().is_normalised()));
    let mut hypotheses = Vec::new();
    let known = chosen_of(&pieces[reference].outcomes, pieces[reference].facts.as_ref());
    for (index, piece) in pieces.iter().enumerate() {
        let contained = relativity.filter(|relativity| *relativity != index).and(known);
        hypotheses.push(hypothesis_record(work, index, piece, contained, weights[index]));
    }
    place_odds(&mut hypotheses, reference);
    if let Some(relativity) = relativity {
        for index in (0..pieces.len()).filter(|index| *index != relativity) {
            let shift = (weights[index] / weights[relativity]).ln();
            let facts = pieces[index].facts.as_ref();
            hypotheses[index].sensitivity =
                facts.and_then(|facts| sensitivity(facts, &hypotheses[index], shift));
        }
    }
    let consistency = consistency::consistency_records(work, &pieces, &hypotheses)?;
    let best_of = best_of::best_of_records(work, &pieces)?;
    let average = average::averages(work, &pieces, &hypotheses);
    if relative {
        take_constants_out(&mut hypotheses, reference);
    }
    Ok(WeighRecord {
        study: work.study.file.title.value.clone(),
        reference: work.study.hypotheses[reference].name.clone(),
        agree: hypotheses.iter().all(|hypothesis| hypothesis.agree),
        relative,
        notes: notes(work, &hypotheses, &pieces),
        hypotheses,
        average,
        consistency,
        best_of,
        seed: work.seed,
        threads: work.options.threads,
        evaluations: 0,
        wall_seconds: 0.0,
    })
}

/// The evidence of a hypothesis by the estimators that lean on no other.
fn chosen_of(outcomes: &Ordered<Outcome>, facts: Option<&Facts>) -> Option<(f64, f64)> {
    let mut estimates: Vec<(&str, &Estimate)> = outcomes
        .iter()
        .filter_map(|(name, outcome)| Some((name.as_str(), outcome.estimate.as_ref()?)))
        .collect();
    if let Some(laplace) = facts.and_then(|facts| facts.laplace.estimate.as_ref()) {
        estimates.push(("laplace", laplace));
    }
    chosen(&estimates)
}

fn hypothesis_record(
    work: &Work<'_>,
    index: usize,
    pieces: &Pieces,
    contained: Option<(f64, f64)>,
    weight: f64,
) -> HypothesisRecord {
    let posterior = &work.posteriors[index];
    let hypothesis = &posterior.hypothesis;
    let facts = pieces.facts.as_ref();
    let mut estimators: Ordered<Option<Estimate>> = Ordered::new();
    let mut not_applicable = Ordered::new();
    for family in estimator_families() {
        let (estimate, reason) = match (family.name, facts) {
            ("laplace", Some(facts)) => {
                (facts.laplace.estimate.clone(), facts.laplace.not_applicable.clone())
            }
            ("density_ratio", Some(facts)) => {
                density_ratio(work, posterior_departure(work, index), facts, contained)
            }
            ("laplace" | "density_ratio", None) => (None, Some("there is nothing to integrate over".into())),
            (name, _) => match pieces.outcomes.get(name) {
                Some(outcome) => (outcome.estimate.clone(), outcome.not_applicable.clone()),
                None => (None, None),
            },
        };
        if let (None, Some(reason)) = (&estimate, reason) {
            not_applicable.insert(family.name.to_owned(), reason);
        }
        estimators.insert(family.name.to_owned(), estimate);
    }
    let estimates: Vec<(&str, &Estimate)> =
        estimators.iter().filter_map(|(name, estimate)| Some((name.as_str(), estimate.as_ref()?))).collect();
    let agreement = agreement(&estimates);
    let chosen = chosen(&estimates);
    let seconds = pieces.outcomes.values().map(|outcome| outcome.seconds).sum::<f64>();
    let evaluations: u64 = pieces
        .outcomes
        .values()
        .filter_map(|outcome| outcome.estimate.as_ref())
        .map(|estimate| estimate.evaluations)
        .sum();
    let distance = facts.and_then(|facts| facts.distance_from_prior);
    HypothesisRecord {
        name: hypothesis.name.clone(),
        departure: hypothesis.shape.name().to_owned(),
        felt_by: hypothesis.felt_by.name().to_owned(),
        weight,
        log_evidence: chosen.map(|(value, _)| value),
        error: chosen.map(|(_, error)| error),
        odds: None,
        log_odds_error: None,
        probability: None,
        agree: agreement.agree,
        disagreements: agreement.disagreements,
        estimators,
        not_applicable,
        tested: distance.map(|distance| distance >= LEAST_DISTANCE && !growth_alone(work, index)),
        distance_from_prior: distance,
        sensitivity: None,
        evaluations: evaluations + facts.map_or(0, |facts| facts.evaluations),
        seconds: seconds + facts.map_or(0.0, |facts| facts.seconds),
        run: facts.map(|_| hypothesis.name.clone()),
    }
}

fn posterior_departure(work: &Work<'_>, index: usize) -> Departure {
    Departure::of(&work.posteriors[index])
}

fn density_ratio(
    work: &Work<'_>,
    departure: Departure,
    facts: &Facts,
    contained: Option<(f64, f64)>,
) -> (Option<Estimate>, Option<String>) {
    let reason = |text: &str| (None, Some(text.to_owned()));
    if !departure.contains_general_relativity() {
        return reason("it has no inferred amplitude that general relativity is a value of");
    }
    if !work.posteriors.iter().any(is_general_relativity) {
        return reason("general relativity is not among the hypotheses");
    }
    match (facts.ratio, contained) {
        (Some(ratio), Some((log_evidence, error))) => (Some(ratio.estimate(log_evidence, error)), None),
        (None, _) => (None, facts.no_ratio.clone()),
        (_, None) => reason("the evidence of general relativity is not known"),
    }
}

/// Odds against the reference and probabilities, of the hypotheses that the data test.
fn place_odds(hypotheses: &mut [HypothesisRecord], reference: usize) {
    let compared: Vec<usize> = (0..hypotheses.len())
        .filter(|index| hypotheses[*index].tested != Some(false) && hypotheses[*index].log_evidence.is_some())
        .collect();
    let evidences: Vec<(f64, f64, f64)> = compared
        .iter()
        .map(|index| {
            let hypothesis = &hypotheses[*index];
            let number = |value: Option<f64>| value.unwrap_or(f64::NAN);
            (number(hypothesis.log_evidence), number(hypothesis.error), hypothesis.weight)
        })
        .collect();
    let Some(place) = compared.iter().position(|index| *index == reference) else { return };
    for (index, odds) in compared.into_iter().zip(odds(&evidences, place).unwrap_or_default()) {
        let hypothesis = &mut hypotheses[index];
        hypothesis.odds = Some(odds.odds);
        hypothesis.log_odds_error = Some(odds.log_error);
        hypothesis.probability = Some(odds.probability);
    }
}

fn sensitivity(facts: &Facts, hypothesis: &HypothesisRecord, shift: f64) -> Option<Sensitivity> {
    let (curve, width) = (facts.curve.as_ref()?, facts.width?);
    let turning = curve.turning(shift);
    let (factor, largest) = curve.largest()?;
    let log_odds = hypothesis.odds?.ln() - shift;
    let tail = match facts.deviates[..] {
        [] => None,
        [deviate] => Some(oddwell_evidence::comparison::two_sided_tail(deviate)),
        _ => oddwell_evidence::comparison::joint_tail(&facts.deviates, &facts.correlation),
    };
    Some(Sensitivity {
        width,
        turning_width: turning.map(|turning| turning.factor * width),
        wider_favours_reference: turning.map(|turning| turning.wider_favours_contained),
        largest: largest.exp(),
        largest_width: factor * width,
        tail_probability: tail,
        bound: tail.map(largest_odds).filter(|bound| bound.is_finite()),
        verdict: curve.verdict(log_odds, shift),
        widths: curve.factors.iter().map(|factor| factor * width).collect(),
        log_ratios: curve.log_odds.clone(),
    })
}

/// Where the noise is no density, a log evidence means nothing by itself: estimators are given relative to the reference.
fn take_constants_out(hypotheses: &mut [HypothesisRecord], reference: usize) {
    let base = hypotheses[reference].log_evidence.unwrap_or(0.0);
    for hypothesis in hypotheses {
        hypothesis.log_evidence = None;
        hypothesis.error = None;
        for estimate in hypothesis.estimators.values_mut().flatten() {
            estimate.log_evidence -= base;
            estimate.runs.iter_mut().for_each(|run| *run -= base);
        }
    }
}

/// Whether what the measurements see of a departure is growth alone: felt by everything, odd multipoles only.
fn growth_alone(work: &Work<'_>, index: usize) -> bool {
    let odd_only = work.measurements.rows.iter().all(|row| row.multipole % 2 == 1);
    work.posteriors[index].hypothesis.felt_by == FeltBy::Everything && odd_only
}

fn notes(work: &Work<'_>, hypotheses: &[HypothesisRecord], pieces: &[Pieces]) -> Vec<String> {
    let mut notes = Vec::new();
    for (index, (hypothesis, pieces)) in hypotheses.iter().zip(pieces).enumerate() {
        if pieces.facts.as_ref().is_some_and(|facts| !facts.converged) {
            notes.push(format!(
                "the posterior of `{}` is not converged: its density ratio and averages are not to be relied on",
                hypothesis.name
            ));
        }
        if hypothesis.tested == Some(false) {
            notes.push(if growth_alone(work, index) {
                format!(
                    "the data do not test `{}`: felt by everything, it leaves potential and acceleration in balance, and odd \
                     multipoles see of it only how much matter has grown, which biases and sigma8 do as well; even multipoles \
                     would test it",
                    hypothesis.name
                )
            } else {
                format!("the data do not test `{}`: its posterior is its prior", hypothesis.name)
            });
        }
    }
    notes
}
