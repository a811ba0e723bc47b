//! Asks the program as a cell of a notebook would, for tests that compare answers.
//!
//! A [`Desk`] holds what a session holds: catalogue, constants and the count of evaluations, so that values of one desk
//! share their inputs.

use std::cell::Cell;
use std::collections::BTreeMap;
use std::rc::Rc;

use hessbook::fault::Fault;
use hessbook::model::card::{self, Card, Cx, References, Value};
use hessbook::model::reaction::REACTION;
use hessbook::quantity::Quantity;
use hessbook::units::constants;

pub struct Desk {
    references: References,
    ordinal: Cell<u64>,
}

impl Desk {
    pub fn new() -> Desk {
        Desk { references: References::new(constants::current()), ordinal: Cell::new(0) }
    }

    pub fn cx(&self) -> Cx<'_> {
        Cx { references: &self.references, place: None, ordinal: &self.ordinal, halted: &|| None }
    }

    /// A property of a reaction, asked with texts as in a script.
    pub fn ask(
        &self,
        property: &'static Card,
        equation: &str,
        t: &str,
        options: &[(&str, &str)],
    ) -> Result<Quantity, Fault> {
        let reaction = card::call(&self.cx(), &REACTION, vec![Value::Text(equation.into())])?;
        let options: BTreeMap<String, Value> =
            options.iter().map(|(name, word)| ((*name).to_owned(), Value::Text((*word).into()))).collect();
        let given = vec![reaction, Value::Text(t.into()), Value::Options(Rc::new(options))];
        match card::call(&self.cx(), property, given)? {
            Value::Quantity(value) => Ok(value),
            other => panic!("{} gives {}", property.id, other.sort()),
        }
    }
}
