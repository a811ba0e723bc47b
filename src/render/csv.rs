//! Curves as comma-separated values that read back: names and units in the first line, uncertainties beside the values.
//!
//! Units stand in their machine text, which says what moles are of. Numbers have all digits, in the unit of the column. The
//! surprise: how the rows are correlated is lost in a file, and the file says so.

use std::rc::Rc;
use std::sync::Arc;

use crate::fault::Fault;
use crate::model::card::Cx;
use crate::model::curve::Curve;
use crate::model::table::{REMARK, SOURCE};
use crate::quantity::round;
use crate::record::node;
use crate::render::curve::about;
use crate::render::headline::Headline;
use crate::units::Unit;

/// Rows between two looks whether the work must end.
const PATIENCE: usize = 1024;

/// Of each row, in SI units, where it is stated.
type Uncertainties = Rc<[Option<f64>]>;

/// Curves over one grid, each with the name of its column.
///
/// # Errors
/// The work is told to end.
pub fn curves(cx: &Cx, named: &[(String, Rc<Curve>)]) -> Result<String, Fault> {
    let Some((_, first)) = named.first() else { return Ok(String::new()) };
    let grid = first.grid();
    let mut heads = vec![divided("T", &grid.unit().text)];
    let (mut remarks, mut sources): (Vec<String>, Vec<String>) = Default::default();
    let mut columns: Vec<(&Curve, Arc<Unit>, Option<Uncertainties>)> = Vec::new();
    for (name, curve) in named {
        let unit = curve.unit();
        heads.push(divided(name, &unit.text));
        let u = curve.uncertainties(cx)?;
        // Nothing stated and nothing uncertain are both told apart from a column of figures.
        let u = u.iter().any(|u| u.is_some_and(|u| u > 0.0)).then_some(u);
        if u.is_some() {
            heads.push(divided(&format!("u({name})"), &unit.text));
        }
        let last = curve.row(curve.len() - 1)?;
        let said = Headline::of(&last);
        let words = said.caveat.into_iter().chain(said.basis).collect::<Vec<_>>().join(", ");
        let of = about(curve).join("; ");
        remarks.push(format!("{name}: {}", if words.is_empty() { of } else { format!("{of}; {words}") }));
        for row in [0, curve.len() - 1] {
            for node in node::history(curve.row(row)?.node()) {
                let source = node.input().and_then(|input| input.citation.as_ref()).map(ToString::to_string);
                sources.extend(source.filter(|source| !sources.contains(source)));
            }
        }
        columns.push((curve, unit, u));
    }
    if columns.iter().any(|(_, _, u)| u.is_some()) {
        remarks.push(
            "u is a standard uncertainty; rows rest on the same inputs, and how they are correlated is not said here"
                .to_owned(),
        );
    }
    let mut out = String::new();
    for remark in remarks {
        out.push_str(&format!("{REMARK} {}\n", remark.replace('\n', " ")));
    }
    for source in sources {
        out.push_str(&format!("{REMARK} {SOURCE} {}\n", source.replace('\n', " ")));
    }
    let mut rows = csv::Writer::from_writer(out.into_bytes());
    let mut line = |cells: &[String]| {
        rows.write_record(cells).unwrap_or_else(|error| unreachable!("memory takes every row of one width: {error}"));
    };
    line(&heads);
    for (row, t_k) in grid.points_k().iter().enumerate() {
        if row % PATIENCE == 0
            && let Some(halt) = (cx.halted)()
        {
            return Err(halt);
        }
        let mut cells = vec![written(grid.unit(), *t_k)];
        for (curve, unit, u) in &columns {
            cells.push(written(unit, curve.numbers()[row]));
            if let Some(u) = u {
                cells.push(u[row].map_or_else(String::new, |u| round::shortest(u / unit.factor.abs())));
            }
        }
        line(&cells);
    }
    let bytes = rows.into_inner().unwrap_or_else(|error| unreachable!("memory takes every row: {error}"));
    Ok(String::from_utf8(bytes).unwrap_or_else(|error| unreachable!("it was made of texts: {error}")))
}

/// A number in its unit, with as few digits as read back to the same SI value, and at least one that reads back to the
/// same number.
fn written(unit: &Unit, si: f64) -> String {
    let number = unit.from_si(si);
    let fewer = (15..17).map(|digits| round::significant(number, digits));
    let read = |text: &String| text.parse().is_ok_and(|number| unit.to_si(number).to_bits() == si.to_bits());
    fewer
        .filter(read)
        .map(|text| text.parse().map_or(text, round::shortest))
        .next()
        .unwrap_or_else(|| round::shortest(number))
}

/// Name and unit of a column, as [`crate::model::table`] reads them.
fn divided(name: &str, unit: &str) -> String {
    if unit.contains(['/', ' ']) { format!("{name} / ({unit})") } else { format!("{name} / {unit}") }
}
