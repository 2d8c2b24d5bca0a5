//! The progress of a weighing: a line a hypothesis.

use indicatif::{MultiProgress, ProgressBar, ProgressDrawTarget, ProgressStyle};
use oddwell_report::count;
use oddwell_study::WeighWatch;

/// Lines on the terminal, or nothing.
pub(crate) struct WeighProgress {
    lines: Vec<ProgressBar>,
}

impl WeighProgress {
    /// Lines that are shown, or not.
    pub(crate) fn new(shown: bool, watch: &WeighWatch) -> Self {
        let target = if shown { ProgressDrawTarget::stderr() } else { ProgressDrawTarget::hidden() };
        let all = MultiProgress::with_draw_target(target);
        let width = watch.hypotheses.iter().map(|each| each.name.chars().count()).max().unwrap_or(0);
        let line = |name: &str, parts: usize| {
            let bar = all.add(ProgressBar::new(parts as u64));
            let style = ProgressStyle::with_template("{prefix} {bar:12} {wide_msg}");
            bar.set_style(style.unwrap_or_else(|_| ProgressStyle::default_bar()));
            bar.set_prefix(format!("{name:<width$}"));
            bar
        };
        Self { lines: watch.hypotheses.iter().map(|each| line(&each.name, each.parts().1)).collect() }
    }

    /// Shows where each hypothesis stands.
    pub(crate) fn show(&mut self, watch: &WeighWatch) {
        for (line, each) in self.lines.iter().zip(&watch.hypotheses) {
            let (done, parts) = each.parts();
            line.set_position(done as u64);
            line.set_message(format!(
                "{done} of {parts} parts · {} evaluations",
                count(each.watch.evaluations())
            ));
        }
    }
}

impl Drop for WeighProgress {
    fn drop(&mut self) {
        self.lines.iter().for_each(ProgressBar::finish_and_clear);
    }
}
