//! The conditions a value holds under, in one line, and the symbol it is written with.

use crate::model::card::{Value, call_of};
use crate::quantity::Quantity;
use crate::quantity::round;
use crate::units::What;

/// `723.15 K, 1 bar, each species pure, in its standard state`; empty for plain values.
pub fn line(value: &Quantity) -> String {
    let Some(state) = value.kind().state() else { return String::new() };
    let mut parts = Vec::new();
    match state.t_k {
        Some(t_k) => parts.push(format!("{} K", round::shortest(t_k))),
        None => parts.push("temperature: not one value".to_owned()),
    }
    match state.p_pa {
        Some(p_pa) => parts.push(format!("{} bar", round::shortest(p_pa / 1e5))),
        None => parts.push("pressure: not one value".to_owned()),
    }
    if state.standard {
        parts.push("each species pure, in its standard state".to_owned());
    }
    if let (Some(zero), false) = (&state.zero, value.dim().is_per_reaction() || value.kind().what == What::K) {
        parts.push(format!("counted from {zero}"));
    }
    parts.join(", ")
}

/// The symbol of the IUPAC Green Book for what a formula gave: `ΔrH°` for a reaction enthalpy. Arithmetic on state functions
/// has none: twice a reaction enthalpy, or its negative, is not the enthalpy of the reaction as written.
pub fn symbol(value: &Quantity) -> String {
    let what = value.kind().what;
    let Some(call) = call_of(value.node()) else {
        return if matches!(what, What::PV | What::TS) { what.symbol().to_owned() } else { String::new() };
    };
    match &call.args[..] {
        [Value::Reaction(_), ..] if what == What::K => what.symbol().to_owned(),
        [Value::Reaction(_), ..] => {
            let standard = value.kind().state().is_some_and(|state| state.standard);
            format!("Δr{}{}", what.symbol(), if standard { "°" } else { "" })
        }
        // A formula that hands its value on, per mole of something else or with an assumption attached.
        [Value::Quantity(inner), ..] if inner.kind().what == what => symbol(inner),
        _ => String::new(),
    }
}
