//! How a substance, reaction or stream of one's own came to be: the call that made it.
//!
//! Whoever has the call and its arguments can make the thing again, which is how a sealed value is derived without the
//! author's cells. The surprise: a thing made from a thing, and so on, remembers only so many steps back, since letting go
//! of an endless chain would take an endless stack.

use std::rc::Rc;

use crate::model::card::{Call, Value};

/// The longest chain of things made from things that is remembered.
const DEEPEST: u32 = 64;

/// The call that made something.
#[derive(Clone)]
pub struct Origin {
    call: Rc<Call>,
    /// The part of the call's answer that it is; none where it is the answer itself.
    part: Option<&'static str>,
    depth: u32,
}

impl Origin {
    /// None where the chain behind it is too long.
    pub fn of(call: &Rc<Call>) -> Option<Origin> {
        let depth = 1 + call.args.iter().map(depth).max().unwrap_or(0);
        (depth <= DEEPEST).then(|| Origin { call: Rc::clone(call), part: None, depth })
    }

    /// The same for a part of what a call gives.
    pub fn of_part(call: &Rc<Call>, part: &'static str) -> Option<Origin> {
        Origin::of(call).map(|origin| Origin { part: Some(part), ..origin })
    }

    pub fn part(&self) -> Option<&'static str> {
        self.part
    }

    pub fn call(&self) -> &Call {
        &self.call
    }
}

/// The origin of a value that has one.
pub fn origin_of(value: &Value) -> Option<&Origin> {
    match value {
        Value::Reaction(one) => one.origin(),
        Value::Substance(one) => one.origin(),
        Value::Molecule(one) => one.terms().origin(),
        Value::Crystal(one) => one.terms().origin(),
        Value::Stream(one) => one.origin.as_ref(),
        _ => None,
    }
}

fn depth(value: &Value) -> u32 {
    match value {
        Value::List(list) => list.iter().map(depth).max().unwrap_or(0),
        Value::Options(options) => options.values().map(depth).max().unwrap_or(0),
        // Nothing has been remembered of what has no origin, so nothing hangs on it.
        other => origin_of(other).map_or(0, |origin| origin.depth),
    }
}

/// Lets what a call has just made know the call.
pub(super) fn remember(made: &mut Value, call: &Rc<Call>) {
    // What others hold already was made by another call.
    match made {
        Value::Reaction(one) => Rc::get_mut(one).into_iter().for_each(|one| one.made_by(call)),
        Value::Substance(one) => Rc::get_mut(one).into_iter().for_each(|one| one.made_by(call)),
        Value::Molecule(one) => Rc::get_mut(one).into_iter().for_each(|one| one.made_by(call)),
        Value::Crystal(one) => Rc::get_mut(one).into_iter().for_each(|one| one.made_by(call)),
        Value::Stream(one) => Rc::get_mut(one).into_iter().for_each(|one| one.origin = Origin::of(call)),
        _ => {}
    }
}

#[cfg(test)]
mod tests {
    use std::cell::Cell;

    use super::*;
    use crate::model::CARDS;
    use crate::model::card::{Cx, References, call};
    use crate::units::constants;

    #[test]
    fn a_chain_of_things_is_remembered_up_to_a_length_and_let_go_of_without_trouble() {
        let references = References::new(constants::current());
        let ordinal = Cell::new(0);
        let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
        let card = |id: &str| *CARDS.iter().find(|card| card.id == id).unwrap();
        let taken = CARDS.iter().find(|card| card.name == "taken").unwrap();
        let mut molecule = call(&cx, card("molecule.read"), vec![Value::Text("CO2".into())]).unwrap();
        for nth in 1..=2 * DEEPEST {
            // One beyond the longest chain is forgotten, and the next begins a chain of its own.
            let depth = origin_of(&molecule).map(|origin| origin.depth);
            assert_eq!(depth, Some(nth % (DEEPEST + 1)).filter(|depth| *depth > 0), "{nth}");
            let way = Value::Options(Rc::new([("vibration".to_owned(), Value::Text("harmonic".into()))].into()));
            molecule = call(&cx, taken, vec![molecule, way]).unwrap();
        }
    }
}
