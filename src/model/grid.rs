//! A grid: temperatures in order, at which a formula is asked in one call.
//!
//! [`Grid`] gives its points as numbers and, one by one, as values. A point of an even grid was chosen and is exact; the
//! points of a list are the values of that list, with what is known of them. The surprise: an even grid is laid out in the
//! unit it was asked in and each point is rounded once, so that it has the bits of the same temperature when typed.

use std::rc::Rc;
use std::sync::Arc;

use thiserror::Error;

use crate::fault::{Explain, Fault, Place};
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::table::Column;
use crate::quantity::{Quantity, round};
use crate::record::node::{Input, LeafKey};
use crate::units::{Base, Dimension, Kind, Unit, What};

/// Points that one grid may have: 80 MB of numbers, and more than any picture or table shows.
const MOST: usize = 10_000_000;

/// Temperatures in ascending order; at least two.
pub struct Grid {
    /// K
    points: Rc<[f64]>,
    unit: Arc<Unit>,
    kind: Kind,
    of: Of,
}

enum Of {
    /// Chosen evenly; the points are numbered from `first` on, as inputs typed at `place`.
    Even {
        place: Option<Place>,
        first: u64,
    },
    List(Rc<[Quantity]>),
    Column(Rc<Column>),
}

/// Why there is no such grid.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum GridError {
    #[error("a grid of {count} points is none: it has from 2 to {MOST}")]
    Count { count: f64 },
    #[error("a grid ascends, and {second_k} K does not lie above {first_k} K")]
    NotAscending { first_k: f64, second_k: f64 },
    #[error("{t_k} K states an uncertainty, and the ends of a grid are chosen")]
    Uncertain { t_k: f64 },
    #[error("between {first_k} K and {second_k} K there are no {count} different numbers")]
    TooFine { first_k: f64, second_k: f64, count: usize },
}

impl Explain for GridError {
    fn code(&self) -> &'static str {
        match self {
            GridError::Count { .. } => "grid-count",
            GridError::NotAscending { .. } => "grid-not-ascending",
            GridError::Uncertain { .. } => "grid-uncertain",
            GridError::TooFine { .. } => "grid-too-fine",
        }
    }

    fn hint(&self) -> String {
        match self {
            GridError::Count { .. } => {
                "give a whole number of points, both ends counted: `grid(\"300 K\", \"1500 K\", 1201)` has one at every \
                 kelvin"
            }
            GridError::NotAscending { .. } => "give the lower temperature first, each one once",
            GridError::Uncertain { .. } => {
                "leave the uncertainty out; measured temperatures are given as a list, `grid([T1, T2, T3])`"
            }
            GridError::TooFine { .. } => "ask for fewer points",
        }
        .to_owned()
    }
}

impl Grid {
    /// Points of equal distance, both ends counted, laid out in the unit of the first.
    fn even(from: &Quantity, to: &Quantity, count: f64, cx: &Cx) -> Result<Grid, GridError> {
        if count.fract() != 0.0 || !(2.0..=MOST as f64).contains(&count) {
            return Err(GridError::Count { count });
        }
        for end in [from, to] {
            if end.spread().u().is_some_and(|u| u > 0.0) {
                return Err(GridError::Uncertain { t_k: end.si() });
            }
        }
        let (first_k, second_k) = (from.si(), to.si());
        if first_k >= second_k {
            return Err(GridError::NotAscending { first_k, second_k });
        }
        let (unit, last) = (from.unit(), count - 1.0);
        let (a, b) = (unit.from_si(first_k), unit.from_si(second_k));
        let count = count as usize;
        let points: Rc<[f64]> = (0..count)
            .map(|nth| match nth {
                0 => first_k,
                nth if nth == count - 1 => second_k,
                // One division of what is exact for ends of few digits, so that the quotient is rounded only once.
                nth => unit.to_si((a * (last - nth as f64) + b * nth as f64) / last),
            })
            .collect();
        if points.windows(2).any(|pair| pair[0] >= pair[1]) {
            return Err(GridError::TooFine { first_k, second_k, count });
        }
        let first = cx.ordinal.get();
        cx.ordinal.set(first + count as u64);
        let kind = Kind::of(if unit.is_point() { What::TemperaturePoint } else { What::OpenTemperature });
        Ok(Grid { points, unit, kind, of: Of::Even { place: cx.place.clone(), first } })
    }

    /// The temperatures of a list, which ascend.
    pub fn list(points: Vec<Quantity>) -> Result<Grid, GridError> {
        let numbers: Rc<[f64]> = points.iter().map(Quantity::si).collect();
        if numbers.len() < 2 {
            return Err(GridError::Count { count: numbers.len() as f64 });
        }
        if let Some(pair) = numbers.windows(2).find(|pair| pair[0] >= pair[1]) {
            return Err(GridError::NotAscending { first_k: pair[0], second_k: pair[1] });
        }
        let (unit, kind) = (points[0].unit(), points[0].kind().clone());
        Ok(Grid { points: numbers, unit, kind, of: Of::List(points.into()) })
    }

    /// A column of a table, which is known to ascend ([`Column::ascends`]).
    pub fn column(column: &Rc<Column>) -> Grid {
        let (unit, kind) = (Arc::clone(&column.unit), column.kind().clone());
        Grid { points: column.numbers().into(), unit, kind, of: Of::Column(Rc::clone(column)) }
    }

    /// The points in kelvin.
    pub fn points_k(&self) -> &[f64] {
        &self.points
    }

    pub fn len(&self) -> usize {
        self.points.len()
    }

    /// A grid has at least two points.
    pub fn is_empty(&self) -> bool {
        self.points.is_empty()
    }

    /// The lowest and the highest point, K.
    pub fn ends_k(&self) -> (f64, f64) {
        (self.points[0], self.points[self.points.len() - 1])
    }

    /// The unit it was asked in.
    pub fn unit(&self) -> &Arc<Unit> {
        &self.unit
    }

    /// Where a temperature stands among the points, if it is one of them.
    pub fn position(&self, t_k: f64) -> Option<usize> {
        let at = self.points.partition_point(|point| *point < t_k);
        (self.points.get(at) == Some(&t_k)).then_some(at)
    }

    /// One point as a value.
    pub fn point(&self, row: usize) -> Quantity {
        match &self.of {
            Of::List(points) => points[row].clone(),
            Of::Column(column) => column.value(row),
            Of::Even { place, first } => {
                let name = format!("{} {}", round::shortest(self.unit.from_si(self.points[row])), self.unit.text);
                let input = Input {
                    u: Some(0.0),
                    label: Some(name.into()),
                    unit: Some(Arc::clone(&self.unit)),
                    ..Input::of(LeafKey::Typed { place: place.clone(), ordinal: first + row as u64 })
                };
                let (dim, kind) = (Dimension::base(Base::Kelvin), self.kind.clone());
                let point = Quantity::input(self.points[row], dim, kind, input, place.clone());
                let point = point.unwrap_or_else(|_| unreachable!("points between two temperatures are finite"));
                point.in_unit(Some(Arc::clone(&self.unit)))
            }
        }
    }

    /// Whether two grids have the same points, to the last bit.
    pub fn same_as(&self, other: &Grid) -> bool {
        Rc::ptr_eq(&self.points, &other.points) || self.points == other.points
    }

    /// `1201 temperatures from 300 K to 1500 K`
    pub fn words(&self) -> String {
        let (from, to) = self.ends_k();
        let end = |t_k: f64| round::shortest(round::significant(self.unit.from_si(t_k), 10).parse().unwrap_or(t_k));
        let unit = crate::units::reader_text(&self.unit);
        format!("{} temperatures from {} {unit} to {} {unit}", self.len(), end(from), end(to))
    }
}

const POINTS: Arg = Arg {
    name: "points",
    takes: Takes::Number,
    default: Default::Required,
    doc: "how many temperatures, both ends counted",
};

pub static GRID: Card = Card {
    id: "sweep.grid",
    name: "grid",
    on: On::Nothing,
    args: &[
        Arg { name: "from", takes: Takes::Temperature, default: Default::Required, doc: "the lowest temperature" },
        Arg { name: "to", takes: Takes::Temperature, default: Default::Required, doc: "the highest temperature" },
        POINTS,
    ],
    gives: "a grid of temperatures at equal distances, which a property takes in place of one temperature",
    doc: "Chooses temperatures for a curve. They are exact, and lie at equal distances on the scale of the first end.",
    source: "definition",
    example: "grid(\"300 K\", \"1500 K\", 1201)",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let grid = Grid::even(call.quantity(0), call.quantity(1), call.number(2), cx)?;
        Ok(Value::Grid(Rc::new(grid)))
    },
    check_line: None,
    caution: None,
};

pub static GRID_OF: Card = Card {
    id: "sweep.grid-of-list",
    name: "grid",
    on: On::Nothing,
    args: &[Arg {
        name: "temperatures",
        takes: Takes::Quantities,
        default: Default::Required,
        doc: "temperatures that ascend, as `[\"20 degC\", \"37 degC\", \"60 degC\"]`; an uncertainty they state is kept",
    }],
    gives: "a grid of these temperatures, which a property takes in place of one temperature",
    doc: "Makes a grid of a list of temperatures, such as those of a measurement.",
    source: "definition",
    example: "grid([\"20 degC\", \"37 degC\", \"60 degC\"])",
    claims: &[],
    alternatives: &[],
    run: of_list,
    check_line: None,
    caution: None,
};

fn of_list(_: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Some(Value::List(list)) = call.args.first() else { unreachable!("{}: a list was checked", call.card.id) };
    let mut points = Vec::with_capacity(list.len());
    for item in list {
        let Value::Quantity(value) = item else { unreachable!("{}: quantities were checked", call.card.id) };
        points.push(crate::model::argument::as_point(call.card, &call.card.args[0], value.clone())?);
    }
    Ok(Value::Grid(Rc::new(Grid::list(points)?)))
}
