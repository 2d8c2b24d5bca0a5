//! The density of every inferred quantity beside its prior.

use super::ChainTable;
use crate::assemble::Posterior;
use crate::record::Summary;
use oddwell_sampler::diagnostics::{Density, density};

/// One quantity's posterior density, with its prior on the same grid.
#[derive(Clone, Debug, PartialEq)]
pub struct ParameterPicture {
    /// The quantity.
    pub name: String,
    /// The posterior; none where the draws do not spread.
    pub posterior: Option<Density>,
    /// The prior's density at the same places; none for derived quantities, for joint priors, and where the study can't
    /// be read any more.
    pub prior: Option<Vec<f64>>,
    /// The prior's mean and standard deviation, where it has them.
    pub prior_width: Option<(f64, f64)>,
    /// Whether it is one of the departure's.
    pub departure: bool,
}

pub(super) fn pictures(
    summary: &Summary,
    chain: &ChainTable,
    posterior: Option<&Posterior>,
) -> Vec<ParameterPicture> {
    let named = chain.names.iter().zip(&chain.columns);
    named
        .map(|(name, column)| {
            let known = summary.parameters.get(name);
            let index = posterior.and_then(|posterior| posterior.hypothesis.free_index(name));
            let everywhere = (f64::NEG_INFINITY, f64::INFINITY);
            let support = posterior.zip(index).map_or(everywhere, |(all, index)| all.priors.support(index));
            let effective = known.and_then(|known| known.ess).unwrap_or(column.len() as f64);
            let found = density(column, effective, support);
            let alone = posterior
                .zip(index)
                .filter(|(posterior, index)| posterior.priors.independent().contains(index));
            let prior = alone.zip(found.as_ref()).map(|((posterior, index), density)| {
                let prior = posterior.priors.marginal(index);
                density.at.iter().map(|&at| prior.log_density(at).exp()).collect()
            });
            ParameterPicture {
                name: name.clone(),
                posterior: found,
                prior,
                prior_width: known.and_then(|known| known.prior_mean.zip(known.prior_sd)),
                departure: summary.departure_parameters.contains(name),
            }
        })
        .collect()
}
