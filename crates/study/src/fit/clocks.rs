//! What the fit says of clocks.

use super::analysis::Analysis;
use super::summary::{finite, interval, parameter};
use crate::assemble::{Measurements, Posterior};
use crate::clocks::{ClockContrasts, ClockScratch, clock_columns};
use crate::record::{ClockContrastSummary, ClockSummary, Ordered, ParameterSummary};
use crate::run_error::RunError;
use oddwell_sampler::Chain;

/// The quantities beside a chain: names, a column of draws each, and what the summary says of them.
#[derive(Debug, Default)]
pub(super) struct Derived {
    pub(super) names: Vec<String>,
    pub(super) columns: Vec<Vec<f64>>,
    pub(super) parameters: Ordered<ParameterSummary>,
    pub(super) clocks: Vec<ClockSummary>,
}

impl Derived {
    /// These first, then others.
    pub(super) fn and(mut self, others: Derived) -> Derived {
        self.names.extend(others.names);
        self.columns.extend(others.columns);
        self.parameters.extend(others.parameters);
        self.clocks.extend(others.clocks);
        self
    }
}

pub(super) fn derived(
    posterior: &Posterior,
    measurements: &Measurements,
    chain: &Chain,
    analysis: &Analysis,
) -> Result<Derived, RunError> {
    let best = posterior.values(&analysis.best);
    let contrasts = ClockContrasts::new(posterior, measurements, &best)?;
    let columns = clock_columns(&contrasts, posterior, chain);
    let layout = posterior.model.layout();
    let relativity = contrasts.in_general_relativity(posterior.model.setup(), layout, &best)?;
    let mut scratch = ClockScratch::default();
    let mut derived = Derived { columns, ..Derived::default() };
    for (index, bin) in contrasts.bins.iter().enumerate() {
        let diagnostics = chain.diagnose(&derived.columns[index]);
        let share = contrasts.full(&best, &mut scratch, index)?.share;
        derived.clocks.push(ClockSummary {
            survey: bin.survey.clone(),
            bin: bin.bin.clone(),
            distance: contrasts.distance,
            seconds_per_year: ClockContrastSummary {
                mean: finite(diagnostics.mean),
                sd: finite(diagnostics.sd),
                interval68: interval(diagnostics.interval68),
            },
            general_relativity: finite(relativity[index]),
            share_reached: finite(share),
        });
        derived.names.push(bin.name());
        derived.parameters.insert(bin.name(), parameter(&diagnostics, None));
    }
    Ok(derived)
}
