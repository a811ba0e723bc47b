//! What is asked of a curve: its points and values, one value, the lowest and the highest, where it crosses a level.
//!
//! T* with y(T*) = y₀;   ∂T*/∂pᵢ = −(∂y/∂pᵢ)/(∂y/∂T) at T*
//!
//! | symbol | unit        | meaning                                        |
//! |--------|-------------|------------------------------------------------|
//! | y      | the curve's | the curve less the level, as a function of T   |
//! | y₀     | the curve's | the level                                      |
//! | T*     | K           | where they cross                               |
//! | pᵢ     | its own     | an input of the curve or the level             |
//!
//! Neighbouring points of unlike sign enclose a crossing, which is bisected by the formula itself to neighbouring numbers; a
//! curve that comes back within one step of the grid is not seen. The surprise: where a curve jumps across the level, as at a
//! transition, the temperature of the jump is the crossing, and no derivative gives it an uncertainty.
//! Source: derivative of an implicit function; JCGM 100:2008, clause 5.

use std::rc::Rc;

use smallvec::{SmallVec, smallvec};

use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::curve::{Arithmetic, Curve, Side};
use crate::model::property;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey, Node};
use crate::units::{Base, Dimension, Kind, What, parse as unit_parse};

fn curve_of(call: &Call) -> &Rc<Curve> {
    match call.args.first() {
        Some(Value::Curve(curve)) => curve,
        _ => unreachable!("{} is asked of a curve", call.card.id),
    }
}

/// Rows between two looks whether the work must end.
const PATIENCE: usize = 1024;

/// A list with one value for each row.
fn list(cx: &Cx, curve: &Curve, each: impl Fn(usize) -> Result<Value, Fault>) -> Result<Value, Fault> {
    let rows = (0..curve.len()).map(|row| match (cx.halted)() {
        Some(halt) if row % PATIENCE == 0 => Err(halt),
        _ => each(row),
    });
    Ok(Value::List(rows.collect::<Result<_, Fault>>()?))
}

macro_rules! curve_card {
    ($name:ident, $id:literal, $script:literal, $args:expr, $gives:literal, $doc:literal, $example:literal, $run:expr) => {
        pub static $name: Card = Card {
            id: $id,
            name: $script,
            on: On::Curve,
            args: $args,
            gives: $gives,
            doc: $doc,
            source: SOURCE,
            example: concat!("reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\").", $example),
            claims: &[],
            alternatives: &[],
            run: $run,
            check_line: None,
            caution: None,
        };
    };
}

const SOURCE: &str = "definition; crossings by the derivative of an implicit function, JCGM 100:2008, clause 5";

const UNIT: Arg = Arg {
    name: "unit",
    takes: Takes::Text,
    default: Default::Required,
    doc: "a unit of the curve's dimension, such as \"kcal_th/mol\"; an open mole takes the curve's own basis",
};

curve_card!(
    X,
    "curve.x",
    "x",
    &[],
    "the temperatures of the grid, as a list",
    "Lists the temperatures at which a curve was computed or measured.",
    "enthalpy(grid(\"300 K\", \"400 K\", 3)).x()",
    |cx, call| {
        let curve = curve_of(call);
        list(cx, curve, |row| Ok(Value::Quantity(curve.grid().point(row))))
    }
);

curve_card!(
    Y,
    "curve.y",
    "y",
    &[],
    "the values of the curve, as a list; each is what the single call gives",
    "Lists the values of a curve with their inputs. For bare numbers there is `value(unit)`, which costs less.",
    "enthalpy(grid(\"300 K\", \"400 K\", 3)).y()",
    |cx, call| {
        let curve = curve_of(call);
        list(cx, curve, |row| Ok(Value::Quantity(curve.row(row)?)))
    }
);

curve_card!(
    AT,
    "curve.at",
    "at",
    &[Arg {
        name: "T",
        takes: Takes::Temperature,
        default: Default::Required,
        doc: "a temperature between the ends of the grid"
    }],
    "the value at that temperature",
    "The value at one temperature. Between two points of the grid the formula is asked anew; nothing is interpolated, and a \
     measured curve has values at its points only.",
    "enthalpy(grid(\"300 K\", \"400 K\", 3)).at(\"310 K\")",
    |_, call| Ok(Value::Quantity(curve_of(call).at(call.quantity(1))?))
);

curve_card!(
    TO,
    "curve.to",
    "to",
    &[UNIT],
    "the same curve, shown in that unit",
    "Shows a curve in another unit. Nothing is rounded.",
    "enthalpy(grid(\"300 K\", \"400 K\", 3)).to(\"kcal_th/mol\")",
    |_, call| Ok(Value::Curve(Rc::new(curve_of(call).to(unit_parse::unit(call.text(1))?)?)))
);

curve_card!(
    VALUES,
    "curve.value",
    "value",
    &[UNIT],
    "the bare numbers in that unit, as a list",
    "The numbers of a curve in a unit. What is computed with them further carries no unit, basis, uncertainty or source.",
    "enthalpy(grid(\"300 K\", \"400 K\", 3)).value(\"kJ/mol\")",
    |cx, call| {
        let curve = curve_of(call).to(unit_parse::unit(call.text(1))?)?;
        let unit = curve.unit();
        list(cx, &curve, |row| Ok(Value::Number(unit.from_si(curve.numbers()[row]))))
    }
);

curve_card!(
    UNCERTAINTIES,
    "curve.uncertainty",
    "uncertainty",
    &[UNIT],
    "the standard uncertainties as bare numbers in that unit, as a list; nothing where none is stated",
    "Standard uncertainty of each row by linear propagation with correlation. Where some inputs state none, it covers the \
     others only.",
    "enthalpy(grid(\"300 K\", \"400 K\", 3)).uncertainty(\"kJ/mol\")",
    |cx, call| {
        let curve = curve_of(call).to(unit_parse::unit(call.text(1))?)?;
        let (all, scale) = (curve.uncertainties(cx)?, curve.unit().factor.abs());
        list(cx, &curve, |row| Ok(all[row].map_or(Value::Nothing, |u| Value::Number(u / scale))))
    }
);

/// A row as a map of its temperature and its value.
fn point(curve: &Curve, row: usize) -> Result<Value, Fault> {
    let both = [("x", curve.grid().point(row)), ("y", curve.row(row)?)];
    Ok(Value::Options(Rc::new(both.map(|(name, value)| (name.to_owned(), Value::Quantity(value))).into())))
}

curve_card!(
    MIN,
    "curve.min",
    "min",
    &[],
    "a map: `y`, the lowest value among the rows, and `x`, its temperature",
    "Finds the row with the lowest value, the first of several.",
    "gibbs_energy(grid(\"300 K\", \"400 K\", 3)).min()",
    |_, call| point(curve_of(call), curve_of(call).extremes().0)
);

curve_card!(
    MAX,
    "curve.max",
    "max",
    &[],
    "a map: `y`, the highest value among the rows, and `x`, its temperature",
    "Finds the row with the highest value, the first of several.",
    "gibbs_energy(grid(\"300 K\", \"400 K\", 3)).max()",
    |_, call| point(curve_of(call), curve_of(call).extremes().1)
);

curve_card!(
    CROSSINGS,
    "curve.crossings",
    "crossings",
    &[Arg {
        name: "level",
        takes: Takes::AnyQuantity,
        default: Default::Required,
        doc: "a value of the curve's dimension, such as \"0 kJ/mol\""
    }],
    "the temperatures at which the curve crosses the level, as a list, with the uncertainty that curve and level give them",
    "Finds where a curve crosses a level: between neighbouring points on both sides of it, by the formula and not by \
     interpolation.",
    "gibbs_energy(grid(\"300 K\", \"1500 K\", 121)).crossings(\"0 kJ/mol\")",
    crossings
);

fn crossings(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    // A level that is typed without an uncertainty is chosen, as a temperature is.
    let level = Side::Quantity(Quantity::of_node(property::as_argument(call.quantity(1))));
    let gap = Curve::pair(cx, Arithmetic::Subtract, Side::Curve(Rc::clone(curve_of(call))), level)?;
    let numbers = gap.numbers();
    let mut found = Vec::new();
    for row in 0..gap.len() {
        if numbers[row] == 0.0 {
            found.push(Value::Quantity(crossing(cx, call, &gap, row, row)?));
        } else if row > 0 && numbers[row - 1] * numbers[row].signum() < 0.0 {
            found.push(Value::Quantity(crossing(cx, call, &gap, row - 1, row)?));
        }
        if let Some(halt) = (cx.halted)() {
            return Err(halt);
        }
    }
    Ok(Value::List(found))
}

/// The crossing between two rows, or at the one row.
fn crossing(cx: &Cx, call: &Rc<Call>, gap: &Curve, below: usize, above: usize) -> Result<Quantity, Fault> {
    let points = gap.grid().points_k();
    let (mut a, mut b) = (points[below], points[above]);
    let (mut at_a, mut at_b) = (gap.numbers()[below], gap.numbers()[above]);
    let mut value = gap.anew(&chosen(a)?)?;
    loop {
        let middle = 0.5 * (a + b);
        if middle <= a || middle >= b {
            break;
        }
        value = gap.anew(&chosen(middle)?)?;
        let number = value.si();
        if number == 0.0 {
            (a, b, at_a, at_b) = (middle, middle, 0.0, 0.0);
        } else if (number < 0.0) == (at_a < 0.0) {
            (a, at_a) = (middle, number);
        } else {
            (b, at_b) = (middle, number);
        }
    }
    let t_k = 0.5 * (a + b);
    let slope = slope(&value);
    // At neighbouring numbers a curve without a jump differs by its slope alone, and by the rounding of its terms.
    let rounding = 1e-9 * gap.numbers()[below].abs().max(gap.numbers()[above].abs());
    let jumps = (at_b - at_a).abs() > 2.0 * (slope * (b - a)).abs() + rounding;
    let (dim, kind) = (Dimension::base(Base::Kelvin), Kind::of(What::TemperaturePoint));
    let unit = Some(std::sync::Arc::clone(gap.grid().unit()));
    if jumps || slope == 0.0 {
        let input = Input { digit: Some(0.01), ..Input::of(LeafKey::Own(format!("jump at {t_k} K").into())) };
        return Ok(Quantity::input(t_k, dim, kind, input, cx.place.clone())?.in_unit(unit));
    }
    let inputs: SmallVec<[(Rc<Node>, f64); 2]> = smallvec![(Rc::clone(value.node()), -1.0 / slope)];
    let step = Rc::clone(call);
    Ok(Quantity::from_step(t_k, dim, kind, inputs, step, cx.place.clone())?.in_unit(unit))
}

/// The name under which a temperature that was tried is an input.
const TRIED: &str = "temperature of a crossing";

fn chosen(t_k: f64) -> Result<Quantity, Fault> {
    let input = Input { u: Some(0.0), ..Input::of(LeafKey::Own(TRIED.into())) };
    Ok(Quantity::input(t_k, Dimension::base(Base::Kelvin), Kind::of(What::OpenTemperature), input, None)?)
}

/// Derivative of a value with respect to the temperature it was computed at.
fn slope(value: &Quantity) -> f64 {
    let of_t = |key: &LeafKey| matches!(key, LeafKey::Own(name) if &**name == TRIED);
    let inputs = value.sensitivities();
    inputs.iter().find(|one| one.input().is_some_and(|input| of_t(&input.key))).map_or(0.0, |one| one.derivative)
}
