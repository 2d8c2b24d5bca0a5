//! Every parameter on a line, derived quantities after the inferred ones.

use oddwell_study::record::Summary;

use super::hidden;
use crate::numbers::{UNKNOWN, rounded, two_digits, whole};
use crate::style::Style;
use crate::text::Table;

pub(super) fn section(summary: &Summary, style: Style) -> String {
    let mut table = Table::new(&["parameter", "mean", "sd", "prior sd", "ESS", "R̂"]);
    for (name, parameter) in &summary.parameters {
        let sd = parameter.sd.unwrap_or(f64::NAN);
        let mean = if hidden(summary, name) {
            "hidden".to_owned()
        } else {
            parameter.mean.map_or(UNKNOWN.to_owned(), |mean| rounded(mean, sd))
        };
        table.row(vec![
            name.clone(),
            mean,
            two_digits(sd),
            parameter.prior_sd.map_or(UNKNOWN.to_owned(), two_digits),
            parameter.ess.map_or(UNKNOWN.to_owned(), whole),
            parameter
                .rhat
                .filter(|rhat| rhat.is_finite())
                .map_or(UNKNOWN.to_owned(), |rhat| format!("{rhat:.3}")),
        ]);
    }
    table.render(|header| style.strong(header))
}
