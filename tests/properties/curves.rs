//! Curves: each row is the single call, to the last bit and in its inputs, whatever arithmetic followed.

use std::collections::BTreeMap;
use std::rc::Rc;

use proptest::prelude::*;

use crate::asking::Desk;
use crate::check;
use crate::reactions::{equation, reaction};
use hessbook::model::card::{self, Card, Value};
use hessbook::model::curve::{Arithmetic, Curve, Side};
use hessbook::model::gather::HeatCapacity;
use hessbook::model::grid::{GRID, Grid};
use hessbook::model::property_card::{
    ENTHALPY, ENTROPY, EQUILIBRIUM_CONSTANT, GIBBS_ENERGY, HEAT_CAPACITY, HELMHOLTZ_ENERGY, INTERNAL_ENERGY,
};
use hessbook::model::reaction::REACTION;
use hessbook::quantity::Quantity;
use hessbook::record::spread::Spread;

const PROPERTIES: [&Card; 7] =
    [&ENTHALPY, &INTERNAL_ENERGY, &GIBBS_ENERGY, &HELMHOLTZ_ENERGY, &ENTROPY, &HEAT_CAPACITY, &EQUILIBRIUM_CONSTANT];

/// An expansion starts from a temperature of its own.
fn options(mode: &'static str) -> Vec<(&'static str, &'static str)> {
    let about = (mode == "taylor").then_some(("about", "450 K"));
    std::iter::once(("heat_capacity", mode)).chain(about).collect()
}

fn curve(
    desk: &Desk,
    property: &'static Card,
    equation: &str,
    grid: &Rc<Grid>,
    mode: &'static str,
) -> Option<Rc<Curve>> {
    let reaction = card::call(&desk.cx(), &REACTION, vec![Value::Text(equation.into())]).unwrap();
    let options = options(mode).into_iter().map(|(name, word)| (name.to_owned(), Value::Text(word.into())));
    let options: BTreeMap<String, Value> = options.collect();
    let given = vec![reaction, Value::Grid(Rc::clone(grid)), Value::Options(Rc::new(options))];
    match card::call(&desk.cx(), property, given) {
        Ok(Value::Curve(curve)) => Some(curve),
        Ok(other) => panic!("{} at a grid gives {}", property.id, other.sort()),
        Err(fault) if fault.code() == "equilibrium-constant-out-of-range" => None,
        Err(fault) => panic!("{fault}"),
    }
}

fn grid(desk: &Desk, from: f64, to: f64, points: usize) -> Rc<Grid> {
    let ends = [from, to].map(|t_k| Value::Text(format!("{t_k} K").into()));
    let [from, to] = ends;
    match card::call(&desk.cx(), &GRID, vec![from, to, Value::Number(points as f64)]).unwrap() {
        Value::Grid(grid) => grid,
        other => panic!("grid gives {}", other.sort()),
    }
}

fn cases() -> impl Strategy<Value = (crate::reactions::Halves, usize, usize, f64, f64, usize)> {
    // The common range of the functions is 200 K to 6000 K; some pieces of it hold a join at 1000 K, some do not.
    (reaction(), 0..PROPERTIES.len(), 0..HeatCapacity::WORDS.len(), 200.0..3000.0, 1.0..2900.0, 2usize..40)
}

#[test]
fn each_row_is_the_single_call() {
    check(60, &cases(), |(halves, property, mode, from, span, points)| {
        let (desk, equation) = (Desk::new(), equation(&halves));
        let (property, mode) = (PROPERTIES[property], HeatCapacity::WORDS[mode]);
        let grid = grid(&desk, from, from + span, points);
        let Some(curve) = curve(&desk, property, &equation, &grid, mode) else { return Ok(()) };
        prop_assert_eq!(curve.numbers().len(), points);
        for (row, t_k) in grid.points_k().iter().enumerate() {
            let single = desk.ask(property, &equation, &format!("{t_k} K"), &options(mode)).unwrap();
            let of_curve = curve.row(row).unwrap();
            prop_assert_eq!(curve.numbers()[row].to_bits(), single.si().to_bits(), "{} at {} K", &equation, t_k);
            prop_assert_eq!(of_curve.si().to_bits(), single.si().to_bits());
            prop_assert_eq!((of_curve.dim(), of_curve.kind()), (single.dim(), single.kind()));
            prop_assert_eq!(of_curve.spread().u(), single.spread().u());
            let gap = single.minus(&of_curve, None).unwrap();
            prop_assert_eq!((gap.si(), gap.spread()), (0.0, Spread::Full(0.0)));
        }
        Ok(())
    });
}

#[test]
fn arithmetic_of_curves_is_that_of_their_rows() {
    check(40, &(cases(), reaction()), |((halves, property, mode, from, span, points), other)| {
        let (desk, mode) = (Desk::new(), HeatCapacity::WORDS[mode]);
        let grid = grid(&desk, from, from + span, points);
        let of = |halves| curve(&desk, PROPERTIES[property], &equation(halves), &grid, mode);
        let (Some(a), Some(b)) = (of(&halves), of(&other)) else { return Ok(()) };
        let value = Side::Quantity(b.row(0).unwrap());
        type Rows = fn(&Quantity, &Quantity) -> Quantity;
        let sums: [(Arithmetic, Rows); 4] = [
            (Arithmetic::Add, |x, y| x.plus(y, None).unwrap()),
            (Arithmetic::Subtract, |x, y| x.minus(y, None).unwrap()),
            (Arithmetic::Multiply, |x, y| x.times(y, None).unwrap()),
            (Arithmetic::Divide, |x, y| x.over(y, None).unwrap()),
        ];
        for (arithmetic, rows) in sums {
            let made = Curve::pair(&desk.cx(), arithmetic, Side::Curve(Rc::clone(&a)), Side::Curve(Rc::clone(&b)));
            // A quotient of two heat capacities may have no value where the second vanishes; then there is no curve.
            let Ok(made) = made else { continue };
            for row in 0..points {
                let (x, y) = (a.row(row).unwrap(), b.row(row).unwrap());
                let wanted = rows(&x, &y);
                prop_assert_eq!(made.numbers()[row].to_bits(), wanted.si().to_bits());
                prop_assert_eq!(made.row(row).unwrap().spread().u(), wanted.spread().u());
            }
        }
        // A reaction value belongs to its temperature, so one value cannot be taken from all rows; a factor can be.
        let shifted = Curve::pair(&desk.cx(), Arithmetic::Subtract, Side::Curve(Rc::clone(&a)), value);
        prop_assert_eq!(shifted.map(|_| ()).unwrap_err().code(), "reaction-temperatures-differ");
        let twice =
            Curve::pair(&desk.cx(), Arithmetic::Multiply, Side::Number(2.0), Side::Curve(Rc::clone(&a))).unwrap();
        prop_assert!(twice.numbers().iter().zip(a.numbers()).all(|(twice, once)| *twice == 2.0 * once));
        Ok(())
    });
}

#[test]
fn joins_changes_of_phase_and_the_reference_temperature_are_rows_like_others() {
    let desk = Desk::new();
    // Where functions join, at 1000 K; where copper melts, at 1358 K; and 298.15 K, where nothing is added.
    let temperatures = ["250 K", "298.15 K", "999.9 K", "1000 K", "1000.1 K", "1357 K", "1358 K", "1359 K", "1800 K"];
    let shift = ("CO(g) + H2O(g) -> CO2(g) + H2(g)", &temperatures[..]);
    let copper = ("Cu(cr) -> Cu(g)", &temperatures[..]);
    let water = ("H2(g) + 1/2 O2(g) -> H2O(l)", &["280 K", "298.15 K", "373.15 K", "373.151 K", "500 K"][..]);
    let ions = ("H2O(l) -> H+(aq) + OH-(aq)", &["298.15 K", "298.16 K"][..]);
    for (equation, temperatures) in [shift, copper, water, ions] {
        let list = Value::List(temperatures.iter().map(|t| Value::Text((*t).into())).collect());
        let Value::Grid(grid) = card::call(&desk.cx(), &hessbook::model::grid::GRID_OF, vec![list]).unwrap() else {
            panic!("a list of temperatures is a grid");
        };
        for property in PROPERTIES {
            let reaction = card::call(&desk.cx(), &REACTION, vec![Value::Text(equation.into())]).unwrap();
            let singles: Result<Vec<Quantity>, _> =
                temperatures.iter().map(|t| desk.ask(property, equation, t, &[])).collect();
            match (card::call(&desk.cx(), property, vec![reaction, Value::Grid(Rc::clone(&grid))]), singles) {
                (Ok(Value::Curve(curve)), Ok(singles)) => {
                    for (row, single) in singles.iter().enumerate() {
                        let (number, single) = (curve.numbers()[row].to_bits(), single.si().to_bits());
                        assert_eq!(number, single, "{} of {equation} at {}", property.id, temperatures[row]);
                    }
                }
                (Err(curve), Err(single)) => assert_eq!(curve.code(), single.code(), "{} of {equation}", property.id),
                _ => panic!("{} of {equation}: the curve and its rows disagree on whether there is one", property.id),
            }
        }
    }
}
