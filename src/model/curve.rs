//! A curve: one formula asked at every temperature of a grid, or a measured column, as one value with one unit and kind.
//!
//! [`Curve`] holds its numbers and the one call that gave them. A row becomes a value with inputs and derivatives when it is
//! asked for, by the same call at that temperature, so that `curve[i]` and the single call are the same to the last bit, have
//! the same inputs, and cancel. The surprise: between its points a curve is computed and not interpolated; a measured one,
//! where nothing can be computed, is refused there.

use std::cell::{Cell, OnceCell};
use std::ops::Range;
use std::rc::Rc;
use std::sync::Arc;

use thiserror::Error;

use crate::fault::{Explain, Fault, Place};
use crate::model::card::{Call, Cx, References, Value};
use crate::model::grid::Grid;
use crate::model::molecule;
use crate::model::property::{self, Property};
use crate::model::sweep;
use crate::model::table::Column;
use crate::num::math;
use crate::quantity::{Mismatch, Quantity};
use crate::record::node::Step;
use crate::units::{Dimension, Kind, State, Unit};

/// Steps of arithmetic that one curve may rest on: each row is computed through all of them, one inside the other.
const DEEPEST: u32 = 1000;

/// Rows between two looks whether the work must end.
const PATIENCE: usize = 128;

/// Values over a grid of temperatures.
#[derive(Clone)]
pub struct Curve {
    grid: Rc<Grid>,
    /// In SI units, one for each point; finite. A vector, since a slice that is shared would have to be copied once more.
    numbers: Rc<Vec<f64>>,
    dim: Dimension,
    /// Without a temperature, since there is not one.
    kind: Kind,
    unit: Option<Arc<Unit>>,
    of: Of,
    depth: u32,
    references: References,
    place: Option<Place>,
    /// Standard uncertainties in SI units, from the first time they are asked for.
    spread: OnceCell<Rc<[Option<f64>]>>,
}

/// What the numbers are.
#[derive(Clone)]
enum Of {
    /// A formula; one of the arguments is the grid.
    Call(Rc<Call>),
    Pair {
        arithmetic: Arithmetic,
        sides: Rc<(Side, Side)>,
    },
    Single {
        function: Function,
        curve: Rc<Curve>,
    },
    Measured(Rc<Column>),
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Arithmetic {
    Add,
    Subtract,
    Multiply,
    Divide,
}

/// What stands on one side of an operator.
#[derive(Clone)]
pub enum Side {
    Curve(Rc<Curve>),
    Quantity(Quantity),
    Number(f64),
}

/// A function of one curve.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Function {
    Negate,
    Exp,
    Ln,
    Absolute,
}

/// Where a curve is asked.
#[derive(Clone, Copy)]
enum At<'a> {
    Row(usize),
    Temperature(&'a Quantity),
}

/// What a curve cannot give.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum CurveError {
    #[error("row {row} is outside this curve, which has {rows}")]
    Row { row: i64, rows: usize },
    #[error("{t_k} K is outside this curve, which goes from {from_k} K to {to_k} K")]
    Outside { t_k: f64, from_k: f64, to_k: f64 },
    #[error("{t_k} K lies between two measured points, {below_k} K and {above_k} K, and a curve is not interpolated")]
    Between { t_k: f64, below_k: f64, above_k: f64 },
    #[error("cannot combine a curve over {left} with one over {right}")]
    Grids { left: String, right: String },
    #[error("this curve rests on {depth} steps of arithmetic, one inside the other")]
    TooDeep { depth: u32 },
    #[error("`{function}` gives {sort} at one temperature, and a curve is made of quantities")]
    NotAQuantity { function: &'static str, sort: String },
    #[error("a curve has one dimension, and the value at {t_k} K has another than the first")]
    Dimension { t_k: f64 },
}

impl Explain for CurveError {
    fn code(&self) -> &'static str {
        match self {
            CurveError::Row { .. } => "curve-row-missing",
            CurveError::Outside { .. } => "curve-left",
            CurveError::Between { .. } => "curve-not-interpolated",
            CurveError::Grids { .. } => "grids-differ",
            CurveError::TooDeep { .. } => "curve-too-deep",
            CurveError::NotAQuantity { .. } => "curve-of-no-quantity",
            CurveError::Dimension { .. } => "curve-of-two-dimensions",
        }
    }

    fn hint(&self) -> String {
        match self {
            CurveError::Row { .. } => "the first row is 0, the last -1; `len()` says how many there are".to_owned(),
            CurveError::Outside { .. } => "ask the reaction or substance itself, or make the grid wider".to_owned(),
            CurveError::Between { below_k, above_k, .. } => {
                format!("ask for one of the two, `curve.at(\"{below_k} K\")` or `curve.at(\"{above_k} K\")`")
            }
            CurveError::Grids { .. } => {
                "give the grid a name, `let T = grid(\"300 K\", \"1500 K\", 1201);`, and ask both at it".to_owned()
            }
            CurveError::TooDeep { .. } => {
                "compute with values first and with the curve last; a sum over rows is taken of `curve[i]`".to_owned()
            }
            CurveError::NotAQuantity { .. } => "ask it at one temperature after another".to_owned(),
            CurveError::Dimension { .. } => "make one curve for each dimension".to_owned(),
        }
    }
}

impl Curve {
    /// A formula at every point of the grid among its arguments.
    ///
    /// # Errors
    /// The formula refuses one of the points, or the work is told to end.
    pub fn of_call(cx: &Cx, call: Rc<Call>) -> Result<Curve, Fault> {
        let grid = call.args.iter().find_map(|arg| match arg {
            Value::Grid(grid) => Some(Rc::clone(grid)),
            _ => None,
        });
        let grid = grid.unwrap_or_else(|| unreachable!("{} was asked at a grid", call.card.id));
        let numbers = |curve: &Curve, ends: &(Quantity, Quantity)| {
            let mut numbers = vec![0.0; curve.len()];
            let done = curve.in_one_pass(&mut numbers, cx);
            for row in (0..done.start).chain(done.end..curve.len()) {
                if row % PATIENCE == 0
                    && let Some(halt) = (cx.halted)()
                {
                    return Err(halt);
                }
                let value = curve.row(row)?;
                if value.dim() != ends.0.dim() {
                    return Err(CurveError::Dimension { t_k: curve.grid.points_k()[row] }.into());
                }
                numbers[row] = value.si();
            }
            Ok(Rc::new(numbers))
        };
        Curve::made(grid, Of::Call(call), 0, cx, numbers)
    }

    /// Works out the rows that need no call each; says which they are.
    fn in_one_pass(&self, numbers: &mut [f64], cx: &Cx) -> Range<usize> {
        let asked = self.call().and_then(|call| {
            let property = Property::of(call.card)?;
            Some((property, call.terms()?, property::method_of(call, cx).ok()?))
        });
        match asked {
            Some((property, terms, method)) => {
                sweep::numbers(property, terms, &method, self.grid.points_k(), numbers, cx)
            }
            None => self
                .call()
                .map_or(0..0, |call| molecule::answers::numbers(call, self.grid.points_k(), numbers, cx.constants())),
        }
    }

    /// A column of measured values, one for each point.
    ///
    /// # Errors
    /// None; the same road as that of curves that are computed.
    pub fn measured(cx: &Cx, grid: Rc<Grid>, values: Rc<Column>) -> Result<Curve, Fault> {
        let numbers = Rc::new(values.numbers().to_vec());
        Curve::made(grid, Of::Measured(values), 0, cx, |_, _| Ok(numbers))
    }

    /// Two sides of which one at least is a curve.
    ///
    /// # Errors
    /// They may not be combined, at some temperature at least.
    pub fn pair(cx: &Cx, arithmetic: Arithmetic, left: Side, right: Side) -> Result<Curve, Fault> {
        let grid = match (&left, &right) {
            (Side::Curve(a), Side::Curve(b)) if !a.grid.same_as(&b.grid) => {
                return Err(CurveError::Grids { left: a.grid.words(), right: b.grid.words() }.into());
            }
            (Side::Curve(curve), _) | (_, Side::Curve(curve)) => Rc::clone(&curve.grid),
            _ => unreachable!("an operator of curves is called with a curve"),
        };
        let depth = left.depth().max(right.depth()) + 1;
        let sides = Rc::new((left, right));
        let of = Of::Pair { arithmetic, sides: Rc::clone(&sides) };
        Curve::made(grid, of, depth, cx, |curve, _| {
            curve.checked((0..curve.len()).map(|row| arithmetic.of(sides.0.number(row), sides.1.number(row))))
        })
    }

    /// A function of a curve.
    ///
    /// # Errors
    /// The function is not to be had of such values.
    pub fn single(cx: &Cx, function: Function, of: &Rc<Curve>) -> Result<Curve, Fault> {
        let (grid, depth) = (Rc::clone(&of.grid), of.depth + 1);
        Curve::made(grid, Of::Single { function, curve: Rc::clone(of) }, depth, cx, |curve, _| {
            curve.checked(of.numbers.iter().map(|number| function.of(*number)))
        })
    }

    /// `numbers` is given the curve without its numbers, and its first and last value.
    fn made(
        grid: Rc<Grid>,
        of: Of,
        depth: u32,
        cx: &Cx,
        numbers: impl FnOnce(&Curve, &(Quantity, Quantity)) -> Result<Rc<Vec<f64>>, Fault>,
    ) -> Result<Curve, Fault> {
        if depth > DEEPEST {
            return Err(CurveError::TooDeep { depth }.into());
        }
        let mut curve = Curve {
            grid,
            numbers: Rc::default(),
            dim: Dimension::none(),
            kind: Kind::PLAIN,
            unit: None,
            of,
            depth,
            references: cx.references.clone(),
            place: cx.place.clone(),
            spread: OnceCell::new(),
        };
        // What may be combined depends on the row by its temperature alone, so the ends speak for all.
        let ends = (curve.row(0)?, curve.row(curve.len() - 1)?);
        if ends.0.dim() != ends.1.dim() {
            return Err(CurveError::Dimension { t_k: curve.grid.ends_k().1 }.into());
        }
        curve.dim = ends.0.dim().clone();
        curve.kind = common(ends.0.kind(), ends.1.kind());
        curve.unit = ends.0.written_unit().cloned();
        curve.numbers = numbers(&curve, &ends)?;
        Ok(curve)
    }

    /// The numbers, if all are finite.
    fn checked(&self, numbers: impl Iterator<Item = f64>) -> Result<Rc<Vec<f64>>, Fault> {
        let numbers = Rc::new(numbers.collect::<Vec<f64>>());
        // A row that is no number says why, in the words of the arithmetic on values.
        match numbers.iter().position(|number| !number.is_finite()) {
            Some(row) => match self.row(row) {
                Err(fault) => Err(fault),
                Ok(_) => Err(Mismatch::NotFinite.into()),
            },
            None => Ok(numbers),
        }
    }

    pub fn grid(&self) -> &Rc<Grid> {
        &self.grid
    }

    pub fn len(&self) -> usize {
        self.grid.len()
    }

    /// A grid has at least two points.
    pub fn is_empty(&self) -> bool {
        self.grid.is_empty()
    }

    /// The values in SI units, in the order of the grid.
    pub fn numbers(&self) -> &[f64] {
        &self.numbers
    }

    pub fn dim(&self) -> &Dimension {
        &self.dim
    }

    pub fn kind(&self) -> &Kind {
        &self.kind
    }

    /// The unit the curve is shown in.
    pub fn unit(&self) -> Arc<Unit> {
        self.unit.clone().unwrap_or_else(|| Arc::new(crate::units::unit_for(&self.dim)))
    }

    /// The call that gave the curve, where a formula did and no arithmetic followed.
    pub fn call(&self) -> Option<&Rc<Call>> {
        match &self.of {
            Of::Call(call) => Some(call),
            _ => None,
        }
    }

    /// The measured column that the curve shows, where it was read from a table and no arithmetic followed.
    pub fn column(&self) -> Option<&Rc<Column>> {
        match &self.of {
            Of::Measured(column) => Some(column),
            _ => None,
        }
    }

    /// The calls that the curve rests on, each once, in the order of the text.
    pub fn calls(&self) -> Vec<Rc<Call>> {
        let mut found = Vec::new();
        self.collect_calls(&mut found);
        found
    }

    fn collect_calls(&self, found: &mut Vec<Rc<Call>>) {
        match &self.of {
            Of::Call(call) if !found.iter().any(|known| Rc::ptr_eq(known, call)) => found.push(Rc::clone(call)),
            Of::Call(_) | Of::Measured(_) => {}
            Of::Single { curve, .. } => curve.collect_calls(found),
            Of::Pair { sides, .. } => {
                for side in [&sides.0, &sides.1] {
                    if let Side::Curve(curve) = side {
                        curve.collect_calls(found);
                    }
                }
            }
        }
    }

    /// The same curve, shown in another unit.
    ///
    /// # Errors
    /// The unit measures something else.
    pub fn to(&self, unit: Unit) -> Result<Curve, Fault> {
        let shown = self.row(0)?.to(unit)?;
        // A unit may bind an open mole, which every row then has to do; a unit of the curve's own dimension changes nothing.
        if shown.dim() != &self.dim {
            return Err(Mismatch::unit(&self.dim, &shown.unit()).into());
        }
        Ok(Curve { unit: Some(shown.unit()), ..self.clone() })
    }

    /// One row as a value, with its inputs and derivatives.
    ///
    /// # Errors
    /// None for a curve that was made; the row of arithmetic may be refused while it is being made.
    pub fn row(&self, row: usize) -> Result<Quantity, Fault> {
        self.value(At::Row(row))
    }

    /// A row as scripts count them, negative ones from the end.
    ///
    /// # Errors
    /// There is no such row.
    pub fn nth(&self, row: i64) -> Result<Quantity, Fault> {
        let rows = self.len();
        let from_start = if row < 0 { row.checked_add(rows as i64) } else { Some(row) };
        match from_start.and_then(|row| usize::try_from(row).ok()).filter(|row| *row < rows) {
            Some(row) => self.row(row),
            None => Err(CurveError::Row { row, rows }.into()),
        }
    }

    /// The value at a temperature between the ends: the row where it is a point, else computed anew.
    ///
    /// # Errors
    /// It is outside the grid, or between two measured points.
    pub fn at(&self, t: &Quantity) -> Result<Quantity, Fault> {
        let (t_k, (from_k, to_k)) = (t.si(), self.grid.ends_k());
        if !(from_k..=to_k).contains(&t_k) {
            return Err(CurveError::Outside { t_k, from_k, to_k }.into());
        }
        match self.grid.position(t_k) {
            // A temperature that is itself uncertain is asked as it is, so that its uncertainty reaches the value.
            Some(row) if !t.spread().u().is_some_and(|u| u > 0.0) => self.row(row),
            _ => self.value(At::Temperature(t)),
        }
    }

    /// The value at a temperature, computed anew also where the temperature is a point.
    ///
    /// # Errors
    /// The curve is measured, or the formula refuses the temperature.
    pub fn anew(&self, t: &Quantity) -> Result<Quantity, Fault> {
        self.value(At::Temperature(t))
    }

    fn value(&self, at: At<'_>) -> Result<Quantity, Fault> {
        let value = match &self.of {
            Of::Call(call) => self.called(call, at)?,
            Of::Pair { arithmetic, sides } => arithmetic.values(&sides.0, &sides.1, at, self.place.clone())?,
            Of::Single { function, curve } => function.value(&curve.value(at)?, self.place.clone())?,
            Of::Measured(values) => match at {
                At::Row(row) => values.value(row),
                At::Temperature(t) => return Err(self.between(t.si()).into()),
            },
        };
        Ok(match &self.unit {
            Some(unit) if unit.dim == *value.dim() => value.in_unit(Some(Arc::clone(unit))),
            _ => value,
        })
    }

    fn between(&self, t_k: f64) -> CurveError {
        let points = self.grid.points_k();
        let above = points.partition_point(|point| *point < t_k).clamp(1, points.len() - 1);
        CurveError::Between { t_k, below_k: points[above - 1], above_k: points[above] }
    }

    /// The call at one temperature.
    fn called(&self, call: &Rc<Call>, at: At<'_>) -> Result<Quantity, Fault> {
        let t = match at {
            At::Row(row) => self.grid.point(row),
            At::Temperature(t) => t.clone(),
        };
        let single = |arg: &Value| match arg {
            Value::Grid(_) => Value::Quantity(t.clone()),
            other => other.clone(),
        };
        let card = call.card;
        let call = Rc::new(Call { card, args: call.args.iter().map(single).collect() });
        let ordinal = Cell::new(0); // The arguments were read when the curve was made.
        let cx = Cx { references: &self.references, place: self.place.clone(), ordinal: &ordinal, halted: &|| None };
        match (card.run)(&cx, &call)? {
            Value::Quantity(value) => Ok(value),
            other => Err(CurveError::NotAQuantity { function: card.name, sort: other.sort().to_owned() }.into()),
        }
    }

    /// The standard uncertainty of each row in SI units, as far as it is known; computed at the first time.
    ///
    /// # Errors
    /// The work is told to end.
    pub fn uncertainties(&self, cx: &Cx) -> Result<Rc<[Option<f64>]>, Fault> {
        if let Some(known) = self.spread.get() {
            return Ok(Rc::clone(known));
        }
        let rows = (0..self.len()).map(|row| {
            if row % PATIENCE == 0
                && let Some(halt) = (cx.halted)()
            {
                return Err(halt);
            }
            Ok(self.row(row)?.spread().u())
        });
        let spread: Rc<[Option<f64>]> = rows.collect::<Result<Vec<_>, Fault>>()?.into();
        Ok(Rc::clone(self.spread.get_or_init(|| spread)))
    }

    /// The rows with the smallest and the largest value, the first of several.
    pub fn extremes(&self) -> (usize, usize) {
        let (mut low, mut high) = (0, 0);
        for (row, number) in self.numbers.iter().enumerate() {
            if *number < self.numbers[low] {
                low = row;
            }
            if *number > self.numbers[high] {
                high = row;
            }
        }
        (low, high)
    }

    /// What it is, in words for messages and lists: `enthalpy(CO(g) + ..., 1201 temperatures from 300 K to 1500 K)`.
    pub fn words(&self) -> String {
        match self.calls().as_slice() {
            [] => self.grid.words(),
            calls => calls.iter().map(|call| call.does()).collect::<Vec<_>>().join("; "),
        }
    }
}

/// What two kinds share: the state without what differs.
fn common(first: &Kind, last: &Kind) -> Kind {
    let state = match (first.state(), last.state()) {
        (Some(a), Some(b)) => Some(Arc::new(State {
            zero: a.zero.clone().filter(|zero| b.zero.as_ref() == Some(zero)),
            t_k: a.t_k.filter(|t_k| b.t_k == Some(*t_k)),
            p_pa: a.p_pa.filter(|p_pa| b.p_pa == Some(*p_pa)),
            standard: a.standard && b.standard,
            reaction: a.reaction || b.reaction,
        })),
        _ => None,
    };
    Kind { what: first.what, state }
}

impl Side {
    fn depth(&self) -> u32 {
        match self {
            Side::Curve(curve) => curve.depth,
            Side::Quantity(_) | Side::Number(_) => 0,
        }
    }

    fn number(&self, row: usize) -> f64 {
        match self {
            Side::Curve(curve) => curve.numbers[row],
            Side::Quantity(value) => value.si(),
            Side::Number(number) => *number,
        }
    }
}

impl Arithmetic {
    fn of(self, a: f64, b: f64) -> f64 {
        match self {
            Arithmetic::Add => a + b,
            Arithmetic::Subtract => a - b,
            Arithmetic::Multiply => a * b,
            Arithmetic::Divide => a / b,
        }
    }

    fn values(self, left: &Side, right: &Side, at: At<'_>, place: Option<Place>) -> Result<Quantity, Fault> {
        let value = |side: &Side| match side {
            Side::Curve(curve) => curve.value(at).map(Ok),
            Side::Quantity(value) => Ok(Ok(value.clone())),
            Side::Number(number) => Ok(Err(*number)),
        };
        Ok(match (self, value(left)?, value(right)?) {
            (Arithmetic::Add, Ok(a), Ok(b)) => a.plus(&b, place),
            (Arithmetic::Subtract, Ok(a), Ok(b)) => a.minus(&b, place),
            (Arithmetic::Multiply, Ok(a), Ok(b)) => a.times(&b, place),
            (Arithmetic::Divide, Ok(a), Ok(b)) => a.over(&b, place),
            (Arithmetic::Add, Ok(a), Err(number)) | (Arithmetic::Add, Err(number), Ok(a)) => a.shifted(number, place),
            (Arithmetic::Subtract, Ok(a), Err(number)) => a.shifted(-number, place),
            (Arithmetic::Subtract, Err(number), Ok(a)) => {
                a.negated(place.clone()).and_then(|negative| negative.shifted(number, place))
            }
            (Arithmetic::Multiply, Ok(a), Err(number)) | (Arithmetic::Multiply, Err(number), Ok(a)) => {
                a.scaled(number, place)
            }
            (Arithmetic::Divide, Ok(a), Err(number)) => a.divided(number, place),
            (Arithmetic::Divide, Err(number), Ok(a)) => a.reciprocal(number, place),
            (_, Err(_), Err(_)) => unreachable!("one side is a curve"),
        }?)
    }
}

impl Function {
    fn of(self, number: f64) -> f64 {
        match self {
            Function::Negate => -number,
            // Where it vanishes the value is refused, and so is the curve.
            Function::Exp => Some(math::exp(number)).filter(|power| *power > 0.0).unwrap_or(f64::NAN),
            Function::Ln => math::ln(number),
            Function::Absolute => number.abs(),
        }
    }

    fn value(self, value: &Quantity, place: Option<Place>) -> Result<Quantity, Mismatch> {
        match self {
            Function::Negate => value.negated(place),
            Function::Exp => value.exp(place),
            Function::Ln => value.ln(place),
            Function::Absolute => value.absolute(place),
        }
    }
}
