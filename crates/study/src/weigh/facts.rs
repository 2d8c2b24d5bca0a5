//! What the draws of a posterior say that a comparison needs; small enough to be kept.

use super::Work;
use super::pieces::{Outcome, problem};
use super::plan::Departure;
use crate::assemble::Posterior;
use crate::record::Summary;
use crate::run_error::RunError;
use oddwell_evidence::comparison::{WidthCurve, amplitudes, distance_from_prior, width_curve};
use oddwell_evidence::{
    Contained, DensityRatio, Estimator, EvidenceError, Laplace, Problem, Ratio, Watch, conditional_densities,
};
use oddwell_model::Workspace;
use oddwell_sampler::{Chain, SharedPrior};
use serde::{Deserialize, Serialize};
use std::time::Instant;

/// Draws that are kept for averages over hypotheses.
const KEPT_DRAWS: usize = 4000;

/// What a chain says.
#[derive(Clone, Debug, Serialize, Deserialize)]
pub(crate) struct Facts {
    pub(crate) laplace: Outcome,
    /// Posterior over prior density where the hypothesis becomes general relativity.
    pub(crate) ratio: Option<Ratio>,
    pub(crate) no_ratio: Option<String>,
    pub(crate) curve: Option<WidthCurve>,
    /// Half the central 68 % of the prior of the (first) amplitude.
    pub(crate) width: Option<f64>,
    pub(crate) distance_from_prior: Option<f64>,
    /// How far each amplitude lies from general relativity by the data alone, in standard deviations.
    pub(crate) deviates: Vec<f64>,
    /// Correlation of the amplitudes, row after row.
    pub(crate) correlation: Vec<f64>,
    pub(crate) mean_log_likelihood: f64,
    pub(crate) variance_log_likelihood: f64,
    pub(crate) effective_draws: f64,
    /// T − 1 of every bin, draw by draw.
    pub(crate) seen_by_light: Vec<Vec<f64>>,
    /// The best point.
    pub(crate) best: Vec<f64>,
    pub(crate) converged: bool,
    pub(crate) evaluations: u64,
    pub(crate) seconds: f64,
}

pub(super) fn facts(
    work: &Work<'_>,
    posterior: &Posterior,
    departure: &Departure,
    chain: &Chain,
    summary: &Summary,
    watch: &Watch,
    clock: Instant,
) -> Result<Facts, RunError> {
    let with_draws = Problem { chain: Some(chain), ..problem(work, posterior) };
    let laplace = Outcome::of(Laplace::default().estimate(&with_draws, watch), clock)?;
    let mut evaluations =
        chain.evaluations + laplace.estimate.as_ref().map_or(0, |estimate| estimate.evaluations);
    let (mut ratio, mut no_ratio, mut curve) = (None, None, None);
    if departure.contains_general_relativity() {
        let point = Contained {
            parameters: departure.amplitudes.clone(),
            values: departure.values.clone(),
            log_evidence: 0.0,
            error: 0.0,
        };
        match conditional_densities(&with_draws, &point, DensityRatio::default().draws, watch) {
            Ok(densities) => {
                ratio = Some(densities.ratio());
                curve = Some(width_curve(&densities));
                evaluations += densities.ratio().evaluations;
            }
            Err(EvidenceError::NotApplicable { reason, .. }) => no_ratio = Some(reason),
            Err(error) => return Err(error.into()),
        }
    }
    let columns: Vec<Vec<f64>> = departure.amplitudes.iter().map(|at| chain.column(*at)).collect();
    let priors: Vec<SharedPrior> =
        departure.amplitudes.iter().map(|at| posterior.priors.marginal(*at).clone()).collect();
    let alone = amplitudes(&columns, &priors, &departure.values);
    let likelihood = chain.diagnose(&chain.log_likelihood);
    let best = chain.peak.as_ref().map_or(&chain.best.point, |peak| &peak.point);
    Ok(Facts {
        laplace,
        ratio,
        no_ratio,
        curve,
        width: priors.first().map(|prior| prior.spread()),
        distance_from_prior: farthest_from_prior(posterior, chain),
        deviates: alone.as_ref().map_or(vec![], |alone| alone.deviates.clone()),
        correlation: alone.map_or(vec![], |alone| alone.correlation.transpose().iter().copied().collect()),
        mean_log_likelihood: likelihood.mean,
        variance_log_likelihood: likelihood.sd * likelihood.sd,
        effective_draws: likelihood.ess_mean,
        seen_by_light: seen_by_light(posterior, chain),
        best: best.clone(),
        converged: summary.converged,
        evaluations,
        seconds: clock.elapsed().as_secs_f64(),
    })
}

/// The largest distance between posterior and prior over the departure's inferred quantities.
fn farthest_from_prior(posterior: &Posterior, chain: &Chain) -> Option<f64> {
    let distance = |at: usize| {
        let effective = chain.diagnostics[at].ess_bulk;
        distance_from_prior(&chain.column(at), posterior.priors.marginal(at), effective)
    };
    posterior.hypothesis.watched().into_iter().map(distance).reduce(f64::max)
}

/// T − 1 of every bin, at its first node, for draws spread over the chain. NaN where there is none.
fn seen_by_light(posterior: &Posterior, chain: &Chain) -> Vec<Vec<f64>> {
    let bins = posterior.model.setup().bins.len();
    let step = (chain.len() / KEPT_DRAWS).max(1);
    let mut workspace = Workspace::new();
    let mut seen = vec![Vec::new(); bins];
    for row in (step / 2..chain.len()).step_by(step) {
        let Some(draw) = chain.draw(row) else { break };
        let values = posterior.values(draw.point);
        for (bin, seen) in seen.iter_mut().enumerate() {
            let state = posterior.model.bin_state(&values, &mut workspace, bin, 0, 0.0);
            seen.push(state.map_or(f64::NAN, |state| state.time_distortion - 1.0));
        }
    }
    seen
}
