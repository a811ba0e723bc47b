//! Intervals about a value: an expanded uncertainty, and what a Monte Carlo run gave, in text and HTML.
//!
//! U is always shown with its k, its level and where k came from (JCGM 100:2008, 7.2.3), a Monte Carlo run with its seed
//! and its number of draws. The surprise: for an equilibrium constant the numbers are those of lg K°, and only the ends
//! of the interval are given as K°.

use crate::model::expanded::Expanded;
use crate::model::monte_carlo::{Comparison, Propagation, Summary};
use crate::model::{caution, conditions};
use crate::num::math;
use crate::quantity::{Quantity, round};
use crate::render::{Bundle, html};
use crate::units::{basis_words, reader_text};

fn both(lines: &[String]) -> Bundle {
    let markup: Vec<String> = lines
        .iter()
        .enumerate()
        .map(|(nth, line)| if nth == 0 { format!("<b>{}</b>", html::escaped(line)) } else { html::escaped(line) })
        .collect();
    let rest = lines.iter().skip(1).map(|line| format!("\n  {line}")).collect::<String>();
    Bundle::text(format!("{}{rest}", lines.first().map_or("", String::as_str)))
        .with_text("text/html", format!("<p>{}</p>", markup.join("<br>")))
}

fn named(value: &Quantity) -> String {
    let symbol = conditions::symbol(value);
    if symbol.is_empty() { symbol } else { format!("{symbol} = ") }
}

/// `(-37.62 ± 0.26) kJ/mol`, both with the decimals that give the half-width two digits.
fn with_half_width(y: f64, half_width: f64, unit: &str) -> String {
    let decimals = round::decimals_for(half_width);
    format!("({} ± {}) {unit}", round::fixed(y, decimals), round::fixed(half_width, decimals)).trim_end().to_owned()
}

fn percent(level: f64) -> String {
    // Twelve digits, since 0.997 × 100 is 99.7 but for rounding.
    let percent: f64 = format!("{:.11e}", 100.0 * level).parse().unwrap_or(100.0 * level);
    format!("{} %", round::shortest(percent))
}

/// `(-37.62 ± 0.26) kJ/mol, k = 1.96 (95 %, normal distribution)`.
pub fn expanded(expanded: &Expanded) -> Bundle {
    let value = &expanded.value;
    let unit = value.unit();
    let how = match (expanded.dof, expanded.whole_dof()) {
        (Some(dof), Some(whole)) => {
            format!("Student's t for {whole} of {} effective degrees of freedom", round::fixed(dof, 1))
        }
        _ => "normal distribution".to_owned(),
    };
    let coverage = format!("k = {:.2} ({}, {how})", expanded.k, percent(expanded.level));
    let mut lines = Vec::new();
    if expanded.logarithmic {
        let ln10 = std::f64::consts::LN_10;
        let lg = with_half_width(math::log10(value.si()), expanded.half_width.si() / ln10, "");
        lines.push(format!("lg K° = {}, {coverage}", lg.trim_matches(['(', ')'])));
        let end = |end: &Quantity| round::significant(end.si(), 3);
        lines.push(format!("K° from {} to {}, p° = 1 bar", end(&expanded.low), end(&expanded.high)));
    } else {
        let y = unit.from_si(value.si());
        let half_width = expanded.half_width.si() / unit.factor;
        let unit_text = reader_text(&unit);
        let shown = if half_width > 0.0 {
            with_half_width(y, half_width, &unit_text)
        } else {
            format!("({} ± 0) {unit_text}", round::shortest(y)).trim_end().to_owned()
        };
        let basis = basis_words(&unit.dim).map_or_else(String::new, |basis| format!(", {basis}"));
        lines.push(format!("{}{shown}, {coverage}{basis}", named(value)));
    }
    if !expanded.silent.is_empty() {
        lines.push(format!("of the stated part alone: no u stated for {}", expanded.silent));
    }
    if let Some((input, shape)) = &expanded.dominated_by {
        lines.push(format!(
            "more than half of the variance is that of {input}, which is {}: the value is not near to normal, so k is too \
             large; ask `monte_carlo`",
            shape.word()
        ));
    }
    lines.extend(caution::texts(value).into_iter().map(|caution| format!("caution: {caution}")));
    both(&lines)
}

/// What the draws gave, and how first derivatives compare.
pub fn propagation(run: &Propagation) -> Bundle {
    let unit = if run.logarithmic { String::new() } else { reader_text(&run.unit) };
    // Interval and u with the decimals that the draws support.
    let decimals = if run.drawn.u > 0.0 { round::decimals_for(run.drawn.u) } else { 6 };
    let fixed = |x: f64| round::fixed(x, decimals);
    let name = if run.logarithmic { "ln K° = ".to_owned() } else { named(&run.value) };
    let basis = basis_words(&run.unit.dim).filter(|_| !run.logarithmic);
    let basis = basis.map_or_else(String::new, |basis| format!(", {basis}"));
    let with_unit = |text: String| format!("{text} {unit}").trim_end().to_owned();
    let level = percent(run.settings.level);
    let Summary { mean, u, low, high } = run.drawn;
    let shown = if u > 0.0 { round::with_brackets(mean, u) } else { fixed(mean) };
    let mut lines =
        vec![format!("{name}{}, {level} from {} to {}{basis}", with_unit(shown), fixed(low), with_unit(fixed(high)))];
    let two = |x: f64| if x > 0.0 { round::with_two_digits(x) } else { "0".to_owned() };
    let stable = if run.stable {
        format!("two digits of u stable (δ = {})", with_unit(round::shortest(run.tolerance)))
    } else {
        "two digits of u not yet stable".to_owned()
    };
    lines.push(format!("Monte Carlo, {} draws, seed {}, {stable}", run.draws, run.settings.seed));
    let law = with_unit(two(run.u_law));
    let same = with_unit(two(run.u_linear));
    lines.push(format!("first derivatives: u = {law}, and {same} from the same draws"));
    match &run.comparison {
        Comparison::Interval { low, high, off_low, off_high, tolerance } => {
            let verdict = if run.linear_suffices() == Some(true) { "agree" } else { "do not agree" };
            lines.push(format!(
                "their interval: from {} to {}; the ends {verdict} within one digit of u (off by {} and {}, allowed {})",
                fixed(*low),
                with_unit(fixed(*high)),
                two(*off_low),
                two(*off_high),
                with_unit(round::shortest(*tolerance)),
            ));
        }
        Comparison::None { why } => lines.push(format!("their interval: none, since {why}")),
    }
    if run.logarithmic {
        let k = |ln_k: f64| round::significant(math::exp(ln_k), 3);
        lines.push(format!("K° from {} to {}, p° = 1 bar", k(low), k(high)));
    }
    if run.normal_groups {
        lines.push("correlated inputs drawn together as normal, without their degrees of freedom".to_owned());
    }
    if !run.by_derivatives.is_empty() {
        lines.push(format!(
            "by first derivatives, since it cannot be computed again: {}",
            run.by_derivatives.join("; ")
        ));
    }
    if !run.silent.is_empty() {
        lines.push(format!("held, since no u is stated: {}", run.silent));
    }
    lines.extend(caution::texts(&run.value).into_iter().map(|caution| format!("caution: {caution}")));
    both(&lines)
}
