//! What a summary does not show while the measurements are blinded.

use crate::record::{GeneralRelativity, Summary};

/// Marks the summary and takes out what tells where the departure lies: its mean, median and intervals, those of derived
/// quantities, its value at the best point, where general relativity lies, and what would mimic it. Errors, convergence and
/// goodness of fit stay: they are what an analysis is frozen on.
pub fn withhold(summary: &mut Summary) {
    summary.blinded = true;
    let telling = |name: &str| name.starts_with("departure.") || name.starts_with("derived.");
    for (name, parameter) in &mut summary.parameters {
        if telling(name) {
            parameter.mean = None;
            parameter.median = None;
            parameter.interval68 = None;
            parameter.interval95 = None;
        }
    }
    summary.best.parameters.retain(|name, _| !telling(name));
    summary.general_relativity = GeneralRelativity::default();
    summary.mimics.clear();
    summary.clocks.clear();
}
