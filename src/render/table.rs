//! A table of figures as people see it, in text and HTML.

use crate::model::table::Table;
use crate::render::Bundle;
use crate::render::cells::Cells;
use crate::render::curve::{labelled, number};

/// A table with its first and last rows; uncertainties stand in brackets behind the figures.
pub fn bundle(table: &Table) -> Bundle {
    let rows = table.rows();
    let count = if rows == 1 { "1 row".to_owned() } else { format!("{rows} rows") };
    let mut cells = Cells {
        title: format!("{}, {count}", table.name),
        lines: table.remarks.clone(),
        heads: table.columns().iter().map(|column| labelled(&column.name, &column.unit)).collect(),
        rows: Vec::new(),
        left_out: 0,
    };
    cells.fill(rows, |row| {
        let shown = table.columns().iter().map(|column| match column.uncertainties()[row] {
            Some(_) => column.value(row).shown().number,
            None => number(&column.unit, column.numbers()[row]),
        });
        shown.collect()
    });
    Bundle::text(cells.text()).with_text("text/html", cells.html())
}
