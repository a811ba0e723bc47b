//! An explanation of a gap as text, HTML and LaTeX: the mistakes that fit, best first, or that none does.
//!
//! The surprise: that nothing fits is said with what was tried, since silence would read as "nothing was found wrong".

use crate::model::gap::candidate::Scale;
use crate::model::gap::{Fit, Gap, NAMED, Told};
use crate::quantity::round;
use crate::render::headline::Headline;
use crate::render::html::escaped;
use crate::render::{Bundle, latex};
use crate::units;

/// A figure on the scale of the gap, with its unit; `like` decides how many digits.
fn figure(gap: &Gap, si: f64, like: f64) -> String {
    let (value, scale, unit) = match gap.scale {
        Scale::Linear => {
            let unit = gap.a.unit();
            // A gap between points is a difference.
            let kelvin = unit.is_point();
            let factor = if kelvin { 1.0 } else { unit.factor };
            (si / factor, like / factor, if kelvin { "K".to_owned() } else { units::reader_text(&unit) })
        }
        Scale::Logarithm => (si, like, "in ln K".to_owned()),
    };
    let decimals = round::decimals_for(scale.abs().max(1e-12)).clamp(0, 9);
    let number = round::fixed(value, decimals);
    if unit.is_empty() { number } else { format!("{number} {unit}") }
}

/// What decides the digits of the gap: what it is known to.
fn known_to(gap: &Gap) -> f64 {
    let known = gap.rounding.max(gap.u.unwrap_or(0.0));
    if known > 0.0 { known } else { 1e-4 * gap.gap.abs() }
}

fn title(gap: &Gap) -> String {
    let name = if gap.scale == Scale::Logarithm { "ln(b/a)" } else { "b - a" };
    let k = gap.u.map(|u| format!(", {} standard uncertainties", round::significant(gap.gap.abs() / u, 2)));
    format!("gap {name} = {}{}", figure(gap, gap.gap, known_to(gap)), k.unwrap_or_default())
}

/// What is said before the list.
fn verdict(gap: &Gap) -> String {
    let tried = format!("{} alternatives of {} kinds were computed", gap.tested, gap.kinds);
    let limit = 100.0 * NAMED;
    let small = gap.u.is_some_and(|u| gap.gap.abs() <= 2.0 * u);
    let small = if small { "; the gap is within its own uncertainty and needs no mistake" } else { "" };
    match gap.fits.len() {
        _ if gap.gap.abs() <= gap.rounding => {
            format!("the gap is within the rounding of the figures: nothing to explain ({tried})")
        }
        0 => format!("no usual mistake is named: {tried}, and none fits better than chance would ({limit} %){small}"),
        1 => format!("one usual mistake would leave it ({tried}){small}"),
        fits => format!("{fits} usual mistakes would leave it, best first ({tried}){small}"),
    }
}

struct Words {
    what: String,
    details: Vec<String>,
}

fn told(told: &Told) -> String {
    format!("in {}: {} ({})", if told.in_first { "a" } else { "b" }, told.words, told.mistake.id())
}

fn words(gap: &Gap, fit: &Fit) -> Words {
    let like = known_to(gap);
    let bridge = if fit.within_rounding { "within the rounding of the figures" } else { "within their uncertainty" };
    let mut details = vec![format!(
        "would leave {}; {} is left over, {bridge}; {} % of random gaps would fit one of the alternatives as well",
        figure(gap, fit.predicted, like),
        figure(gap, fit.residual, like),
        round::significant(100.0 * fit.chance, 1)
    )];
    details.extend(fit.also.iter().map(|also| format!("the same gap: {}", told(also))));
    details.extend(fit.sources.iter().map(|source| format!("source: {source}")));
    Words { what: told(&fit.told), details }
}

/// In text, HTML and LaTeX.
pub fn bundle(gap: &Gap) -> Bundle {
    Bundle::text(text(gap)).with_text("text/html", html(gap)).with_text("text/latex", latex(gap))
}

/// For terminals.
fn text(gap: &Gap) -> String {
    let mut out = format!("{}\n", title(gap));
    for (name, value) in [("a", &gap.a), ("b", &gap.b)] {
        out.push_str(&format!("  {name}  {}\n", Headline::of(value).line()));
    }
    out.push_str(&format!("  {}\n", verdict(gap)));
    for (number, fit) in (1..).zip(&gap.fits) {
        let words = words(gap, fit);
        out.push_str(&format!("  {number}. {}\n", words.what));
        words.details.iter().for_each(|detail| out.push_str(&format!("     {detail}\n")));
    }
    for reason in &gap.left_out {
        out.push_str(&format!("  not tested: {reason}\n"));
    }
    out.truncate(out.trim_end().len());
    out
}

/// For a notebook's page.
fn html(gap: &Gap) -> String {
    let mut out = format!("<div class=\"hessbook-gap\"><p><b>{}</b><br>", escaped(&title(gap)));
    for (name, value) in [("a", &gap.a), ("b", &gap.b)] {
        out.push_str(&format!("{name}: {}<br>", escaped(&Headline::of(value).line())));
    }
    out.push_str(&format!("{}</p>", escaped(&verdict(gap))));
    if !gap.fits.is_empty() {
        out.push_str("<ol>");
        for fit in &gap.fits {
            let words = words(gap, fit);
            let details: String = words.details.iter().map(|detail| format!("<br>{}", escaped(detail))).collect();
            out.push_str(&format!("<li><b>{}</b>{details}</li>", escaped(&words.what)));
        }
        out.push_str("</ol>");
    }
    for reason in &gap.left_out {
        out.push_str(&format!("<p>not tested: {}</p>", escaped(reason)));
    }
    out.push_str("</div>");
    out
}

/// One line a mistake, as an array.
fn latex(gap: &Gap) -> String {
    let text = |text: &str| format!("\\text{{{}}}", latex::escaped(text));
    let mut rows = vec![format!("& {}", text(&title(gap))), format!("& {}", text(&verdict(gap)))];
    for (number, fit) in (1..).zip(&gap.fits) {
        let words = words(gap, fit);
        rows.push(format!("{number} & {}", text(&words.what)));
        rows.extend(words.details.iter().map(|detail| format!("& {}", text(detail))));
    }
    format!("$$\\begin{{array}}{{rl}}\n{}\n\\end{{array}}$$", rows.join(" \\\\\n"))
}
