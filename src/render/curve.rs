//! A curve as people see it: what it is, a picture, and its first and last rows with their uncertainties.
//!
//! The surprise: an equilibrium constant stands beside its lg K°, where its uncertainty is symmetric and a curve can be read.

use std::sync::Arc;

use crate::model::card::Value;
use crate::model::curve::Curve;
use crate::num::math;
use crate::quantity::{Quantity, round};
use crate::render::Bundle;
use crate::render::cells::Cells;
use crate::render::headline::Headline;
use crate::render::plot::curve::{self as plot, Axis, Picture};
use crate::units::{self, Unit, What};

/// Characters that the legend of a picture has room for.
const NAME: usize = 20;

/// Pieces of the temperature axis of which a picture shows the lowest and the highest value: as many as it has pixels.
const PIECES: usize = 480;

/// A curve in text, HTML and as a picture.
pub fn bundle(curve: &Curve) -> Bundle {
    let cells = cells(curve);
    let picture = picture(curve, &cells);
    let page = format!("<div class=\"hessbook-curve\">{}{picture}</div>", cells.html());
    Bundle::text(cells.text()).with_text("text/html", page).with_text("image/svg+xml", picture)
}

fn cells(curve: &Curve) -> Cells {
    let rows: Vec<Quantity> = [0, curve.len() - 1].into_iter().filter_map(|row| curve.row(row).ok()).collect();
    let ends: Vec<Headline> = rows.iter().map(Headline::of).collect();
    // At 298.15 K fewer inputs are silent than elsewhere; what holds for one end is said of the curve.
    let remark = |pick: fn(&Headline) -> &Option<String>| ends.iter().rev().find_map(|end| pick(end).clone());
    let (caveat, basis) = (remark(|end| &end.caveat), remark(|end| &end.basis));
    let (symbol, is_constant) = (symbol_of(curve), curve.kind().what == What::K);
    let first = if symbol.is_empty() { "a curve" } else { &symbol };
    let title = std::iter::once(format!("{first} at {}", curve.grid().words())).chain(caveat).chain(basis);
    let y = if symbol.is_empty() { "value" } else { &symbol };
    let mut heads = vec![labelled("T", curve.grid().unit()), labelled(y, &curve.unit())];
    if is_constant {
        heads.push("lg K°".to_owned());
    }
    let of = about(curve);
    let lines = if of.is_empty() { Vec::new() } else { vec![format!("of {}", of.join("; "))] };
    let title = title.collect::<Vec<_>>().join(", ");
    let mut cells = Cells { title, lines, heads, rows: Vec::new(), left_out: 0 };
    cells.fill(curve.len(), |row| {
        let mut cells = vec![number(curve.grid().unit(), curve.grid().points_k()[row])];
        if let Ok(value) = curve.row(row) {
            let headline = Headline::of(&value);
            cells.push(headline.number);
            cells.extend(headline.logarithm.map(|logarithm| logarithm.lg));
        }
        cells
    });
    cells
}

/// The reactions and substances, or the file, that a curve comes from.
pub fn about(curve: &Curve) -> Vec<String> {
    let mut of: Vec<String> = Vec::new();
    for call in curve.calls() {
        let text = call.terms().map(|terms| terms.text().to_owned());
        of.extend(text.filter(|text| !of.contains(text)));
    }
    of.extend(curve.column().map(|column| column.citation().to_string()));
    of
}

/// The symbol of every row: `ΔrH°`, or the name of a measured column. An increment names its own temperature, which in a
/// curve is any.
pub fn symbol_of(curve: &Curve) -> String {
    if let Some(column) = curve.column() {
        return column.name.to_string();
    }
    let Ok(first) = curve.row(0) else { return String::new() };
    let symbol = Headline::of(&first).symbol;
    let is_increment =
        curve.call().is_some_and(|call| matches!(call.args.get(2), Some(Value::Quantity(_) | Value::Nothing)));
    match (is_increment, symbol.split_once('('), symbol.split_once(')')) {
        (true, Some((before, _)), Some((_, after))) => format!("{before}(T){after}"),
        _ if symbol.is_empty() && curve.kind().what == What::K => What::K.symbol().to_owned(),
        _ => symbol,
    }
}

/// `T / K`, after the IUPAC Green Book, 3rd ed., section 1.3 (from memory): quantity divided by unit is a number.
pub fn labelled(symbol: &str, unit: &Unit) -> String {
    let symbol = if symbol.contains(" - ") { format!("[{symbol}]") } else { symbol.to_owned() };
    match units::reader_text(unit).as_str() {
        "" => symbol,
        unit if unit.contains(['/', ' ']) => format!("{symbol} / ({unit})"),
        unit => format!("{symbol} / {unit}"),
    }
}

/// A number in a unit with ten digits: past them there is the rounding of scales alone.
pub fn number(unit: &Unit, si: f64) -> String {
    let number = unit.from_si(si);
    round::shortest(round::significant(number, 10).parse().unwrap_or(number))
}

/// The values against temperature; of an equilibrium constant lg K°, since K° itself would hug one axis.
fn picture(curve: &Curve, cells: &Cells) -> String {
    let (x_unit, y_unit) = (Arc::clone(curve.grid().unit()), curve.unit());
    let is_constant = curve.kind().what == What::K;
    let y_of = |si: f64| if is_constant { math::log10(si) } else { y_unit.from_si(si) };
    let point = |row: usize| (x_unit.from_si(curve.grid().points_k()[row]), y_of(curve.numbers()[row]));
    let label = if is_constant { cells.heads.last() } else { cells.heads.get(1) };
    plot::svg(&Picture {
        title: cells.title.clone(),
        x: Axis { label: cells.heads[0].clone(), limits: None },
        y: Axis { label: label.cloned().unwrap_or_default(), limits: None },
        curves: vec![plot::Curve { name: name(curve), points: seen(curve).into_iter().map(point).collect() }],
        band: None,
    })
}

/// What the line of the picture is called: the reaction or substance where it is short, else the symbol.
fn name(curve: &Curve) -> String {
    match (about(curve).as_slice(), symbol_of(curve)) {
        ([only], _) if only.chars().count() <= NAME => only.clone(),
        (_, symbol) if symbol.is_empty() || symbol.chars().count() > NAME => "the curve".to_owned(),
        (_, symbol) => symbol,
    }
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
