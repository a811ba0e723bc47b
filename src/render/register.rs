//! The register of a session: every reported value with its assumptions, in one table.

use crate::render::report::Report;
use crate::render::{Bundle, html, text};

/// All reports' assumptions, in the order of the reports.
pub fn bundle(reports: &[Report]) -> Bundle {
    if reports.is_empty() {
        return Bundle::text(
            "Nothing has been reported yet, so there is nothing to assume. Report a value with `report(label, value)`.",
        );
    }
    let mut plain = String::new();
    let mut markup = String::new();
    for report in reports {
        let record = &report.record;
        plain.push_str(&format!(
            "{}: {}\n{}",
            record.label,
            record.shown,
            text::assumptions(&record.assumptions, "  ")
        ));
        markup.push_str(&format!(
            "<p><b>{}</b></p>{}",
            html::escaped(&record.label),
            html::assumptions(&record.assumptions)
        ));
    }
    plain.truncate(plain.trim_end().len());
    Bundle::text(plain).with_text("text/html", markup)
}
