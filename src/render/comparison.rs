//! A comparison of two values as text, HTML and LaTeX.

use crate::model::compare::{Comparison, Verdict};
use crate::quantity::round;
use crate::render::headline::Headline;
use crate::render::{Bundle, html, latex};

/// `a - b`, or what stands for it.
fn name(comparison: &Comparison) -> &'static str {
    if comparison.by_logarithm { "ln(a/b)" } else { "a - b" }
}

/// Names and values, in the order they are read.
fn rows(comparison: &Comparison) -> Vec<(&'static str, String)> {
    let line = |value: &crate::quantity::Quantity| Headline::of(value).line();
    let mut rows =
        vec![("a", line(&comparison.a)), ("b", line(&comparison.b)), (name(comparison), line(&comparison.difference))];
    let reference = comparison.b.si().abs();
    if !comparison.by_logarithm && reference > 0.0 && !comparison.b.kind().what.is_temperature() {
        let percent = 100.0 * comparison.difference.si() / reference;
        rows.push(("of b", format!("{} %", round::significant(percent, 2))));
    }
    if let Some(k) = comparison.k {
        let bound = if comparison.verdict == Verdict::DifferAsFarAsKnown { "at most " } else { "" };
        rows.push(("k", format!("{bound}{}", round::significant(k, 2))));
    }
    if comparison.shared_inputs > 0 {
        let inputs = if comparison.shared_inputs == 1 { "input" } else { "inputs" };
        rows.push(("in common", format!("{} {inputs}", comparison.shared_inputs)));
    }
    rows
}

/// In text, HTML and LaTeX.
pub fn bundle(comparison: &Comparison) -> Bundle {
    Bundle::text(text(comparison)).with_text("text/html", html(comparison)).with_text("text/latex", latex(comparison))
}

/// For terminals.
fn text(comparison: &Comparison) -> String {
    let rows = rows(comparison);
    let width = rows.iter().map(|(name, _)| name.chars().count()).max().unwrap_or(0);
    let mut out = format!("{}\n", comparison.sentence());
    for (name, value) in rows {
        out.push_str(&format!("  {name:<width$}  {value}\n"));
    }
    out.truncate(out.trim_end().len());
    out
}

/// For a notebook's page.
fn html(comparison: &Comparison) -> String {
    let mut out = format!("<div class=\"hessbook-comparison\"><p>{}</p><table>", html::escaped(&comparison.sentence()));
    for (name, value) in rows(comparison) {
        let cell = |text: &str| format!("<td style=\"text-align:left\">{}</td>", html::escaped(text));
        out.push_str(&format!("<tr>{}{}</tr>", cell(name), cell(&value)));
    }
    out.push_str("</table></div>");
    out
}

/// The difference as a formula, with the verdict.
fn latex(comparison: &Comparison) -> String {
    let escaped = latex::escaped;
    let value = Headline::of(&comparison.difference).line();
    format!(
        "$\\displaystyle \\text{{{}}} = \\text{{{}}}\\quad\\text{{{}}}$",
        escaped(name(comparison)),
        escaped(&value),
        escaped(&comparison.sentence())
    )
}
