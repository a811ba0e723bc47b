//! What is asked of a table: its columns as values, and a column over temperatures as a curve.

use std::rc::Rc;

use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::curve::Curve;
use crate::model::grid::Grid;
use crate::model::table::Table;

fn table_of(call: &Call) -> &Rc<Table> {
    match call.args.first() {
        Some(Value::Table(table)) => table,
        _ => unreachable!("{} is asked of a table", call.card.id),
    }
}

macro_rules! table_card {
    ($name:ident, $id:literal, $script:literal, $args:expr, $gives:literal, $doc:literal, $example:literal, $run:expr) => {
        pub static $name: Card = Card {
            id: $id,
            name: $script,
            on: On::Table,
            args: $args,
            gives: $gives,
            doc: $doc,
            source: "definition",
            example: concat!("read_csv(\"cp.csv\").", $example),
            claims: &[],
            alternatives: &[],
            run: $run,
            check_line: None,
            caution: None,
        };
    };
}

const NAME: Arg =
    Arg { name: "name", takes: Takes::Text, default: Default::Required, doc: "the name of a column, without its unit" };

table_card!(
    COLUMNS,
    "table.columns",
    "columns",
    &[],
    "the names of the columns, as a list",
    "Lists the columns of a table; those that hold uncertainties are part of the ones they belong to.",
    "columns()",
    |_, call| {
        let names = table_of(call).columns().iter().map(|column| Value::Text(Rc::clone(&column.name)));
        Ok(Value::List(names.collect()))
    }
);

table_card!(
    COLUMN,
    "table.column",
    "column",
    &[NAME],
    "the figures of the column, as a list, each with its unit, uncertainty and source",
    "Takes the figures of one column. They are inputs that are independent of each other.",
    "column(\"Cp\")",
    |cx, call| {
        let column = table_of(call).column(call.text(1))?;
        let rows = (0..column.len()).map(|row| match (cx.halted)() {
            Some(halt) => Err(halt),
            None => Ok(Value::Quantity(column.value(row))),
        });
        Ok(Value::List(rows.collect::<Result<_, Fault>>()?))
    }
);

table_card!(
    CURVE,
    "table.curve",
    "curve",
    &[
        Arg {
            name: "y",
            takes: Takes::Text,
            default: Default::Absent,
            doc: "the column of values; may be left out where there is only one"
        },
        Arg {
            name: "x",
            takes: Takes::Text,
            default: Default::Absent,
            doc: "the column of temperatures, which ascend; the first column unless given"
        },
    ],
    "a curve over the temperatures of the table, with values at them only",
    "Makes a curve of two columns of a table.",
    "curve(\"Cp\")",
    curve
);

fn curve(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let table = table_of(call);
    let named = |at: usize| match &call.args[at] {
        Value::Text(name) => Some(&**name),
        _ => None,
    };
    let x = match named(2) {
        Some(name) => table.column(name)?,
        None => &table.columns()[0],
    };
    let y = match named(1) {
        Some(name) => table.column(name)?,
        None => table.only_besides(x)?,
    };
    x.ascends()?;
    Ok(Value::Curve(Rc::new(Curve::measured(cx, Rc::new(Grid::column(x)), Rc::clone(y))?)))
}
