//! The conditions a value holds under, in one line, and the symbol it is written with.

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

/// The symbol of the IUPAC Green Book: `ΔrH°` for a reaction enthalpy, `H` for an enthalpy, empty for a plain value.
pub fn symbol(value: &Quantity) -> String {
    let what = value.kind().what;
    let symbol = what.symbol();
    let reaction = value.dim().is_per_reaction();
    let standard = value.kind().state().is_some_and(|state| state.standard);
    match what {
        What::U | What::H | What::A | What::G | What::S | What::Cp | What::Cv => {
            format!("{}{symbol}{}", if reaction { "Δr" } else { "" }, if standard { "°" } else { "" })
        }
        _ => symbol.to_owned(),
    }
}
