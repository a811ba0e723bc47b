//! A curve as people see it: what it is, a picture, and its first and last rows with their uncertainties.
//!
//! The surprise: an equilibrium constant stands beside its lg K°, where its uncertainty is symmetric and a curve can be read.

use std::sync::Arc;

use crate::model::card::Value;
use crate::model::curve::Curve;
use crate::num::math;
use crate::quantity::round;
use crate::render::Bundle;
use crate::render::headline::Headline;
use crate::render::html::escaped;
use crate::render::plot::curve::{self as plot, Axis, Picture};
use crate::units::{self, Unit, What};

/// Rows shown at either end of a curve that is too long to be shown whole.
const ENDS: usize = 4;
/// Rows up to which a curve is shown whole.
const WHOLE: usize = 12;

/// Characters that the legend of a picture has room for.
const NAME: usize = 20;

/// Pieces of the temperature axis of which a picture shows the lowest and the highest value: as many as it has pixels.
const PIECES: usize = 480;

/// A curve in text, HTML and as a picture.
pub fn bundle(curve: &Curve) -> Bundle {
    let table = Table::of(curve);
    let picture = picture(curve, &table);
    let page = format!("<div class=\"hessbook-curve\">{}{picture}</div>", html(&table));
    Bundle::text(text(&table)).with_text("text/html", page).with_text("image/svg+xml", picture)
}

/// The values against temperature; of an equilibrium constant lg K°, since K° itself would hug one axis.
fn picture(curve: &Curve, table: &Table) -> String {
    let (x_unit, y_unit) = (Arc::clone(curve.grid().unit()), curve.unit());
    let is_constant = curve.kind().what == What::K;
    let y_of = |si: f64| if is_constant { math::log10(si) } else { y_unit.from_si(si) };
    let point = |row: usize| (x_unit.from_si(curve.grid().points_k()[row]), y_of(curve.numbers()[row]));
    let label = if is_constant { table.heads.last() } else { table.heads.get(1) };
    plot::svg(&Picture {
        title: table.title(),
        x: Axis { label: table.heads[0].clone(), limits: None },
        y: Axis { label: label.cloned().unwrap_or_default(), limits: None },
        curves: vec![plot::Curve { name: table.name(), points: seen(curve).into_iter().map(point).collect() }],
        band: None,
    })
}

/// The rows that a picture shows: all, or of each piece of the axis the lowest and the highest, and the ends.
fn seen(curve: &Curve) -> Vec<usize> {
    let (numbers, count) = (curve.numbers(), curve.len());
    if count <= 4 * PIECES {
        return (0..count).collect();
    }
    let mut rows = vec![0, count - 1];
    for piece in 0..PIECES {
        let range = piece * count / PIECES..(piece + 1) * count / PIECES;
        let by_size = |a: &usize, b: &usize| numbers[*a].total_cmp(&numbers[*b]);
        rows.extend(range.clone().min_by(by_size).into_iter().chain(range.max_by(by_size)));
    }
    rows.sort_unstable();
    rows.dedup();
    rows
}

/// What text and HTML are made of.
struct Table {
    /// `ΔrH°`; empty where the curve is of nothing with a symbol.
    symbol: String,
    /// What is not known, and per mole of what.
    remarks: Vec<String>,
    /// The reactions and substances the curve was computed from.
    of: Vec<String>,
    extent: String,
    heads: Vec<String>,
    /// `None` where rows were left out.
    rows: Vec<Option<Vec<String>>>,
    left_out: usize,
}

impl Table {
    fn of(curve: &Curve) -> Table {
        let count = curve.len();
        let shown: Vec<usize> =
            if count <= WHOLE { (0..count).collect() } else { (0..ENDS).chain(count - ENDS..count).collect() };
        let is_constant = curve.kind().what == What::K;
        let (mut symbol, mut caveat, mut basis) = (symbol_of(curve), None, None);
        let mut rows = Vec::new();
        for (nth, &row) in shown.iter().enumerate() {
            if nth > 0 && row != shown[nth - 1] + 1 {
                rows.push(None);
            }
            let Ok(value) = curve.row(row) else { continue };
            let headline = Headline::of(&value);
            let mut cells = vec![temperature(curve, row), headline.number.clone()];
            cells.extend(headline.logarithm.as_ref().map(|logarithm| logarithm.lg.clone()));
            rows.push(Some(cells));
            caveat = caveat.or(headline.caveat);
            basis = basis.or(headline.basis);
        }
        let x = labelled("T", curve.grid().unit());
        if symbol.is_empty() && is_constant {
            symbol = What::K.symbol().to_owned();
        }
        let y = labelled(if symbol.is_empty() { "value" } else { &symbol }, &curve.unit());
        let mut heads = vec![x, y];
        if is_constant {
            heads.push("lg K°".to_owned());
        }
        let mut of: Vec<String> = Vec::new();
        for call in curve.calls() {
            let text = call.terms().map(|terms| terms.text().to_owned());
            of.extend(text.filter(|text| !of.contains(text)));
        }
        let left_out = count - shown.len();
        Table {
            symbol,
            remarks: caveat.into_iter().chain(basis).collect(),
            of,
            extent: curve.grid().words(),
            heads,
            rows,
            left_out,
        }
    }

    /// What the line of the picture is called: the reaction or substance where there is one, else the symbol.
    fn name(&self) -> String {
        match self.of.as_slice() {
            [only] if only.chars().count() <= NAME => only.clone(),
            _ if self.symbol.is_empty() => "the curve".to_owned(),
            _ => self.symbol.clone(),
        }
    }

    fn title(&self) -> String {
        let symbol = if self.symbol.is_empty() { "a curve" } else { &self.symbol };
        std::iter::once(format!("{symbol} at {}", self.extent))
            .chain(self.remarks.iter().cloned())
            .collect::<Vec<_>>()
            .join(", ")
    }
}

/// The symbol of every row: `ΔrH°`. An increment names its own temperature, which in a curve is any.
pub fn symbol_of(curve: &Curve) -> String {
    let Ok(first) = curve.row(0) else { return String::new() };
    let symbol = Headline::of(&first).symbol;
    let is_increment =
        curve.call().is_some_and(|call| matches!(call.args.get(2), Some(Value::Quantity(_) | Value::Nothing)));
    match (is_increment, symbol.split_once('('), symbol.split_once(')')) {
        (true, Some((before, _)), Some((_, after))) => format!("{before}(T){after}"),
        _ => symbol,
    }
}

/// `T / K`, after the IUPAC Green Book, 3rd ed., section 1.3 (from memory): quantity divided by unit is a number.
pub fn labelled(symbol: &str, unit: &Unit) -> String {
    let unit = units::reader_text(unit);
    let symbol = if symbol.contains(' ') { format!("[{symbol}]") } else { symbol.to_owned() };
    match unit.as_str() {
        "" => symbol,
        unit if unit.contains(['/', ' ']) => format!("{symbol} / ({unit})"),
        unit => format!("{symbol} / {unit}"),
    }
}

fn temperature(curve: &Curve, row: usize) -> String {
    let number = curve.grid().unit().from_si(curve.grid().points_k()[row]);
    // Ten digits: past them there is the rounding of scales alone.
    round::shortest(round::significant(number, 10).parse().unwrap_or(number))
}

fn text(table: &Table) -> String {
    let mut out = format!("{}\n", table.title());
    if !table.of.is_empty() {
        out.push_str(&format!("  of {}\n", table.of.join("; ")));
    }
    let width = |column: usize| {
        let cells = table.rows.iter().flatten().filter_map(|row| row.get(column));
        cells.chain(&table.heads[column..=column]).map(|cell| cell.chars().count()).max().unwrap_or(0)
    };
    let widths: Vec<usize> = (0..table.heads.len()).map(width).collect();
    let mut line = |cells: &[String]| {
        let padded = cells.iter().zip(&widths).map(|(cell, width)| {
            let missing = width.saturating_sub(cell.chars().count());
            format!("  {}{cell}", " ".repeat(missing))
        });
        out.push_str(padded.collect::<String>().trim_end());
        out.push('\n');
    };
    line(&table.heads);
    for row in &table.rows {
        match row {
            Some(cells) => line(cells),
            None => line(&["…".to_owned()]),
        }
    }
    out.truncate(out.trim_end().len());
    out
}

fn html(table: &Table) -> String {
    let mut out = format!("<p>{}</p>", escaped(&table.title()));
    if !table.of.is_empty() {
        out = format!("<p>{}<br>of {}</p>", escaped(&table.title()), escaped(&table.of.join("; ")));
    }
    out.push_str("<table><thead><tr>");
    for head in &table.heads {
        out.push_str(&format!("<th style=\"text-align:right\">{}</th>", escaped(head)));
    }
    out.push_str("</tr></thead><tbody>");
    for row in &table.rows {
        out.push_str("<tr>");
        match row {
            Some(cells) => {
                for cell in cells {
                    let cell = escaped(cell).replace('-', "−");
                    out.push_str(&format!("<td style=\"text-align:right;white-space:nowrap\">{cell}</td>"));
                }
            }
            None => out.push_str(&format!(
                "<td colspan=\"{}\" style=\"text-align:center\">… {} more</td>",
                table.heads.len(),
                table.left_out
            )),
        }
        out.push_str("</tr>");
    }
    out.push_str("</tbody></table>");
    out
}
