//! Tests of what a computed or estimated heat capacity of a crystal leans on, each against a published function.
//!
//! The surprise: there is no better model to compute, so where a function of the same crystal is shipped, the whole gap to
//! it is the price, whichever approximation it is of.

use std::rc::Rc;

use crate::data::function::Function;
use crate::data::substance::Substance;
use crate::model::card::{Call, Cx, Value};
use crate::model::function;
use crate::model::molecule::answers::Asked;
use crate::model::solid::answers::crystal_of;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey};
use crate::record::register::{Finding, Tested};
use crate::units::Kind;

/// `debye-model`: against the published function of the crystal.
pub fn debye_model(_: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let crystal = crystal_of(call);
    let Some(asked) = Asked::of(call.card) else { return Vec::new() };
    let t_k = call.quantity(1).si();
    let from_k = match call.args.get(2) {
        Some(Value::Quantity(from)) => from.si(),
        _ => function::T_REFERENCE,
    };
    let needed: &[f64] = if asked.needs_start() { &[t_k, from_k] } else { &[t_k] };
    let tested = match reaching(&crystal.substance, needed) {
        Some(_) if asked == Asked::Cv => {
            Tested::Missing { what: "published functions are of Cp; Cv cannot be held against one".to_owned() }
        }
        Some(function) => {
            let at = |t: f64| function::evaluate(function, t);
            let si = match asked {
                Asked::Cp | Asked::Cv => at(t_k).cp,
                Asked::S => at(t_k).s,
                Asked::Increment => at(t_k).h - at(from_k).h,
                Asked::G => at(t_k).h - at(from_k).h - t_k * at(t_k).s,
            };
            better(function, si, t_k, value)
        }
        None => Tested::Missing {
            what: format!("no function of {} that reaches {} K is shipped", crystal.text(), needed[0]),
        },
    };
    vec![Finding::known("debye-model", crystal.text(), value.node(), Some(t_k), tested)]
}

/// `additive-estimate`: against the published heat capacity of the crystal at 298.15 K.
pub fn additive_estimate(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let formula = call.text(0);
    let recorded = cx.data().find(&format!("{formula}(cr)")).ok();
    let t_k = function::T_REFERENCE;
    let tested = match recorded.as_ref().and_then(|substance| reaching(substance, &[t_k])) {
        Some(function) => better(function, function::evaluate(function, t_k).cp, t_k, value),
        None => Tested::Missing {
            what: format!("no heat capacity of {formula}(cr) is shipped, or there are several forms"),
        },
    };
    vec![Finding::known("additive-estimate", formula.to_string(), value.node(), Some(t_k), tested)]
}

/// The function of a record that has entropies and reaches all these temperatures.
fn reaching<'a>(substance: &'a Substance, needed: &[f64]) -> Option<&'a Function> {
    let function = substance.function.as_deref()?;
    (function.zero.entropy && needed.iter().all(|t| function.covers(*t))).then_some(function)
}

fn better(function: &Function, si: f64, t_k: f64, value: &Quantity) -> Tested {
    let key = LeafKey::Datum {
        dataset: function.dataset.shared(),
        record: function.id.clone(),
        field: "published function",
        t_bits: t_k.to_bits(),
        way: "",
    };
    let input = Input { citation: Some(function.citation.clone()), ..Input::of(key) };
    match Quantity::input(si, value.dim().clone(), Kind::PLAIN, input, None) {
        Ok(made) => Tested::Better {
            value: Rc::clone(made.node()),
            how: format!(
                "the published function of {} ({}), so the whole gap, whichever approximation it is of",
                function.id, function.citation.source
            ),
        },
        Err(error) => Tested::Missing { what: error.to_string() },
    }
}
