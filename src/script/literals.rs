//! Numbers with a unit behind them: `450.0.K`, `-10.0.degC`, `1.5.bar`.
//!
//! The engine wants a function for each such property, and there are well over a thousand spellings of units, so they are
//! made when a cell first writes them ([`Literals::provide`]): all at once would be most of the time a session takes to
//! start.

use std::collections::BTreeSet;

use rhai::{Engine, NativeCallContext};

use crate::fault::Fault;
use crate::quantity::{Quantity, text};
use crate::script::bind::Native;
use crate::script::fault::raise;
use crate::script::state::{Shared, place_of};
use crate::script::token::{Kind, tokens};
use crate::units::{parse, table};

/// The units that an engine knows as properties of numbers.
#[derive(Default)]
pub struct Literals {
    known: BTreeSet<String>,
}

impl Literals {
    /// Teaches the engine the units that stand behind a dot in a cell's text.
    pub fn provide(&mut self, engine: &mut Engine, shared: &Shared, code: &str) {
        if !code.contains('.') {
            return;
        }
        let words = tokens(code).0;
        for (before, word) in words.iter().zip(words.iter().skip(1)) {
            let property = before.is(".") && word.kind == Kind::Word;
            if property && !self.known.contains(word.text) && table::lookup(word.text).is_some() {
                register(engine, shared, word.text);
                self.known.insert(word.text.to_owned());
            }
        }
    }

    /// Teaches an engine built anew what the one before knew.
    pub fn repeat(&self, engine: &mut Engine, shared: &Shared) {
        self.known.iter().for_each(|spelling| register(engine, shared, spelling));
    }
}

fn register(engine: &mut Engine, shared: &Shared, spelling: &str) {
    let (session, unit) = (shared.clone(), spelling.to_owned());
    engine.register_get(spelling, move |context: NativeCallContext<'_>, number: &mut i64| {
        literal(&context, &session, *number as f64, &unit)
    });
    let (session, unit) = (shared.clone(), spelling.to_owned());
    engine.register_get(spelling, move |context: NativeCallContext<'_>, number: &mut f64| {
        literal(&context, &session, *number, &unit)
    });
}

fn literal(context: &NativeCallContext<'_>, shared: &Shared, number: f64, spelling: &str) -> Native<Quantity> {
    let place = place_of(context);
    let ordinal = shared.state_mut().next_ordinal();
    let made = parse::unit(spelling)
        .map_err(Fault::from)
        .and_then(|unit| text::from_number(number, unit, place.clone(), ordinal).map_err(Fault::from));
    made.map_err(|fault| raise(fault.at(place)))
}
