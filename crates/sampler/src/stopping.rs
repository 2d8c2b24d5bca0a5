//! When a run has enough: the tests, and what failed ones still need.

use crate::chain::{FailedTest, Test};
use crate::diagnostics::{ParameterDiagnostics, ScoreTable, diagnose};
use crate::history::Columns;
use crate::settings::{EnsembleSettings, MAXIMUM_WALKER_RHAT};
use rayon::prelude::*;

/// What a check of the stop rule found.
#[derive(Debug, Clone)]
pub(crate) struct Verdict {
    /// Failed tests, the one that needs most first.
    pub(crate) failing: Vec<FailedTest>,
    /// Smallest effective samples of the watched parameters (of all, if none is watched).
    pub(crate) effective_samples: f64,
    /// Largest R̂ and whose.
    pub(crate) worst_rhat: (usize, f64),
    /// Diagnostics of every parameter, where they were computed in full.
    pub(crate) diagnostics: Option<Vec<ParameterDiagnostics>>,
}

impl Verdict {
    /// Evaluations that the neediest test still takes.
    pub(crate) fn remaining(&self) -> Option<f64> {
        self.failing.first().and_then(|failed| failed.more_evaluations)
    }
}

/// The numbers that the rule compares, for one parameter.
#[derive(Debug, Clone, Copy)]
struct Figures {
    rhat: f64,
    rhat_of_walkers: f64,
    bulk: f64,
    tail: f64,
}

/// A first look without ranks, in linear time: enough to know that it is too early.
pub(crate) fn first_look(columns: &Columns, settings: &EnsembleSettings, evaluations_kept: f64) -> Verdict {
    let shape = columns.shape;
    let figures: Vec<Figures> = columns
        .parameters
        .par_iter()
        .map(|values| {
            let (effective, _) = shape.ensemble_route(values);
            Figures {
                rhat: shape.rhat_of_ensembles(values),
                rhat_of_walkers: shape.rhat_of_walkers(values),
                bulk: effective,
                tail: effective,
            }
        })
        .collect();
    judge(&figures, settings, evaluations_kept, None)
}

/// The full tests.
pub(crate) fn full_check(columns: &Columns, settings: &EnsembleSettings, evaluations_kept: f64) -> Verdict {
    let table = ScoreTable::new(columns.shape.even().rows());
    let diagnostics: Vec<ParameterDiagnostics> =
        columns.parameters.par_iter().map(|values| diagnose(values, columns.shape, &table)).collect();
    let figures: Vec<Figures> = diagnostics
        .iter()
        .map(|found| Figures {
            rhat: found.rhat,
            rhat_of_walkers: found.rhat_of_walkers,
            bulk: found.ess_bulk,
            tail: found.ess_tail,
        })
        .collect();
    judge(&figures, settings, evaluations_kept, Some(diagnostics))
}

/// Compares with what is wanted. Effective samples grow in proportion to the draws, R̂² − 1 falls in inverse proportion;
/// so a failed test needs a multiple of the evaluations that the kept draws took.
fn judge(
    figures: &[Figures],
    settings: &EnsembleSettings,
    evaluations_kept: f64,
    diagnostics: Option<Vec<ParameterDiagnostics>>,
) -> Verdict {
    let mut failing = vec![];
    for (parameter, found) in figures.iter().enumerate() {
        let watched = settings.watched.contains(&parameter);
        let bulk_wanted = if watched {
            settings.effective_samples.max(settings.minimum_effective_samples)
        } else {
            settings.minimum_effective_samples
        };
        let squared = |rhat: f64| rhat * rhat - 1.0;
        let tests = [
            (
                Test::Rhat,
                found.rhat,
                settings.maximum_rhat,
                squared(found.rhat) / squared(settings.maximum_rhat),
                found.rhat < settings.maximum_rhat,
            ),
            (
                Test::WalkerRhat,
                found.rhat_of_walkers,
                MAXIMUM_WALKER_RHAT,
                squared(found.rhat_of_walkers) / squared(MAXIMUM_WALKER_RHAT),
                found.rhat_of_walkers < MAXIMUM_WALKER_RHAT,
            ),
            (Test::BulkEss, found.bulk, bulk_wanted, bulk_wanted / found.bulk, found.bulk >= bulk_wanted),
            (
                Test::TailEss,
                found.tail,
                settings.minimum_effective_samples,
                settings.minimum_effective_samples / found.tail,
                found.tail >= settings.minimum_effective_samples,
            ),
        ];
        for (test, value, wanted, multiple, passed) in tests {
            if !passed {
                let more = (multiple - 1.0) * evaluations_kept;
                let more_evaluations = (more.is_finite() && more > 0.0).then_some(more);
                failing.push(FailedTest { parameter, test, value, wanted, more_evaluations });
            }
        }
    }
    let need = |failed: &FailedTest| failed.more_evaluations.unwrap_or(f64::INFINITY);
    failing.sort_by(|a, b| need(b).total_cmp(&need(a)));
    let counted = |parameter: &usize| settings.watched.is_empty() || settings.watched.contains(parameter);
    let effective_samples = figures
        .iter()
        .enumerate()
        .filter(|(parameter, _)| counted(parameter))
        .map(|(_, found)| found.bulk)
        .fold(f64::INFINITY, f64::min);
    let worst_rhat = figures
        .iter()
        .map(|found| found.rhat)
        .enumerate()
        .max_by(|a, b| a.1.total_cmp(&b.1))
        .unwrap_or((0, f64::NAN));
    Verdict { failing, effective_samples, worst_rhat, diagnostics }
}
