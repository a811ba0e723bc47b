//! Values as LaTeX, for papers and for clients that set mathematics.

use crate::model::reaction::Reaction;
use crate::render::headline::Headline;
use crate::render::report::Report;
use crate::units;

/// Text made safe inside `\text{}`.
pub fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '\\' => out.push_str("\\textbackslash{}"),
            '&' | '%' | '$' | '#' | '_' | '{' | '}' => {
                out.push('\\');
                out.push(c);
            }
            '~' => out.push_str("\\textasciitilde{}"),
            '^' => out.push_str("\\textasciicircum{}"),
            c => out.push(c),
        }
    }
    out
}

fn symbol(symbol: &str) -> String {
    let standard = if symbol.ends_with('°') { "^\\circ" } else { "" };
    let bare = symbol.trim_end_matches('°');
    let (difference, bare) = match bare.strip_prefix("Δr") {
        Some(rest) => ("\\Delta_\\mathrm{r}", rest),
        None => match bare.strip_prefix('Δ') {
            Some(rest) => ("\\Delta ", rest),
            None => ("", bare),
        },
    };
    let bare = match bare {
        "Cp" => return format!("{difference}C_{{p}}{standard}"),
        "Cv" => return format!("{difference}C_{{V}}{standard}"),
        other => other,
    };
    format!("{difference}{bare}{standard}")
}

/// A value as one displayed formula, its remarks as text.
pub fn headline(headline: &Headline) -> String {
    let symbol = if headline.symbol.is_empty() { String::new() } else { format!("{} = ", symbol(&headline.symbol)) };
    let unit = units::reader_latex(&headline.unit);
    let unit = if headline.unit_text().is_empty() { String::new() } else { format!("\\;{unit}") };
    let number = match headline.number.split_once('e') {
        Some((mantissa, exponent)) => format!("{mantissa} \\times 10^{{{exponent}}}"),
        None => headline.number.clone(),
    };
    let remarks = headline.remarks();
    let remarks =
        if remarks.is_empty() { String::new() } else { format!("\\quad\\text{{{}}}", escaped(&remarks.join(", "))) };
    format!("$\\displaystyle {symbol}{number}{unit}{remarks}$")
}

/// A reaction, species upright.
pub fn equation(reaction: &Reaction) -> String {
    let side = |products: bool| {
        let terms = reaction.terms().iter().filter(|term| (term.nu > 0.0) == products);
        let shown = terms.map(|term| {
            let nu = term.nu.abs();
            let number = if nu == 1.0 { String::new() } else { format!("{nu}\\,") };
            format!("{number}\\text{{{}}}", escaped(&term.substance.species.id))
        });
        shown.collect::<Vec<_>>().join(" + ")
    };
    format!("$\\displaystyle {} \\rightarrow {}$", side(false), side(true))
}

/// A report's headline with its label; the register stands in the other forms.
pub fn report(report: &Report) -> String {
    let label = escaped(&report.record.label);
    format!("\\textbf{{{label}}}: {}{}", headline(&report.headline), cautions(&report.record.cautions))
}

/// Cautions, each in a paragraph of its own.
pub fn cautions(cautions: &[String]) -> String {
    cautions.iter().map(|caution| format!("\n\n\\textbf{{Caution:}} {}", escaped(caution))).collect()
}
