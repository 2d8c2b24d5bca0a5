//! A target of which nothing is left to sample: independent draws.

use crate::chain::{Chain, Outcome, RejectedEvaluations, StopReason};
use crate::diagnostics::Shape;
use crate::error::SamplerError;
use crate::history::{Columns, stream_of_draw};
use crate::settings::{Control, DEFAULT_MAXIMUM_EVALUATIONS, EnsembleSettings, Phase, Progress};
use crate::state::highest_row;
use crate::stopping::full_check;
use crate::target::{EvaluationFailure, Target};
use rayon::prelude::*;
use std::time::Instant;

/// Draws beyond the wanted number of effective samples: their estimate from independent draws scatters by a few per cent.
const MARGIN: f64 = 1.08;

/// Rows that are drawn between two looks at the callback.
const BLOCK: usize = 4096;

/// Draws of one series.
struct Series {
    points: Vec<f64>,
    log_prior: Vec<f64>,
    log_likelihood: Vec<f64>,
}

/// Independent draws of a target whose every quantity was integrated out, one likelihood evaluation each: as many series as
/// ensembles are asked for, of one walker each, lengthened until every test passes.
pub(crate) fn draw_directly<T: Target>(
    target: &T,
    settings: &EnsembleSettings,
    clock: Instant,
    callback: &mut dyn FnMut(&Progress) -> Control,
) -> Result<Chain, SamplerError> {
    let dimension = target.completed_dimension().unwrap_or(0);
    settings.check(0, Some(dimension))?;
    let maximum = settings.maximum_evaluations.unwrap_or(DEFAULT_MAXIMUM_EVALUATIONS);
    let count = settings.ensembles;
    let affordable = (maximum as usize / count).min(settings.draws_at_most() / count).max(4);
    let mut series: Vec<Series> =
        (0..count).map(|_| Series { points: vec![], log_prior: vec![], log_likelihood: vec![] }).collect();
    let wanted = settings.effective_samples.max(settings.minimum_effective_samples);
    let mut goal = ((MARGIN * wanted / count as f64).ceil() as usize).clamp(8, affordable);
    let mut steps = 0;
    let (verdict, stopped_by) = loop {
        let mut stopped = false;
        while steps < goal && !stopped {
            let block = (goal - steps).min(BLOCK);
            lengthen(target, settings.seed, dimension, &mut series, steps, block)?;
            steps += block;
            let report = Progress {
                phase: Phase::Sampling,
                evaluations: (steps * count) as u64,
                maximum_evaluations: maximum,
                steps: steps as u64,
                elapsed_seconds: clock.elapsed().as_secs_f64(),
                effective_samples: Some((steps * count) as f64),
                wanted_samples: settings.effective_samples,
                worst_rhat: None,
                remaining_evaluations: Some(((goal - steps) * count) as f64),
            };
            stopped = callback(&report) == Control::Stop;
        }
        let verdict = full_check(&columns(dimension, steps, &series), settings, (steps * count) as f64);
        if verdict.failing.is_empty() {
            break (verdict, StopReason::Converged);
        }
        if stopped {
            break (verdict, StopReason::Caller);
        }
        if steps >= affordable {
            break (verdict, StopReason::EvaluationLimit);
        }
        goal = (goal * 5).div_ceil(4).min(affordable);
    };
    let (mut points, mut log_prior, mut log_likelihood) = (vec![], vec![], vec![]);
    for part in &mut series {
        points.append(&mut part.points);
        log_prior.append(&mut part.log_prior);
        log_likelihood.append(&mut part.log_likelihood);
    }
    let best = highest_row(dimension, &points, &log_prior, &log_likelihood);
    Ok(Chain {
        dimension,
        ensembles: count,
        walkers: 1,
        steps: steps as u64,
        warm_up: 0,
        thinning: 1,
        kept_steps: (1..=steps as u64).collect(),
        points,
        log_prior,
        log_likelihood,
        diagnostics: verdict.diagnostics.unwrap_or_default(),
        acceptance: vec![],
        evaluations: (steps * count) as u64,
        peak_evaluations: 0,
        rejected: RejectedEvaluations::default(),
        wall_seconds: clock.elapsed().as_secs_f64(),
        threads: rayon::current_num_threads(),
        outcome: Outcome {
            converged: verdict.failing.is_empty(),
            stopped_by,
            settled: true,
            failing: verdict.failing,
        },
        peak: None,
        best,
    })
}

/// Adds `block` draws to every series.
fn lengthen<T: Target>(
    target: &T,
    seed: u64,
    dimension: usize,
    series: &mut [Series],
    steps: usize,
    block: usize,
) -> Result<(), SamplerError> {
    let results: Vec<Result<(), EvaluationFailure>> = series
        .par_iter_mut()
        .enumerate()
        .map(|(ensemble, series)| {
            let mut scratch = target.scratch();
            let mut draw = vec![0.0; dimension];
            for step in steps + 1..=steps + block {
                let mut random = stream_of_draw(seed, ensemble, 0, step as u64);
                let (log_prior, log_likelihood) =
                    target.complete(&[], &mut random, &mut scratch, &mut draw)?;
                series.points.extend_from_slice(&draw);
                series.log_prior.push(log_prior);
                series.log_likelihood.push(log_likelihood);
            }
            Ok(())
        })
        .collect();
    results.into_iter().collect::<Result<(), _>>().map_err(|failure| match failure {
        EvaluationFailure::Rejected { reason } | EvaluationFailure::Fatal { reason } => {
            SamplerError::Evaluation { reason, point: vec![], partial: None }
        }
    })
}

fn columns(dimension: usize, steps: usize, series: &[Series]) -> Columns {
    let all = || series.iter().flat_map(|series| series.points.chunks_exact(dimension));
    let parameters = (0..dimension).map(|at| all().map(|point| point[at]).collect()).collect();
    let heights = series.iter().flat_map(|series| series.log_prior.iter().zip(&series.log_likelihood));
    Columns {
        shape: Shape { ensembles: series.len(), walkers: 1, steps },
        parameters,
        log_posterior: heights.map(|(prior, likelihood)| prior + likelihood).collect(),
    }
}
