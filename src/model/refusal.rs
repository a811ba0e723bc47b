//! What lies between two values that may not be added, in figures: the pV or TS term, the change with temperature, the
//! missing increment.
//!
//! A refusal names the way out in words; where both values come from formulas over the same species, the figure itself can
//! be computed, and saves the analyst a cell.

use crate::model::card::{Call, Cx, call_of};
use crate::model::function;
use crate::model::property::{self, Property};
use crate::model::terms::Terms;
use crate::quantity::{Mismatch, Quantity};
use crate::units::{self, KindMismatch, What, Zero};

/// The missing figure in words, where it can be computed.
pub fn figure(cx: &Cx, left: &Quantity, right: &Quantity, mismatch: &Mismatch) -> Option<String> {
    let Mismatch::Kinds(kinds) = mismatch else { return None };
    let (a, b) = (asked(left)?, asked(right)?);
    if a.terms.text() != b.terms.text() {
        return None;
    }
    match kinds {
        KindMismatch::StateFunctions { .. } if a.t_k == b.t_k => {
            let (x, y) = (left.kind().what, right.kind().what);
            let gap = left.si() - right.si();
            let t_k = a.t_k;
            Some(format!("here, at {t_k} K, {} - {} = {}", x.symbol(), y.symbol(), shown(gap, left)))
        }
        KindMismatch::ReactionTemperatures { left_k, right_k, .. } => {
            let (property, method) = (a.property?, property::method_of(a.call, cx).ok()?);
            let at = |t_k| property::number(property, a.terms, t_k, &method, cx).ok();
            let change = at(*right_k)? - at(*left_k)?;
            let symbol = left.kind().what.symbol();
            Some(format!("here Δr{symbol} changes by {} from {left_k} K to {right_k} K", shown(change, left)))
        }
        KindMismatch::Zeros { left: zero_a, right: zero_b, .. } => {
            let (from, to) = (start(zero_a), start(zero_b));
            let record = &a.terms.terms().first()?.substance;
            let function = record.function.as_ref().filter(|f| f.covers(from) && f.covers(to))?;
            let increment = function::evaluate(function, to).h - function::evaluate(function, from).h;
            if increment == 0.0 {
                return None;
            }
            Some(format!("here H({to} K) - H({from} K) of {} is {}", record.id(), shown(increment, left)))
        }
        _ => None,
    }
}

struct Asked<'a> {
    call: &'a Call,
    terms: &'a Terms,
    property: Option<Property>,
    t_k: f64,
}

fn asked(value: &Quantity) -> Option<Asked<'_>> {
    let call = call_of(value.node())?;
    Some(Asked {
        call,
        terms: call.terms()?,
        property: Property::of(call.card),
        t_k: value.kind().state().and_then(|state| state.t_k)?,
    })
}

/// The temperature a zero is at; formation enthalpies count from 298.15 K.
fn start(zero: &Zero) -> f64 {
    match zero {
        Zero::From(t_k) => *t_k,
        Zero::Elements0 => 0.0,
        Zero::Elements298 | Zero::ElementsAtT | Zero::Named(_) => function::T_REFERENCE,
    }
}

fn shown(si: f64, like: &Quantity) -> String {
    let unit = units::unit_for(like.dim());
    let decimals = if like.kind().what == What::S || like.kind().what == What::Cp { 2 } else { 3 };
    format!("{:.decimals$} {}", unit.from_si(si), units::reader_text(&unit))
}
