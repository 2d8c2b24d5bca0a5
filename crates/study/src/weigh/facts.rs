//! What the draws of a posterior say that a comparison needs; small enough to be kept.

use super::Work;
use super::pieces::{Outcome, integrated, problem};
use super::plan::Departure;
use crate::assemble::Posterior;
use crate::record::Summary;
use crate::run_error::RunError;
use oddwell_evidence::comparison::{WidthCurve, amplitudes, distance_from_prior, width_curve};
use oddwell_evidence::{
    Contained, DensityRatio, Estimator, EvidenceError, Laplace, Problem, Ratio, Watch, conditional_densities,
};
use oddwell_model::Workspace;
use oddwell_sampler::{Chain, SharedPrior, Target};
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
    let left = integrated(posterior)?;
    let (laplace, densities) = match &left {
        Some(left) => {
            let chain = projected(chain, left.sampled());
            let departure = departure.among(left.sampled());
            let problem = problem(work, left, &left.priors);
            let laplace = Laplace::default().estimate(&problem, watch);
            (laplace, densities(Problem { chain: Some(&chain), ..problem }, &departure, watch)?)
        }
        None => {
            let problem = Problem { chain: Some(chain), ..problem(work, posterior, &posterior.priors) };
            (Laplace::default().estimate(&problem, watch), densities(problem, departure, watch)?)
        }
    };
    let laplace = Outcome::of(laplace, clock)?;
    let Densities { ratio, no_ratio, curve } = densities;
    let evaluations = chain.evaluations
        + laplace.estimate.as_ref().map_or(0, |estimate| estimate.evaluations)
        + ratio.map_or(0, |ratio| ratio.evaluations);
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

struct Densities {
    ratio: Option<Ratio>,
    no_ratio: Option<String>,
    curve: Option<WidthCurve>,
}

/// What the point of general relativity and other widths of the prior are worth.
fn densities<T: Target>(
    problem: Problem<'_, T>,
    departure: &Departure,
    watch: &Watch,
) -> Result<Densities, RunError> {
    if !departure.contains_general_relativity() {
        return Ok(Densities { ratio: None, no_ratio: None, curve: None });
    }
    let point = Contained {
        parameters: departure.amplitudes.clone(),
        values: departure.values.clone(),
        log_evidence: 0.0,
        error: 0.0,
    };
    match conditional_densities(&problem, &point, DensityRatio::default().draws, watch) {
        Ok(found) => {
            Ok(Densities { ratio: Some(found.ratio()), no_ratio: None, curve: Some(width_curve(&found)) })
        }
        Err(EvidenceError::NotApplicable { reason, .. }) => {
            Ok(Densities { ratio: None, no_ratio: Some(reason), curve: None })
        }
        Err(error) => Err(error.into()),
    }
}

/// The chain of some of the parameters.
fn projected(chain: &Chain, onto: &[usize]) -> Chain {
    let rows = chain.points.chunks_exact(chain.dimension);
    Chain {
        dimension: onto.len(),
        points: rows.flat_map(|row| onto.iter().map(|at| row[*at])).collect(),
        diagnostics: onto.iter().map(|at| chain.diagnostics[*at]).collect(),
        peak: None,
        ..chain.clone()
    }
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
