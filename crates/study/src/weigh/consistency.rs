//! Whether surveys, and bins, ask for the same departure.

use super::Work;
use super::facts::Facts;
use super::pieces::Pieces;
use super::plan::Departure;
use crate::assemble::Posterior;
use crate::record::{ConsistencyRecord, HypothesisRecord};
use crate::run_error::RunError;
use oddwell_evidence::comparison::{Fitted, consistency};
use oddwell_sampler::SharedPrior;

/// One departure for all against one each, wherever the study has hypotheses for both with equal priors.
pub(super) fn consistency_records(
    work: &Work<'_>,
    pieces: &[Pieces],
    hypotheses: &[HypothesisRecord],
) -> Result<Vec<ConsistencyRecord>, RunError> {
    let of_shape = |name: &str| {
        work.posteriors
            .iter()
            .position(|posterior| posterior.hypothesis.shape.name() == name && prior_of(posterior).is_some())
    };
    let Some(one) =
        of_shape("constant").filter(|one| work.posteriors[*one].hypothesis.felt_by.reaches_light())
    else {
        return Ok(vec![]);
    };
    let surveys = work.study.file.surveys.len();
    let bins: usize = work.study.file.surveys.iter().map(|survey| survey.bins.len()).sum();
    let mut records = Vec::new();
    for (of, shape, number) in [("surveys", "per-survey", surveys), ("bins", "per-bin", bins)] {
        let Some(each) = of_shape(shape).filter(|_| number > 1) else { continue };
        let same = prior_of(&work.posteriors[one]).zip(prior_of(&work.posteriors[each]));
        if !same.is_some_and(|(one, each)| equal(&one, &each)) {
            continue;
        }
        let fitted = |index: usize| fitted(&hypotheses[index], pieces[index].facts.as_ref());
        if let (Some(one), Some(each)) = (fitted(one), fitted(each)) {
            records.push(ConsistencyRecord { of: of.to_owned(), consistency: consistency(&one, &each) });
        }
    }
    Ok(records)
}

fn prior_of(posterior: &Posterior) -> Option<SharedPrior> {
    let departure = Departure::of(posterior);
    departure.amplitudes.first().map(|at| posterior.priors.marginal(*at).clone())
}

fn equal(one: &SharedPrior, other: &SharedPrior) -> bool {
    let describe = |prior: &SharedPrior| (prior.family(), prior.arguments(), prior.within());
    describe(one) == describe(other)
}

fn fitted(hypothesis: &HypothesisRecord, facts: Option<&Facts>) -> Option<Fitted> {
    let facts = facts?;
    Some(Fitted {
        log_evidence: hypothesis.log_evidence?,
        error: hypothesis.error?,
        mean_log_likelihood: facts.mean_log_likelihood,
        variance_log_likelihood: facts.variance_log_likelihood,
        draws: facts.effective_draws,
    })
}
