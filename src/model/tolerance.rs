//! How large a price may be before an assumption counts as strained, where the analyst set no limit.
//!
//! With a full u: the larger of u/10 and half a unit of the last digit reported. Without: 0.05 kJ/mol times the largest
//! |ν|. With a partial u: the larger of that and a tenth of the stated part. Scaled alike for S and Cp (t/T) and for ln K
//! (t/RT), and for balances of streams by the moles that are turned over. Values that are no reaction property: 1 %. (Common
//! practice, no source.)

use std::rc::Rc;

use crate::model::card::{Call, call_of};
use crate::model::gather;
use crate::num::math;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey, Node};
use crate::record::register::Reported;
use crate::record::spread::Spread;
use crate::units::What;
use crate::units::constants::ConstantSet;

/// 0.05 kJ/mol.
const PER_NU: f64 = 50.0;
const OTHERWISE: f64 = 0.01;

/// The default tolerance of a value, in its SI unit.
pub fn default(value: &Quantity, reported: &Reported, constants: &ConstantSet) -> f64 {
    let spread = value.spread();
    if let Spread::Full(u) = spread
        && u > 0.0
    {
        return (u / 10.0).max(value.shown().half_digit_si);
    }
    let fixed = fixed(value, reported, constants).unwrap_or(OTHERWISE * value.si().abs());
    match spread {
        Spread::Partial { u, .. } => fixed.max(u / 10.0),
        _ => fixed,
    }
}

/// The tolerance that does not look at u: of a formula's own result, else of the results it was computed from, carried here
/// by the derivative, so that per kilogram or as a total a value is judged as it is per mole. `None`: it rests on none.
fn fixed(value: &Quantity, reported: &Reported, constants: &ConstantSet) -> Option<f64> {
    if let Some(terms) = call_of(value.node()).and_then(Call::terms) {
        return scale(value, constants).map(|per_nu| per_nu * terms.largest_nu());
    }
    if let Some(turned_over) = turned_over(value.node()) {
        return Some(PER_NU * turned_over);
    }
    let carried = reported.history().iter().filter_map(|node| {
        let own = match call_of(node)?.terms() {
            Some(terms) => scale(&Quantity::of_node(Rc::clone(node)), constants)? * terms.largest_nu(),
            None => PER_NU * turned_over(node)?,
        };
        Some(own * reported.derivative(node.id()).abs())
    });
    carried.filter(|t| *t > 0.0).reduce(f64::max)
}

/// What takes the place of the largest |ν| in a formula over several reactions and streams: the largest derivative by a
/// formation enthalpy, which is the most moles of one species that are formed or used up, over what the formula divides by.
fn turned_over(node: &Rc<Node>) -> Option<f64> {
    call_of(node).filter(|call| call.terms().is_none())?;
    let of_formation = |input: &Node| match input.input() {
        Some(Input { key: LeafKey::Datum { field, .. }, .. }) => *field == gather::FORMATION,
        _ => false,
    };
    let slopes = node.inputs().iter().filter(|(input, _)| of_formation(input)).map(|(_, slope)| slope.abs());
    slopes.reduce(f64::max).filter(|most| *most > 0.0)
}

/// How large the prices of all rows that hold may be together: u/3, where u is complete. Where it is not, the stated part
/// says little, and the limit keeps the same proportion to the tolerance of one row, 10/3.
pub fn together(value: &Quantity, one: f64) -> f64 {
    match value.spread() {
        Spread::Full(u) if u > 0.0 => u / 3.0,
        spread => spread.u().map_or(0.0, |u| u / 3.0).max(one * 10.0 / 3.0),
    }
}

/// The tolerance for |ν| = 1, for values that are reaction properties at one temperature.
fn scale(value: &Quantity, constants: &ConstantSet) -> Option<f64> {
    let t_k = value.kind().state().and_then(|state| state.t_k);
    match value.kind().what {
        What::S | What::Cp | What::Cv => t_k.map(|t| PER_NU / t),
        // A tolerance in ln K, taken to K itself.
        What::K => t_k.map(|t| value.si() * math::expm1(PER_NU / (constants.molar_gas.value * t))),
        What::U | What::H | What::A | What::G => Some(PER_NU),
        _ => None,
    }
}
