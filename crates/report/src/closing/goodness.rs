//! How well the best point fits: in all, by survey, by bin.

use oddwell_study::record::Summary;

use crate::numbers::{UNKNOWN, count, probability};
use crate::style::Style;
use crate::text::{Table, wrapped};

/// Probabilities closer to 0 or 1 than this are not chance: one honest fit in a thousand on either side.
const EXTREME: f64 = 1e-3;

pub(super) fn section(summary: &Summary, style: Style) -> String {
    let best = &summary.best;
    let mut table = Table::new(&["", "χ²", "data points", "effective parameters", "p-value"]);
    let mut row = |name: String, chi2: f64, points: usize, effective: Option<f64>, p_value: Option<f64>| {
        table.row(vec![
            name,
            format!("{chi2:.1}"),
            count(points as u64),
            effective.map_or(UNKNOWN.to_owned(), |number| format!("{number:.1}")),
            p_value.map_or(UNKNOWN.to_owned(), probability),
        ]);
    };
    let mut bins = 0;
    for survey in &best.surveys {
        row(
            survey.name.clone(),
            survey.chi2,
            survey.data_points,
            survey.effective_parameters,
            survey.p_value,
        );
        for bin in &survey.bins {
            bins += 1;
            row(format!("  {}", bin.name), bin.chi2, bin.data_points, bin.effective_parameters, bin.p_value);
        }
    }
    if best.surveys.len() != 1 {
        row("all".to_owned(), best.chi2, best.data_points, best.effective_parameters, best.p_value);
    }
    let mut out = format!("{}\n", style.strong("How well the best point fits"));
    out.push_str(&table.render(|header| style.faint(header)));
    if bins > best.surveys.len() {
        let note = "(A bin's χ² is by its own block of the covariance, so the bins need not add up to their survey.)";
        out.push_str(&wrapped("  ", 2, note));
    }
    if let Some(verdict) = best.p_value.and_then(verdict) {
        out.push_str(&style.fault(wrapped("  ", 2, &verdict).trim_end()));
        out.push('\n');
    }
    out
}

/// What a probability near 0 or 1 says of everything above it.
fn verdict(p_value: f64) -> Option<String> {
    if p_value < EXTREME {
        return Some(format!(
            "The model does not fit (p = {}): no interval above means what it says. Look for the bin, the scale or the \
             covariance that is at odds.",
            probability(p_value)
        ));
    }
    (p_value > 1.0 - EXTREME).then(|| {
        format!(
            "The fit is better than this noise allows (p = {}): the covariance is likely too large, and so are the \
             intervals above.",
            probability(p_value)
        )
    })
}
