//! Reports and values as plain text, for terminals and for clients without HTML.

use crate::num::math;
use crate::quantity::Quantity;
use crate::quantity::round::significant;
use crate::render::headline::Headline;
use crate::render::report::{Assumption, Record, Report};

/// A value in one line.
pub fn value(value: &Quantity) -> String {
    Headline::of(value).line()
}

/// A report, from headline to sources.
pub fn report(report: &Report) -> String {
    let record = &report.record;
    let mut out = format!("{}\n  {}\n", record.label, record.shown);
    let mut line = |name: &str, text: &str| {
        if !text.is_empty() {
            out.push_str(&format!("  {name:<12}{text}\n"));
        }
    };
    line("of", &record.about.join("; "));
    line("conditions", &record.conditions);
    line("check", &record.check_line);
    for caution in &record.cautions {
        line("caution", caution);
    }
    out.push_str(&format!("  assumptions (tolerance {})\n", tolerance(report)));
    out.push_str(&assumptions(&record.assumptions, "    "));
    if !record.alternatives.is_empty() {
        out.push_str("  shortcuts not taken would have moved the value by\n");
        let widest = record.alternatives.iter().map(|a| a.price_shown.chars().count()).max().unwrap_or(0);
        for alternative in &record.alternatives {
            let price = padded(&alternative.price_shown, widest);
            out.push_str(&format!("    {price}  {} ({})\n", alternative.words, alternative.id));
        }
    }
    out.push_str(&sources(record));
    out.truncate(out.trim_end().len());
    out
}

/// Cautions, each on a line of its own below what they belong to.
pub fn cautions(cautions: &[String]) -> String {
    cautions.iter().map(|caution| format!("\n  caution: {caution}")).collect()
}

/// The tolerance with the unit that readers see.
pub fn tolerance(report: &Report) -> String {
    let number =
        report.record.tolerance.parse().map_or_else(|_| report.record.tolerance.clone(), |t| significant(t, 2));
    if report.headline.logarithm.is_some()
        && let (Ok(t), Ok(k)) = (report.record.tolerance.parse::<f64>(), report.record.value.parse::<f64>())
    {
        return format!("{number}, {} in lg K°", significant(math::log10(1.0 + t / k), 2));
    }
    let unit = report.headline.unit_text();
    if unit.is_empty() { number } else { format!("{number} {unit}") }
}

fn padded(text: &str, width: usize) -> String {
    let missing = width.saturating_sub(text.chars().count());
    format!("{}{text}", " ".repeat(missing))
}

/// Rows of a register, worst first.
pub fn assumptions(rows: &[Assumption], indent: &str) -> String {
    if rows.is_empty() {
        return format!("{indent}none\n");
    }
    let price = |row: &Assumption| row.price_shown.clone().unwrap_or_else(|| "no price".to_owned());
    let widest = rows.iter().map(|row| price(row).chars().count()).max().unwrap_or(0);
    let widest_id = rows.iter().map(|row| row.id.chars().count()).max().unwrap_or(0);
    let mut out = String::new();
    for row in rows {
        let order = if row.first_order { " to first order" } else { "" };
        let price = padded(&price(row), widest);
        out.push_str(&format!("{indent}{:<9} {:<widest_id$}  {price}{order}  {}\n", row.status, row.id, row.subject));
        out.push_str(&format!("{indent}          {}\n", row.note));
        if let Some(dealt) = &row.dealt {
            out.push_str(&format!("{indent}          {dealt}\n"));
        }
    }
    out
}

/// What was decided about a result's assumptions, one line each.
pub fn decisions(record: &Record) -> String {
    let decided = record.assumptions.iter().filter_map(|row| {
        row.dealt.as_ref().map(|dealt| format!("{}: {} ({}), {dealt}", record.label, row.id, row.status))
    });
    decided.collect::<Vec<_>>().join("\n")
}

fn sources(record: &Record) -> String {
    let mut out = String::from("  sources\n");
    for (number, source) in (1..).zip(&record.sources) {
        out.push_str(&format!("    [{number}] {source}\n"));
    }
    out
}
