//! What a summary does not show while the measurements are blinded.

use crate::record::{GeneralRelativity, Summary};

/// Marks the summary and takes out what tells where the departure lies: its mean, median and intervals, those of derived
/// quantities, its value at the best point and from parts of the data, where general relativity lies, and what would mimic it. Errors, convergence and
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
    // Whether parts agree, and how well each knows it, says nothing of where it lies.
    for part in
        summary.by_part.iter_mut().flat_map(|by_part| by_part.surveys.iter_mut().chain(&mut by_part.bins))
    {
        (part.value, part.together) = (None, None);
    }
    summary.clocks.clear();
}
