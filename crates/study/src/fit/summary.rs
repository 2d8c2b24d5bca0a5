//! Puts the contents of `summary.json` together.

use super::analysis::Analysis;
use super::{general_relativity, goodness, mimics, suspicions};
use crate::assemble::{Measurements, Posterior};
use crate::record::{ParameterSummary, SamplerSummary, Summary, WarningRecord};
use crate::resolve::Study;
use crate::run_error::RunError;
use oddwell_sampler::{Chain, Target};

fn finite(value: f64) -> Option<f64> {
    Some(value).filter(|value| value.is_finite())
}

fn interval((low, high): (f64, f64)) -> Option<[f64; 2]> {
    (low.is_finite() && high.is_finite()).then_some([low, high])
}

pub(super) fn summarise(
    study: &Study,
    posterior: &Posterior,
    measurements: &Measurements,
    chain: &Chain,
    seed: u64,
) -> Result<Summary, RunError> {
    let mut scratch = posterior.scratch();
    let analysis = Analysis::new(posterior, chain, &mut scratch)?;
    let general_relativity = general_relativity::general_relativity(posterior, chain);
    let mimics = mimics::mimics(posterior, chain, &analysis, &general_relativity, &mut scratch)?;
    let mut warnings = measurements.warnings.clone();
    warnings.extend(suspicions::suspicions(posterior, measurements, chain, &analysis, &mut scratch)?);
    let names = posterior.map.names();
    let parameters = names
        .iter()
        .zip(&chain.diagnostics)
        .enumerate()
        .map(|(index, (name, diagnostics))| {
            let summary = ParameterSummary {
                mean: finite(diagnostics.mean),
                sd: finite(diagnostics.sd),
                median: finite(diagnostics.median),
                interval68: interval(diagnostics.interval68),
                interval95: interval(diagnostics.interval95),
                prior_mean: finite(posterior.priors.mean(index)),
                prior_sd: finite(posterior.priors.standard_deviation(index)),
                ess: finite(diagnostics.ess_bulk),
                ess_tail: finite(diagnostics.ess_tail),
                rhat: finite(diagnostics.rhat),
                mcse: finite(diagnostics.mcse),
            };
            (name.clone(), summary)
        })
        .collect();
    Ok(Summary {
        study: study.file.title.value.clone(),
        hypothesis: posterior.hypothesis.name.clone(),
        departure: posterior.hypothesis.shape.0.name().to_owned(),
        felt_by: posterior.hypothesis.felt_by.name().to_owned(),
        converged: chain.outcome.converged,
        blinded: false,
        warnings: warnings
            .iter()
            .map(|warning| WarningRecord {
                code: warning.code().to_owned(),
                text: warning.text(),
                place: warning.place().to_owned(),
            })
            .collect(),
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
        sampler: sampler_summary(chain, seed),
    })
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
