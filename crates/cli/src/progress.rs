//! The progress of a fit, as the stop rule sees it.

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use oddwell_report::{count, duration, whole};
use oddwell_study::{MAXIMUM_RHAT, Phase, Progress};

/// A line on the terminal, or nothing.
pub(crate) struct ProgressLine {
    bar: ProgressBar,
    watched: String,
    phase: Option<Phase>,
}

impl ProgressLine {
    /// A line that shows (or not) how the departure's parameters fare; `watched` are their names.
    pub(crate) fn new(shown: bool, watched: &[&str]) -> Self {
        let target = if shown { ProgressDrawTarget::stderr() } else { ProgressDrawTarget::hidden() };
        let watched = match watched {
            [] => "every parameter".to_owned(),
            [only] => (*only).to_owned(),
            several => format!("{} departures", several.len()),
        };
        Self { bar: ProgressBar::with_draw_target(None, target), watched, phase: None }
    }

    /// Shows where the run stands.
    pub(crate) fn show(&mut self, progress: &Progress, names: &[String]) {
        if self.bar.is_hidden() {
            return;
        }
        if self.phase != Some(progress.phase) {
            self.phase = Some(progress.phase);
            self.bar.set_style(style(progress.phase));
        }
        if let (Phase::Sampling, Some(samples)) = (progress.phase, progress.effective_samples) {
            self.bar.set_length(progress.wanted_samples as u64);
            self.bar.set_position(samples.min(progress.wanted_samples) as u64);
        }
        self.bar.set_message(text(progress, names, &self.watched));
        self.bar.tick();
    }
}

impl Drop for ProgressLine {
    fn drop(&mut self) {
        self.bar.finish_and_clear();
    }
}

fn style(phase: Phase) -> ProgressStyle {
    let template = match phase {
        Phase::Peak | Phase::WarmUp => "{spinner} {wide_msg}",
        Phase::Sampling => "{bar:12} {wide_msg}",
    };
    ProgressStyle::with_template(template).unwrap_or_else(|_| ProgressStyle::default_spinner())
}

/// The words of the line: phase, time left, effective samples, worst R̂ and whose; the last may be cut off.
fn text(progress: &Progress, names: &[String], watched: &str) -> String {
    let phase = match progress.phase {
        Phase::Peak => "looking for the peak",
        Phase::WarmUp => "warming up",
        Phase::Sampling => "sampling",
    };
    let mut parts = vec![phase.to_owned()];
    if let Some(seconds) = left(progress) {
        parts.push(format!("about {} left", duration(seconds)));
    } else {
        parts.push(format!("{} evaluations", count(progress.evaluations)));
        parts.push(duration(progress.elapsed_seconds.floor()));
    }
    if progress.phase == Phase::Sampling {
        if let Some(samples) = progress.effective_samples {
            parts.push(format!("ESS of {watched} {} of {}", whole(samples), whole(progress.wanted_samples)));
        }
        if let Some((index, rhat)) = progress.worst_rhat.filter(|(_, rhat)| rhat.is_finite()) {
            let name = names.get(index).map_or("?", String::as_str);
            parts.push(format!("worst R̂ {rhat:.3}, below {MAXIMUM_RHAT} wanted ({name})"));
        }
    }
    parts.join(" · ")
}

/// Seconds until every test passes, at the speed so far; at most until the limit of evaluations.
fn left(progress: &Progress) -> Option<f64> {
    let to_limit = progress.maximum_evaluations.saturating_sub(progress.evaluations) as f64;
    let evaluations = progress.remaining_evaluations?.min(to_limit);
    (progress.evaluations > 0).then(|| progress.elapsed_seconds * evaluations / progress.evaluations as f64)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn progress(phase: Phase) -> Progress {
        Progress {
            phase,
            evaluations: 20_000,
            maximum_evaluations: 50_000_000,
            steps: 300,
            elapsed_seconds: 4.7,
            effective_samples: Some(1234.5),
            wanted_samples: 4000.0,
            worst_rhat: Some((1, 1.0342)),
            remaining_evaluations: Some(60_000.0),
        }
    }

    #[test]
    fn the_line_shows_what_the_stop_rule_sees() {
        let names = ["departure.tau".to_owned(), "larkfield.near.first.bias".to_owned()];
        assert_eq!(
            text(&progress(Phase::Sampling), &names, "departure.tau"),
            "sampling · about 14 s left · ESS of departure.tau 1,234 of 4,000 · worst R̂ 1.034, below 1.01 wanted \
             (larkfield.near.first.bias)"
        );
        let peak = Progress { remaining_evaluations: None, ..progress(Phase::Peak) };
        assert_eq!(text(&peak, &names, "departure.tau"), "looking for the peak · 20,000 evaluations · 4.0 s");
    }

    #[test]
    fn the_limit_of_evaluations_bounds_the_time_left() {
        let limited = Progress { maximum_evaluations: 30_000, ..progress(Phase::Sampling) };
        assert_eq!(left(&limited), Some(2.35));
    }
}
