//! Warnings, each with its code and the next thing to try.

use oddwell_study::record::Summary;

use crate::style::Style;
use crate::text::wrapped;

pub(super) fn section(summary: &Summary, style: Style) -> String {
    if summary.warnings.is_empty() {
        return String::new();
    }
    let mut out = format!("{}\n", style.strong("Look at this before you believe it"));
    for warning in &summary.warnings {
        let code = format!("{}:", warning.code);
        // Some texts begin with the words of their code.
        let said = format!("{}: ", warning.code.replace('-', " "));
        let text = warning.text.strip_prefix(&said).unwrap_or(&warning.text);
        let plain = wrapped("  ", 4, &format!("{code} {text}"));
        out.push_str(&plain.replacen(&code, &style.caution(&code), 1));
    }
    out
}
