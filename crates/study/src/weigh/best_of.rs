//! The best of many bins, or shapes: how often chance alone gives something as good.

use super::Work;
use super::pieces::Pieces;
use super::plan::{Departure, is_general_relativity};
use crate::assemble::Posterior;
use crate::record::BestOfRecord;
use crate::run_error::RunError;
use nalgebra::DMatrix;
use oddwell_evidence::comparison::{correlations, global_tail};
use oddwell_sampler::Target;

/// Derivatives are central differences over this share of a prior's width: the prediction is linear in an amplitude that light
/// feels, and nearly so in any other over such a step.
const STEP: f64 = 1e-3;

pub(super) fn best_of_records(work: &Work<'_>, pieces: &[Pieces]) -> Result<Vec<BestOfRecord>, RunError> {
    let mut records = Vec::new();
    for (posterior, pieces) in work.posteriors.iter().zip(pieces) {
        let Some(facts) = &pieces.facts else { continue };
        let number = facts.deviates.len();
        if number < 2 {
            continue;
        }
        let correlation = DMatrix::from_row_slice(number, number, &facts.correlation);
        if let Some(tail) = global_tail(&facts.deviates, &correlation, work.seed) {
            let names = Departure::of(posterior).amplitudes;
            records.push(BestOfRecord {
                of: format!("amplitudes of `{}`", posterior.hypothesis.name),
                best: posterior.map.names()[names[tail.best]].clone(),
                number,
                tail,
            });
        }
    }
    records.extend(shapes(work, pieces)?);
    Ok(records)
}

/// The best of the shapes with one amplitude each.
fn shapes(work: &Work<'_>, pieces: &[Pieces]) -> Result<Option<BestOfRecord>, RunError> {
    let Some(relativity) = work.posteriors.iter().position(is_general_relativity) else { return Ok(None) };
    let single: Vec<usize> = (0..pieces.len())
        .filter(|index| pieces[*index].facts.as_ref().is_some_and(|facts| facts.deviates.len() == 1))
        .collect();
    let Some(best) = pieces[relativity].facts.as_ref().map(|facts| &facts.best) else { return Ok(None) };
    if single.len() < 2 {
        return Ok(None);
    }
    let null = &work.posteriors[relativity];
    let mut columns = Vec::new();
    for index in &single {
        let posterior = &work.posteriors[*index];
        let departure = Departure::of(posterior);
        let point = at_relativity(null, best, posterior, &departure);
        columns.push(derivative(posterior, &point, departure.amplitudes[0])?);
    }
    for parameter in 0..null.dimension() {
        columns.push(derivative(null, best, parameter)?);
    }
    let jacobian = DMatrix::from_fn(null.data.rows(), columns.len(), |row, column| columns[column][row]);
    let information = null.data.fisher_information(&jacobian);
    let Some(correlation) = correlations(&information, single.len(), &null.priors.precision(best)) else {
        return Ok(None);
    };
    let deviates: Vec<f64> =
        single.iter().filter_map(|index| pieces[*index].facts.as_ref()?.deviates.first().copied()).collect();
    Ok(global_tail(&deviates, &correlation, work.seed).map(|tail| BestOfRecord {
        of: "shapes".to_owned(),
        best: work.study.hypotheses[single[tail.best]].name.clone(),
        number: single.len(),
        tail,
    }))
}

/// The best point of general relativity as a point of another hypothesis: amplitudes as in general relativity, what it has
/// besides at the middle of its prior.
fn at_relativity(null: &Posterior, best: &[f64], posterior: &Posterior, departure: &Departure) -> Vec<f64> {
    let mut point: Vec<f64> = posterior
        .map
        .names()
        .iter()
        .enumerate()
        .map(|(at, name)| match null.hypothesis.free_index(name) {
            Some(known) => best[known],
            None => posterior.priors.median(at),
        })
        .collect();
    for (at, value) in departure.amplitudes.iter().zip(&departure.values) {
        point[*at] = *value;
    }
    point
}

fn derivative(posterior: &Posterior, point: &[f64], parameter: usize) -> Result<Vec<f64>, RunError> {
    let mut scratch = posterior.scratch();
    let (low, high) = posterior.priors.support(parameter);
    let step = STEP * posterior.priors.spread(parameter);
    let (below, above) = ((point[parameter] - step).max(low), (point[parameter] + step).min(high));
    let mut at = point.to_vec();
    at[parameter] = above;
    let upper = posterior.predict(&at, &mut scratch)?;
    at[parameter] = below;
    let lower = posterior.predict(&at, &mut scratch)?;
    Ok(upper.iter().zip(&lower).map(|(upper, lower)| (upper - lower) / (above - below)).collect())
}
