//! Puts the contents of `summary.json` together.

use super::analysis::Analysis;
use super::by_part::by_part;
use super::clocks::{self, Derived};
use super::drawn_back::drawn_back;
use super::{general_relativity, goodness, mimics, suspicions, switched_off};
use crate::assemble::{Measurements, Posterior};
use crate::record::{Ordered, ParameterSummary, SamplerSummary, Summary, WarningRecord};
use crate::resolve::Study;
use crate::run_error::RunError;
use oddwell_sampler::diagnostics::ParameterDiagnostics;
use oddwell_sampler::{Chain, Target};

pub(super) fn finite(value: f64) -> Option<f64> {
    Some(value).filter(|value| value.is_finite())
}

pub(super) fn interval((low, high): (f64, f64)) -> Option<[f64; 2]> {
    (low.is_finite() && high.is_finite()).then_some([low, high])
}

/// The summary, and the derived quantities of the chain.
pub(super) fn summarise(
    study: &Study,
    posterior: &Posterior,
    measurements: &Measurements,
    chain: &Chain,
    seed: u64,
) -> Result<(Summary, Derived), RunError> {
    let mut scratch = posterior.scratch();
    let analysis = Analysis::new(posterior, chain, &mut scratch)?;
    let general_relativity = general_relativity::general_relativity(posterior, chain);
    let mimics = mimics::mimics(posterior, chain, &analysis, &general_relativity, &mut scratch)?;
    let clocks = clocks::derived(posterior, measurements, chain, &analysis)?;
    let derived = drawn_back(posterior, chain, seed).and(clocks);
    let mut warnings = measurements.warnings.clone();
    warnings.extend(suspicions::suspicions(posterior, measurements, chain, &analysis, &mut scratch)?);
    let names = posterior.map.names();
    let mut parameters: Ordered<ParameterSummary> = names
        .iter()
        .zip(&chain.diagnostics)
        .enumerate()
        .map(|(index, (name, diagnostics))| {
            let prior = (posterior.priors.mean(index), posterior.priors.standard_deviation(index));
            (name.clone(), parameter(diagnostics, Some(prior)))
        })
        .collect();
    parameters.extend(derived.parameters.clone());
    let summary = Summary {
        study: study.file.title.value.clone(),
        only: study.restriction().only.clone(),
        without: study.restriction().without.clone(),
        hypothesis: posterior.hypothesis.name.clone(),
        departure: posterior.hypothesis.shape.0.name().to_owned(),
        felt_by: posterior.hypothesis.felt_by.name().to_owned(),
        converged: chain.outcome.converged,
        blinded: false,
        warnings: warnings.iter().map(WarningRecord::from).collect(),
        parameters,
        departure_parameters: posterior
            .hypothesis
            .watched()
            .iter()
            .map(|&index| names[index].clone())
            .collect(),
        best: goodness::goodness(posterior, measurements, &analysis)?,
        general_relativity,
        mimics,
        clocks: derived.clocks.clone(),
        by_part: by_part(posterior, measurements, &analysis)?,
        switched_off: switched_off::switched_off(posterior, &analysis, &mut scratch)?,
        sampler: sampler_summary(chain, seed),
    };
    Ok((summary, derived))
}

/// What the diagnostics say; `prior` is its mean and standard deviation, none of a derived quantity.
pub(super) fn parameter(diagnostics: &ParameterDiagnostics, prior: Option<(f64, f64)>) -> ParameterSummary {
    ParameterSummary {
        mean: finite(diagnostics.mean),
        sd: finite(diagnostics.sd),
        median: finite(diagnostics.median),
        interval68: interval(diagnostics.interval68),
        interval95: interval(diagnostics.interval95),
        prior_mean: prior.and_then(|(mean, _)| finite(mean)),
        prior_sd: prior.and_then(|(_, sd)| finite(sd)),
        ess: finite(diagnostics.ess_bulk),
        ess_tail: finite(diagnostics.ess_tail),
        rhat: finite(diagnostics.rhat),
        mcse: finite(diagnostics.mcse),
    }
}

fn sampler_summary(chain: &Chain, seed: u64) -> SamplerSummary {
    let proposed: u64 = chain.acceptance.iter().map(|of_move| of_move.proposed).sum();
    let accepted: u64 = chain.acceptance.iter().map(|of_move| of_move.accepted).sum();
    SamplerSummary {
        ensembles: chain.ensembles,
        walkers: chain.walkers,
        steps: chain.steps,
        warm_up: chain.warm_up,
        thinning: chain.thinning,
        evaluations: chain.evaluations,
        rejected_evaluations: chain.rejected.count,
        rejected_reasons: chain.rejected.reasons.iter().cloned().collect(),
        wall_seconds: chain.wall_seconds,
        evaluations_per_second: chain.evaluations as f64 / chain.wall_seconds.max(1e-9),
        acceptance: (proposed > 0).then(|| accepted as f64 / proposed as f64),
        acceptance_by_move: chain
            .acceptance
            .iter()
            .map(|of_move| (of_move.name.clone(), of_move.rate()))
            .collect(),
        threads: chain.threads,
        seed,
    }
}
