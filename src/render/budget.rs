//! An uncertainty budget as a table, in text and HTML: one line per input, largest contribution first.
//!
//! Both forms are made from one list of cells, so that they cannot disagree.

use crate::model::budget::{Budget, Line, Origin};
use crate::model::card::Sources;
use crate::num::math;
use crate::quantity::round;
use crate::record::evaluation::Shape;
use crate::record::freedom::Freedom;
use crate::render::headline::Headline;
use crate::render::{Bundle, html};
use crate::units::{Unit, reader_text};

/// Names of the columns, and whether what stands in them is set to the right.
const COLUMNS: [(&str, bool); 9] = [
    ("input", false),
    ("value", true),
    ("u", true),
    ("sensitivity", true),
    ("contribution", true),
    ("share", true),
    ("dof", true),
    ("distribution", false),
    ("from", false),
];

type Row = [String; COLUMNS.len()];

/// The budget in text and HTML.
pub fn bundle(budget: &Budget) -> Bundle {
    let mut sources = Sources::default();
    let (title, rows, mut remarks) = (title(budget), rows(budget, &mut sources), remarks(budget));
    remarks.extend((1..).zip(sources.list()).map(|(number, source)| format!("[{number}] {source}")));
    Bundle::text(text(&title, &rows, &remarks)).with_text("text/html", markup(&title, &rows, &remarks))
}

/// A number with its unit for readers.
fn with_unit(number: &str, unit: &Unit) -> String {
    format!("{number} {}", reader_text(unit)).trim_end().to_owned()
}

fn title(budget: &Budget) -> String {
    if budget.logarithmic {
        let ln_k = math::ln(budget.value.si());
        let number =
            budget.u.filter(|u| *u > 0.0).map_or_else(|| round::fixed(ln_k, 3), |u| round::with_brackets(ln_k, u));
        return format!("uncertainty budget of ln K° = {number}");
    }
    format!("uncertainty budget of {}", Headline::of(&budget.value).line())
}

/// What two digits leave of a number that is an uncertainty or a part of one.
fn two_digits(x: f64) -> String {
    if x == 0.0 { "0".to_owned() } else { round::with_two_digits(x) }
}

fn contribution(budget: &Budget, x: f64) -> String {
    let number = two_digits(x);
    if budget.logarithmic { number } else { with_unit(&number, &budget.unit) }
}

fn percent(share: f64) -> String {
    match 100.0 * share {
        percent if percent.abs() >= 9.95 => format!("{percent:.0} %"),
        percent if percent.abs() >= 0.95 => format!("{percent:.1} %"),
        0.0 => "0 %".to_owned(),
        percent => format!("{} %", round::significant(percent, 1)),
    }
}

fn freedom(dof: Option<f64>) -> String {
    dof.map_or_else(String::new, |dof| round::shortest((10.0 * dof).round() / 10.0))
}

fn rows(budget: &Budget, sources: &mut Sources) -> Vec<Row> {
    let mut rows: Vec<Row> = budget.lines.iter().map(|line| row(budget, line, sources)).collect();
    for pair in &budget.correlated {
        let mut cells = Row::default();
        cells[0] = format!("correlation of {} and {}", pair.a, pair.b);
        cells[1] = format!("r = {:.3}", pair.r);
        cells[5] = percent(pair.share);
        rows.push(cells);
    }
    rows.extend(budget.silent.iter().map(|line| row(budget, line, sources)));
    rows
}

fn row(budget: &Budget, line: &Line, sources: &mut Sources) -> Row {
    let unstated = if line.chosen { "chosen" } else { "not stated" };
    let u = line.u.map_or_else(|| unstated.to_owned(), |u| with_unit(&two_digits(u), &line.difference_unit));
    let value = line.unit.from_si(line.leaf.si());
    let digit = line.leaf.input().and_then(|input| input.digit).map(|digit| digit / line.difference_unit.factor);
    let value = match (line.u, digit) {
        (Some(u), _) if u > 0.0 => round::fixed(value, round::decimals_for(u)),
        (_, Some(digit)) => round::fixed(value, round::decimals_of_digit(digit)),
        _ => round::significant(value, 6),
    };
    let output = if budget.logarithmic { String::new() } else { reader_text(&budget.unit) };
    let input = reader_text(&line.difference_unit);
    let slope = round::significant(line.sensitivity, 3);
    let sensitivity = match (output.is_empty(), input.is_empty()) {
        _ if output == input => slope,
        (true, false) => format!("{slope} per {input}"),
        (false, true) => format!("{slope} {output}"),
        _ => format!("{slope} {output} per {input}"),
    };
    let stated = line.u.is_some();
    let shape = match (line.shape, line.dof) {
        (Shape::Normal, Some(_)) => "t",
        (shape, _) => shape.word(),
    };
    [
        line.name.clone(),
        with_unit(&value, &line.unit),
        u,
        sensitivity,
        if stated { contribution(budget, line.contribution) } else { String::new() },
        if stated { percent(line.share) } else { String::new() },
        freedom(line.dof),
        if stated { shape.to_owned() } else { String::new() },
        match &line.source {
            Origin::Published(citation) => format!("[{}]", sources.number(citation)),
            Origin::Here(words) => words.clone(),
        },
    ]
}

fn remarks(budget: &Budget) -> Vec<String> {
    let mut remarks = Vec::new();
    match budget.u {
        Some(u) => {
            let scope = if budget.silent.iter().all(|line| line.chosen) { "" } else { ", of the stated part alone" };
            remarks.push(format!("combined standard uncertainty u = {}{scope}", contribution(budget, u)));
        }
        None => remarks.push("no input states an uncertainty".to_owned()),
    }
    match &budget.freedom {
        Freedom::Unlimited => {}
        Freedom::Effective(dof) => remarks.push(format!("{} effective degrees of freedom", freedom(Some(*dof)))),
        Freedom::Correlated { a, b, .. } => {
            remarks.push(format!("no effective degrees of freedom: {a} and {b} are correlated"));
        }
    }
    remarks
}

fn text(title: &str, rows: &[Row], remarks: &[String]) -> String {
    let header: Row = COLUMNS.map(|(name, _)| name.to_owned());
    let all: Vec<&Row> = std::iter::once(&header).chain(rows).collect();
    let width = |column: usize| all.iter().map(|row| row[column].chars().count()).max().unwrap_or(0);
    let widths: Vec<usize> = (0..COLUMNS.len()).map(width).collect();
    let mut out = format!("{title}\n");
    for row in all.iter().filter(|_| !rows.is_empty()) {
        let mut line = String::new();
        for ((cell, width), (_, right)) in row.iter().zip(&widths).zip(COLUMNS) {
            let space = " ".repeat(width - cell.chars().count());
            let aligned = if right { format!("{space}{cell}") } else { format!("{cell}{space}") };
            line.push_str(&format!("  {aligned}"));
        }
        out.push_str(line.trim_end());
        out.push('\n');
    }
    for remark in remarks {
        out.push_str(&format!("  {remark}\n"));
    }
    out.truncate(out.trim_end().len());
    out
}

fn markup(title: &str, rows: &[Row], remarks: &[String]) -> String {
    let cells = |tag: &str, row: &Row| {
        let cell = |(cell, (_, right)): (&String, (&str, bool))| {
            let cell = html::escaped(cell);
            // Numbers are set to the right, and only they have minus signs.
            match right {
                true => format!("<{tag} style=\"text-align:right\">{}</{tag}>", cell.replace('-', "−")),
                false => format!("<{tag} style=\"text-align:left\">{cell}</{tag}>"),
            }
        };
        let name = html::escaped(&row[0]);
        let rest: String = row.iter().zip(COLUMNS).skip(1).map(cell).collect();
        format!("<tr><{tag} style=\"text-align:left\">{name}</{tag}>{rest}</tr>")
    };
    let header: Row = COLUMNS.map(|(name, _)| name.to_owned());
    let mut out = format!("<p>{}</p>", html::escaped(title));
    if !rows.is_empty() {
        let body: String = rows.iter().map(|row| cells("td", row)).collect();
        out.push_str(&format!("<table><thead>{}</thead><tbody>{body}</tbody></table>", cells("th", &header)));
    }
    for remark in remarks {
        out.push_str(&format!("<p>{}</p>", html::escaped(remark)));
    }
    out
}
