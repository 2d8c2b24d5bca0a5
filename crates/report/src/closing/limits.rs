//! What a result does not mean.

use oddwell_study::record::{Summary, SwitchedOff};

use crate::numbers::{signed, significant};
use crate::style::Style;
use crate::text::wrapped;

pub(super) fn section(summary: &Summary, style: Style) -> String {
    let text = limits_text(summary);
    format!("{}\n{}", style.strong("What this does not mean"), wrapped("  ", 2, &text))
}

/// The same as one paragraph.
pub(crate) fn limits_text(summary: &Summary) -> String {
    let mut text = String::new();
    if summary.warnings.iter().any(|warning| warning.code == "growth-assumed") {
        text.push_str(
            "A departure that light alone feels is quoted as if matter grew as in general relativity. ",
        );
    }
    if let Some(left_out) = &summary.switched_off {
        text.push_str(&sentence(left_out));
    }
    text.push_str("All of it is linear theory, which ends near 20 Mpc/h. ");
    text.push_str(if summary.departure_parameters.is_empty() {
        "A posterior is not an evidence: it takes the hypothesis for granted and cannot favour it over another."
    } else {
        "A posterior is not an evidence: it says where the departure lies if this hypothesis holds, not whether it \
         holds, and an interval that leaves out zero is no detection."
    });
    text
}

/// The largest effect that is switched off, and what it would be taken for.
fn sentence(left_out: &SwitchedOff) -> String {
    let what = match left_out.effect.as_str() {
        "wide_angle" => "switches wide-angle terms off: they",
        "light_cone" => "switches light-cone evolution off: it",
        "lensing" => "switches lensing off: it",
        "offset" => "holds the redshift offset at 0: one of 10 km/s",
        other => return format!("The study switches `{other}` off. "),
    };
    let tau = signed(&significant(left_out.tau, 2));
    format!("The study {what} would be taken for a departure of {tau} that light feels. ")
}
