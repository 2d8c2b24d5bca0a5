//! What the sampling was worth and what it cost.

use oddwell_study::record::{ParameterSummary, Summary};

use crate::numbers::{count, duration, significant, whole};
use crate::style::Style;
use crate::text::wrapped;

pub(super) fn section(summary: &Summary, style: Style) -> String {
    let cost = &summary.sampler;
    let mut out = format!("{}\n", style.strong("Sampling"));
    let verdict = if summary.converged { "Converged" } else { "Not converged" };
    let mut worst = Vec::new();
    if let Some((name, rhat)) = extreme(summary, |each| each.rhat, f64::gt) {
        worst.push(format!("largest R̂ {rhat:.3} (`{name}`)"));
    }
    if let Some((name, ess)) = extreme(summary, |each| each.ess, f64::lt) {
        worst.push(format!("smallest ESS {} (`{name}`)", whole(ess)));
    }
    if let Some((name, ess)) = extreme(summary, |each| each.ess_tail, f64::lt) {
        worst.push(format!("in the tails {} (`{name}`)", whole(ess)));
    }
    let worst = if worst.is_empty() { "no diagnostics".to_owned() } else { worst.join(", ") };
    out.push_str(&wrapped("  ", 2, &format!("{verdict}: {worst}.")));
    let accepted = cost
        .acceptance
        .map_or(String::new(), |share| format!(", {} % accepted", significant(100.0 * share, 2)));
    out.push_str(&wrapped(
        "  ",
        2,
        &format!(
            "{} evaluations in {}: {} ensembles of {} walkers, {} steps, the first {} dropped{accepted}; seed {}.",
            count(cost.evaluations),
            duration(cost.wall_seconds),
            cost.ensembles,
            cost.walkers,
            count(cost.steps),
            count(cost.warm_up),
            cost.seed,
        ),
    ));
    if cost.rejected_evaluations > 0 {
        let reasons: Vec<String> = cost
            .rejected_reasons
            .iter()
            .map(|(reason, times)| format!("{reason} ({})", count(*times)))
            .collect();
        let reasons = if reasons.is_empty() { String::new() } else { format!(": {}", reasons.join("; ")) };
        let text = format!("{} points had no likelihood{reasons}.", count(cost.rejected_evaluations));
        out.push_str(&wrapped("  ", 2, &text));
    }
    out
}

/// The inferred parameter whose number is the most extreme. Derived quantities follow from these and stop nothing.
fn extreme(
    summary: &Summary,
    number: impl Fn(&ParameterSummary) -> Option<f64>,
    beats: impl Fn(&f64, &f64) -> bool,
) -> Option<(&str, f64)> {
    let mut worst: Option<(&str, f64)> = None;
    for (name, parameter) in summary.parameters.iter().filter(|(name, _)| !name.starts_with("derived.")) {
        let Some(value) = number(parameter).filter(|value| value.is_finite()) else { continue };
        if worst.is_none_or(|(_, best)| beats(&value, &best)) {
            worst = Some((name, value));
        }
    }
    worst
}
