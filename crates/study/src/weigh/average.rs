//! What the departure is, whatever its shape: averages over hypotheses.

use super::Work;
use super::pieces::Pieces;
use crate::record::{HypothesisRecord, Ordered};
use oddwell_evidence::comparison::{WeightedDraws, WeightedSummary, average};

/// T − 1 of every bin, by `seen_by_light.SURVEY.BIN`: 0 in general relativity, and wherever matter alone departs.
pub(super) fn averages(
    work: &Work<'_>,
    pieces: &[Pieces],
    hypotheses: &[HypothesisRecord],
) -> Ordered<WeightedSummary> {
    let Some(posterior) = work.posteriors.first() else { return Ordered::new() };
    let bins = posterior.model.setup().bins.iter();
    let of_bin = |(bin, setup): (usize, &oddwell_model::BinSetup)| {
        let parts: Vec<WeightedDraws> = pieces
            .iter()
            .zip(hypotheses)
            .zip(work.posteriors)
            .filter_map(|((pieces, hypothesis), posterior)| {
                let values = match &pieces.facts {
                    Some(facts) => facts.seen_by_light.get(bin)?.clone(),
                    None => {
                        let mut workspace = oddwell_model::Workspace::new();
                        let state =
                            posterior.model.bin_state(&posterior.values(&[]), &mut workspace, bin, 0, 0.0);
                        vec![state.ok()?.time_distortion - 1.0]
                    }
                };
                Some(WeightedDraws { values, probability: hypothesis.probability? })
            })
            .collect();
        Some((format!("seen_by_light.{}.{}", setup.survey, setup.name), average(&parts)?))
    };
    bins.enumerate().filter_map(of_bin).collect()
}
