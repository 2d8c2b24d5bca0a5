//! What the departure means for clocks, in plain words.

use oddwell_study::record::{ClockSummary, Summary};

use crate::numbers::{UNKNOWN, rounded, share, significant};
use crate::style::Style;
use crate::text::wrapped;

pub(super) fn section(summary: &Summary, style: Style) -> String {
    if summary.blinded || summary.clocks.is_empty() {
        return String::new();
    }
    let mut out = format!("{}\n", style.strong("What it means for clocks"));
    for clock in &summary.clocks {
        out.push_str(&wrapped("  - ", 4, &sentence(clock)));
    }
    let text = "(The rms over pairs of places that far apart, comoving; the share is of its square.)";
    out + &wrapped("  ", 2, text)
}

fn sentence(clock: &ClockSummary) -> String {
    let contrast = &clock.seconds_per_year;
    let error = contrast.sd.unwrap_or(f64::NAN);
    let seconds = |value: f64| rounded(value, error);
    let mut text = format!(
        "In `{}.{}` clocks {} Mpc/h apart differ by {} seconds a year",
        clock.survey,
        clock.bin,
        clock.distance,
        contrast.mean.map_or(UNKNOWN.to_owned(), seconds)
    );
    if let Some([low, high]) = contrast.interval68.filter(|_| error > 0.0) {
        text.push_str(&format!(" (68 %: {} to {})", seconds(low), seconds(high)));
    }
    if let Some(relativity) = clock.general_relativity {
        text.push_str(&format!("; general relativity gives {}", significant(relativity, 3)));
    }
    if let Some(reached) = clock.share_reached {
        let reached = share(reached);
        text.push_str(&format!(
            "; {reached} of this is from scales that the measurement reaches, the rest is the shape's word"
        ));
    }
    text + "."
}
