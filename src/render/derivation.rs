//! A derivation as text, HTML and LaTeX, all from one [`Derivation`], so that they say the same.
//!
//! The surprise: LaTeX is one array with text in its cells, since what sets mathematics in a notebook knows no lists.

use crate::model::card::Card;
use crate::model::derivation::{Applied, Derivation, Hidden, InputRow, Line, Made, Step};
use crate::record::fold::Folded;
use crate::render::headline::Headline;
use crate::render::html::escaped;
use crate::render::{Bundle, html as html_parts, latex as latex_parts, text as text_parts};

/// The lines of a step, besides its number and place.
struct Words {
    title: String,
    /// `from i1 to i8`, the equation, the figures; each a line.
    details: Vec<String>,
    symbols: Vec<[String; 3]>,
    value: String,
}

fn words(step: &Step) -> Words {
    let mut details = Vec::new();
    let mut symbols = Vec::new();
    let title = match &step.made {
        Made::Formula(applied) => {
            details.push(equation(applied));
            symbols = symbols_of(applied);
            if !applied.from.is_empty() {
                details.push(format!("from {}", applied.from));
            }
            applied.title.clone()
        }
        Made::Arithmetic(operation) => operation.clone(),
        Made::Folded { folded, from } => {
            details.push(format!("from {from}"));
            folded_words(*folded)
        }
    };
    if !step.figures.is_empty() {
        details.push(step.figures.clone());
    }
    if let Some(entity) = &step.taken_for {
        details.push(format!("a mole of nothing in particular is taken for a mole of {entity}"));
    }
    Words { title, details, symbols, value: format!("= {}", step.value) }
}

fn equation(applied: &Applied) -> String {
    let equation = applied.formula.map_or_else(|| applied.card.doc.to_owned(), |formula| formula.text.to_owned());
    let symbols = applied.symbols_at.map_or_else(String::new, |step| format!(", symbols as in step {step}"));
    format!("{equation} [{}]{symbols}", applied.source)
}

/// Symbol, unit and meaning; of a card without an equation, its arguments.
fn symbols_of(applied: &Applied) -> Vec<[String; 3]> {
    if applied.symbols_at.is_some() {
        return Vec::new();
    }
    match applied.formula {
        Some(formula) => formula.symbols.iter().map(|s| [s.text, s.unit, s.meaning].map(ToOwned::to_owned)).collect(),
        None => arguments(applied.card),
    }
}

fn arguments(card: &Card) -> Vec<[String; 3]> {
    card.args.iter().map(|arg| [arg.name.to_owned(), String::new(), arg.doc.to_owned()]).collect()
}

fn folded_words(folded: Folded) -> String {
    let bound = if folded.at_least { "at least " } else { "" };
    let form = if folded.linear { "a sum of its inputs" } else { "its inputs to first order" };
    format!("{bound}{} steps of arithmetic, kept as {form}", grouped(folded.steps))
}

fn hidden_words(hidden: Hidden) -> String {
    let count = hidden.last + 1 - hidden.first;
    let steps = if count == 1 {
        format!("step {}", hidden.first)
    } else {
        format!("steps {} to {}", hidden.first, hidden.last)
    };
    let what = match (count - hidden.formulas, hidden.formulas) {
        (arithmetic, 0) => format!("{} of arithmetic", grouped(arithmetic as u64)),
        (0, formulas) => format!("{} calls of formulas", grouped(formulas as u64)),
        (arithmetic, formulas) => {
            format!("{} of arithmetic and {} calls of formulas", grouped(arithmetic as u64), grouped(formulas as u64))
        }
    };
    format!("… {steps} not shown: {what}")
}

/// Digits in groups of three, for counts.
fn grouped(count: u64) -> String {
    let digits = count.to_string();
    let mut out = String::with_capacity(digits.len() + digits.len() / 3);
    for (at, digit) in digits.chars().enumerate() {
        if at > 0 && (digits.len() - at).is_multiple_of(3) {
            out.push('\u{202f}'); // a narrow space that does not break
        }
        out.push(digit);
    }
    out
}

fn input_words(row: &InputRow) -> [String; 3] {
    let source = row.source.map(|number| format!("[{number}]"));
    let place = row.place.as_ref().map(|place| format!("typed at {place}"));
    let from = source.into_iter().chain(place).collect::<Vec<_>>().join(", ");
    [row.name.clone(), row.value.clone(), from]
}

fn more_inputs(derivation: &Derivation) -> Option<String> {
    let more = derivation.inputs_hidden;
    (more > 0).then(|| format!("… {} more inputs not shown", grouped(more as u64)))
}

fn title(derivation: &Derivation) -> String {
    format!("derivation of {}", Headline::of(&derivation.value).line())
}

fn padded(text: &str, width: usize) -> String {
    format!("{text}{}", " ".repeat(width.saturating_sub(text.chars().count())))
}

/// Rows in columns, as wide as their widest cell.
fn columns<const N: usize>(rows: &[[String; N]], indent: &str) -> String {
    let width = |column: usize| rows.iter().map(|row| row[column].chars().count()).max().unwrap_or(0);
    let widths: Vec<usize> = (0..N).map(width).collect();
    let mut out = String::new();
    for row in rows {
        let cells: Vec<String> = row.iter().zip(&widths).filter(|(_, w)| **w > 0).map(|(c, w)| padded(c, *w)).collect();
        out.push_str(&format!("{indent}{}", cells.join("  ")));
        out.truncate(out.trim_end().len());
        out.push('\n');
    }
    out
}

/// In text, HTML and LaTeX.
pub fn bundle(derivation: &Derivation) -> Bundle {
    Bundle::text(text(derivation)).with_text("text/html", html(derivation)).with_text("text/latex", latex(derivation))
}

/// For terminals, and for clients without HTML.
fn text(derivation: &Derivation) -> String {
    let mut out = format!("{}{}\n  inputs\n", title(derivation), text_parts::cautions(&derivation.cautions));
    let numbered = |row: &InputRow| {
        let [name, value, from] = input_words(row);
        [format!("i{}", row.number), name, value, from]
    };
    out.push_str(&columns(&derivation.inputs.iter().map(numbered).collect::<Vec<_>>(), "    "));
    if let Some(more) = more_inputs(derivation) {
        out.push_str(&format!("    {more}\n"));
    }
    if !derivation.lines.is_empty() {
        out.push_str("  steps\n");
    }
    for line in &derivation.lines {
        match line {
            Line::Hidden(hidden) => out.push_str(&format!("    {}\n", hidden_words(*hidden))),
            Line::Step(step) => out.push_str(&step_text(step)),
        }
    }
    if !derivation.sources.is_empty() {
        out.push_str("  sources\n");
    }
    for (number, source) in (1..).zip(&derivation.sources) {
        out.push_str(&format!("    [{number}] {source}\n"));
    }
    out.truncate(out.trim_end().len());
    out
}

fn step_text(step: &Step) -> String {
    let words = words(step);
    let place = step.place.as_ref().map_or_else(String::new, |place| format!(", at {place}"));
    let number = step.number.to_string();
    let indent = " ".repeat(6 + number.len());
    let mut out = format!("    {number}  {}{place}\n", words.title);
    for (at, detail) in words.details.iter().enumerate() {
        out.push_str(&format!("{indent}{detail}\n"));
        if at == 0 {
            out.push_str(&columns(&words.symbols, &format!("{indent}  ")));
        }
    }
    out.push_str(&format!("{indent}{}\n", words.value));
    out
}

/// For a notebook's page.
fn html(derivation: &Derivation) -> String {
    let cell = |text: &str| format!("<td style=\"text-align:left;vertical-align:top\">{}</td>", escaped(text));
    let mut out = String::from("<div class=\"hessbook-derivation\">");
    out.push_str(&format!("<p>derivation of {}</p>", html_parts::headline(&Headline::of(&derivation.value))));
    out.push_str(&html_parts::cautions(&derivation.cautions));
    out.push_str("<details><summary>Inputs</summary><table>");
    for row in &derivation.inputs {
        let [name, value, from] = input_words(row);
        out.push_str(&format!(
            "<tr>{}{}{}{}</tr>",
            cell(&format!("i{}", row.number)),
            cell(&name),
            cell(&value),
            cell(&from)
        ));
    }
    out.push_str("</table>");
    if let Some(more) = more_inputs(derivation) {
        out.push_str(&format!("<p>{}</p>", escaped(&more)));
    }
    out.push_str("</details><table>");
    for line in &derivation.lines {
        match line {
            Line::Hidden(hidden) => {
                out.push_str(&format!("<tr><td></td>{}<td></td></tr>", cell(&hidden_words(*hidden))))
            }
            Line::Step(step) => out.push_str(&step_html(step)),
        }
    }
    out.push_str("</table><details><summary>Sources</summary><ol>");
    for source in &derivation.sources {
        out.push_str(&format!("<li>{}</li>", escaped(&source.to_string())));
    }
    out.push_str("</ol></details></div>");
    out
}

fn step_html(step: &Step) -> String {
    let words = words(step);
    let cell = |content: &str| format!("<td style=\"text-align:left;vertical-align:top\">{content}</td>");
    let mut what = format!("<b>{}</b>", escaped(&words.title));
    for detail in &words.details {
        what.push_str(&format!("<br>{}", escaped(detail)));
    }
    what.push_str(&format!("<br>{}", escaped(&words.value)));
    if !words.symbols.is_empty() {
        what.push_str("<details><summary>Symbols</summary><table>");
        for [symbol, unit, meaning] in &words.symbols {
            let cells: String = [symbol, unit, meaning].iter().map(|text| cell(&escaped(text))).collect();
            what.push_str(&format!("<tr>{cells}</tr>"));
        }
        what.push_str("</table></details>");
    }
    let place = escaped(step.place.as_deref().unwrap_or(""));
    format!("<tr>{}{}{}</tr>", cell(&step.number.to_string()), cell(&what), cell(&place))
}

/// For papers: the steps as one array.
fn latex(derivation: &Derivation) -> String {
    let text = |text: &str| format!("\\text{{{}}}", latex_parts::escaped(text));
    let mut rows: Vec<String> = Vec::new();
    rows.extend(derivation.cautions.iter().map(|caution| format!(" & {}", text(&format!("Caution: {caution}")))));
    for row in &derivation.inputs {
        let [name, value, from] = input_words(row);
        let what = [name, value, from].into_iter().filter(|part| !part.is_empty()).collect::<Vec<_>>().join(", ");
        rows.push(format!("{} & {}", text(&format!("i{}", row.number)), text(&what)));
    }
    rows.extend(more_inputs(derivation).map(|more| format!(" & {}", text(&more))));
    for line in &derivation.lines {
        match line {
            Line::Hidden(hidden) => rows.push(format!(" & {}", text(&hidden_words(*hidden)))),
            Line::Step(step) => rows.extend(step_latex(step)),
        }
    }
    let sources = (1..).zip(&derivation.sources);
    rows.extend(
        sources.map(|(number, source)| format!("{} & {}", text(&format!("[{number}]")), text(&source.to_string()))),
    );
    format!("$$\\begin{{array}}{{rl}}\n{}\n\\end{{array}}$$", rows.join(" \\\\\n"))
}

fn step_latex(step: &Step) -> Vec<String> {
    let words = words(step);
    let text = |text: &str| format!("\\text{{{}}}", latex_parts::escaped(text));
    let place = step.place.as_ref().map_or_else(String::new, |place| format!(", at {place}"));
    let mut rows = vec![format!("{} & {}", step.number, text(&format!("{}{place}", words.title)))];
    let formula = if let Made::Formula(applied) = &step.made { applied.formula } else { None };
    rows.extend(formula.map(|formula| format!(" & {}", formula.latex)));
    let equations = usize::from(formula.is_some());
    rows.extend(words.details.iter().skip(equations).map(|detail| format!(" & {}", text(detail))));
    rows.push(format!(" & {}", text(&words.value)));
    rows
}
