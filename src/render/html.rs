//! Reports and values as HTML that sits in a notebook's page: no script, no style sheet, every text of the user's escaped.

use crate::model::reaction::Reaction;
use crate::render::headline::Headline;
use crate::render::report::{Assumption, Report};
use crate::render::text;
use crate::units;

/// Text made safe for HTML.
pub fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            c => out.push(c),
        }
    }
    out
}

/// A value in one line.
pub fn headline(headline: &Headline) -> String {
    let symbol = if headline.symbol.is_empty() { String::new() } else { format!("{} = ", symbol(&headline.symbol)) };
    let unit = units::reader_html(&headline.unit);
    let unit = if unit.is_empty() { unit } else { format!("&nbsp;{unit}") };
    let remarks: String = headline.remarks().iter().map(|remark| format!(", {}", escaped(remark))).collect();
    format!("{symbol}<b>{}{unit}</b>{remarks}", escaped(&headline.number).replace('-', "−"))
}

/// `ΔrH°` with its subscript set as one.
fn symbol(symbol: &str) -> String {
    let (difference, rest) = match symbol.strip_prefix("Δr") {
        Some(rest) => ("Δ<sub>r</sub>", rest),
        None => symbol.strip_prefix('Δ').map_or(("", symbol), |rest| ("Δ", rest)),
    };
    let rest = escaped(rest);
    let rest = match rest.strip_prefix("Cp") {
        Some(after) => format!("<i>C<sub>p</sub></i>{after}"),
        None => {
            let mut chars = rest.chars();
            let first = chars.next().map_or_else(String::new, |c| format!("<i>{c}</i>"));
            format!("{first}{}", chars.as_str())
        }
    };
    format!("{difference}{rest}")
}

/// A reaction with subscripts, and what is derived from it.
pub fn equation(reaction: &Reaction) -> String {
    let side = |products: bool| {
        let terms = reaction.terms().iter().filter(|term| (term.nu > 0.0) == products);
        let shown = terms.map(|term| {
            let nu = term.nu.abs();
            let number = if nu == 1.0 { String::new() } else { format!("{nu}&nbsp;") };
            format!("{number}{}", species(&term.substance.species.id))
        });
        shown.collect::<Vec<_>>().join(" + ")
    };
    let delta = reaction.delta_n_gas();
    format!("{} → {}, Δ<i>n</i>(gas) = {delta}", side(false), side(true))
}

/// `CO<sub>2</sub>(g)`: digits after a letter or bracket of a formula are set low; names stay as they are.
fn species(id: &str) -> String {
    let (base, phase) = id.rsplit_once('(').map_or((id, ""), |(base, phase)| (base, phase));
    let phase = if phase.is_empty() { String::new() } else { format!("({phase}") };
    let is_formula = !base.contains(|c: char| c == ' ' || c == '-' && base.chars().any(char::is_lowercase))
        && base.starts_with(|c: char| c.is_uppercase());
    if !is_formula {
        return escaped(&format!("{base}{phase}"));
    }
    let mut out = String::new();
    let mut charge = false;
    for c in base.chars() {
        charge |= c == '+' || c == '-';
        match c {
            c if charge => out.push_str(&format!("<sup>{c}</sup>")),
            c if c.is_ascii_digit() => out.push_str(&format!("<sub>{c}</sub>")),
            c => out.push_str(&escaped(&c.to_string())),
        }
    }
    format!("{out}{}", escaped(&phase))
}

/// A report, from headline to sources.
pub fn report(report: &Report) -> String {
    let record = &report.record;
    let mut out = String::from("<div class=\"hessbook-report\">");
    out.push_str(&format!("<p><b>{}</b><br>{}</p>", escaped(&record.label), headline(&report.headline)));
    let mut facts = String::new();
    let about = record.about.join("; ");
    for (name, text) in [("of", &about), ("conditions", &record.conditions), ("check", &record.check_line)] {
        if !text.is_empty() {
            facts.push_str(&format!(
                "<tr><td style=\"text-align:left\">{name}</td><td style=\"text-align:left\">{}</td></tr>",
                escaped(text)
            ));
        }
    }
    if !facts.is_empty() {
        out.push_str(&format!("<table>{facts}</table>"));
    }
    out.push_str(&cautions(&record.cautions));
    out.push_str(&format!("<p>Assumptions (tolerance {})</p>", escaped(&text::tolerance(report))));
    out.push_str(&assumptions(&record.assumptions));
    if !record.alternatives.is_empty() {
        out.push_str("<p>Shortcuts not taken would have moved the value by</p><table>");
        for alternative in &record.alternatives {
            out.push_str(&format!(
                "<tr><td style=\"text-align:right;white-space:nowrap\">{}</td><td style=\"text-align:left\">{}</td>\
                 <td style=\"text-align:left\"><code>{}</code></td></tr>",
                escaped(&alternative.price_shown).replace('-', "−"),
                escaped(&alternative.words),
                escaped(&alternative.id)
            ));
        }
        out.push_str("</table>");
    }
    out.push_str("<details><summary>Sources</summary><ol>");
    for source in &record.sources {
        out.push_str(&format!("<li>{}</li>", escaped(source)));
    }
    out.push_str("</ol></details></div>");
    out
}

/// Cautions, each in a paragraph of its own.
pub fn cautions(cautions: &[String]) -> String {
    cautions.iter().map(|caution| format!("<p><b>Caution:</b> {}</p>", escaped(caution))).collect()
}

/// Rows of a register as a table, worst first.
pub fn assumptions(rows: &[Assumption]) -> String {
    if rows.is_empty() {
        return "<p>No assumptions.</p>".to_owned();
    }
    let mut out = String::from(
        "<table><thead><tr><th style=\"text-align:left\">status</th><th style=\"text-align:left\">assumption</th>\
         <th style=\"text-align:right\">price</th><th style=\"text-align:left\">about</th>\
         <th style=\"text-align:left\">test</th></tr></thead><tbody>",
    );
    for row in rows {
        let left = |text: &str| format!("<td style=\"text-align:left\">{text}</td>");
        let word = |text: &str| format!("<td style=\"text-align:left;white-space:nowrap\">{text}</td>");
        let price = escaped(row.price_shown.as_deref().unwrap_or("no price")).replace('-', "−");
        let order = if row.first_order { " (to first order)" } else { "" };
        // The status is a word first; weight only helps the eye and carries no meaning of its own.
        let status = match row.status.as_str() {
            "broken" | "strained" => format!("<b>{}</b>", escaped(&row.status)),
            _ => escaped(&row.status),
        };
        let note = match &row.dealt {
            Some(dealt) => format!("{}<br><i>{}</i>", escaped(&row.note), escaped(dealt)),
            None => escaped(&row.note),
        };
        let id = format!("<span title=\"{}\"><code>{}</code></span>", escaped(&row.claim), escaped(&row.id));
        out.push_str(&format!(
            "<tr>{}{}<td style=\"text-align:right;white-space:nowrap\">{price}{order}</td>{}{}</tr>",
            word(&status),
            word(&id),
            left(&escaped(&row.subject)),
            left(&note)
        ));
    }
    out.push_str("</tbody></table>");
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nothing_of_the_users_becomes_markup() {
        assert_eq!(escaped("<b onclick='x'>\"&"), "&lt;b onclick=&#39;x&#39;&gt;&quot;&amp;");
    }

    #[test]
    fn symbols_are_set_with_their_subscripts() {
        assert_eq!(symbol("ΔrH°"), "Δ<sub>r</sub><i>H</i>°");
        assert_eq!(symbol("ΔrCp°"), "Δ<sub>r</sub><i>C<sub>p</sub></i>°");
    }
}
