//! The conditions a value holds under, in one line, and the symbol it is written with.

use std::sync::Arc;

use crate::chem::species::State as Aggregate;
use crate::model::card::{Call, Cx, Value, call_of};
use crate::model::path;
use crate::model::plant::words;
use crate::model::pressure::{self, AtPressure};
use crate::model::property::{self, Property};
use crate::model::terms::{Term, Terms};
use crate::quantity::Quantity;
use crate::quantity::{round, text};
use crate::record::node;
use crate::units::{What, Zero};

/// `723.15 K, 1 bar, each species pure, in its standard state, gases ideal`, with the phases that changed on the way; empty
/// for plain values.
pub fn line(cx: &Cx, value: &Quantity) -> String {
    if let Some(words) = call_of(value.node()).and_then(words::conditions) {
        return words;
    }
    let Some(state) = value.kind().state() else { return String::new() };
    let mut parts = Vec::new();
    match state.t_k {
        Some(t_k) => parts.push(temperature(value, t_k)),
        None => parts.push("temperature: not one value".to_owned()),
    }
    match state.p_pa {
        // Seven digits: past them there is rounding of a computed vapour pressure alone.
        Some(p_pa) => {
            let bar = p_pa / 1e5;
            parts.push(format!("{} bar", round::shortest(round::significant(bar, 7).parse().unwrap_or(bar))));
        }
        None => parts.push("pressure: not one value".to_owned()),
    }
    let terms = node::history(value.node()).into_iter().filter_map(|node| call_of(&node).map(species_states));
    let (gas, pure, solute) = terms.fold((false, false, false), |a, b| (a.0 || b.0, a.1 || b.1, a.2 || b.2));
    if state.standard {
        if pure || !solute {
            let ideal = if gas { ", gases ideal" } else { "" };
            parts.push(format!("each species pure, in its standard state{ideal}"));
        }
        if solute {
            parts.push("each solute in its ideal solution of 1 mol/kg".to_owned());
        }
    }
    if !state.standard {
        parts.extend(call_of(value.node()).and_then(|call| under_pressure(cx, call)));
    }
    for node in node::history(value.node()) {
        for condition in call_of(&node).and_then(Call::terms).map(Terms::conditions).unwrap_or_default() {
            if !parts.contains(&condition) {
                parts.push(condition);
            }
        }
    }
    let per_substance = call_of(value.node()).is_some_and(|call| {
        matches!(call.args.first(), Some(Value::Substance(_) | Value::Molecule(_) | Value::Crystal(_)))
    });
    if let (Some(zero), true) = (&state.zero, per_substance) {
        parts.push(format!("counted from {zero}"));
    }
    let line = parts.join(", ");
    std::iter::once(line).chain(changed_phases(cx, value)).collect::<Vec<_>>().join("; ")
}

/// `Fe(cr,alpha) is Fe(cr,gamma), changed at 1184 K`, of every step that inserted a change of phase, each once.
fn changed_phases(cx: &Cx, value: &Quantity) -> Vec<String> {
    let mut all: Vec<String> = Vec::new();
    for node in node::history(value.node()) {
        let Some(call) = call_of(&node) else { continue };
        let Some(terms) = call.terms() else { continue };
        let temperatures = call.args.iter().filter_map(|arg| match arg {
            Value::Quantity(t) if t.kind().what.is_temperature() => Some(t.si()),
            _ => None,
        });
        let routes = temperatures.flat_map(|t_k| path::crossings(terms, t_k, cx.data()));
        for words in routes.filter_map(|(_, route)| route.words()) {
            if !all.contains(&words) {
                all.push(words);
            }
        }
    }
    all
}

/// How a property was taken at its pressure, and how large its terms in pressure are.
fn under_pressure(cx: &Cx, call: &Call) -> Option<String> {
    let (property, terms, t_k) = (Property::of(call.card)?, call.terms()?, call.quantity(1).si());
    let method = property::method_of(call, cx).ok()?;
    let given = method.given.as_ref()?;
    let at = property::at_pressure(terms, t_k, &method, cx).ok()?;
    let r = cx.constants().molar_gas.value;
    let mut words = Vec::new();
    if given.partial.is_empty() {
        words.push("each species pure".to_owned());
    } else {
        let one = |(id, p): (&Arc<str>, &Quantity)| format!("{id} {}", text::shown_plain(p));
        words.push(format!("partial pressures {}", given.partial.iter().map(one).collect::<Vec<_>>().join(", ")));
    }
    let (gas, _, solute) = species_states(call);
    if gas {
        words.push(if given.virial { "gases by second virial coefficients" } else { "gases ideal" }.to_owned());
    }
    let condensed = |term: &Term| !matches!(term.substance.species.phase.state, Aggregate::Gas | Aggregate::Aqueous);
    if !given.volumes && terms.terms().iter().any(condensed) {
        words.push("volume of liquids and solids neglected".to_owned());
    }
    if solute {
        words.push("each solute in its ideal solution of 1 mol/kg".to_owned());
    }
    let sum = |of: &dyn Fn(&AtPressure) -> f64| -> f64 {
        at.iter().zip(terms.terms()).map(|(at, term)| term.nu * of(at)).sum()
    };
    let size = |si: f64, unit: &str| {
        let figure = round::significant(if unit == "kJ/mol" { si / 1000.0 } else { si }, 3);
        let sign = if figure.starts_with('-') || si == 0.0 { "" } else { "+" };
        format!("{sign}{figure} {unit}")
    };
    let moved = |property| sum(&|at: &AtPressure| pressure::departure(property, &at.matter, t_k, at.p_pa, r).si);
    let pv = sum(&|at: &AtPressure| at.p_pa * pressure::volume(&at.matter, t_k, at.p_pa, r));
    words.push(match property {
        Property::H => format!("V dP term {}", size(moved(Property::H), "kJ/mol")),
        Property::U => {
            format!("V dP term {}, pV term {}", size(moved(Property::H), "kJ/mol"), size(pv, "kJ/mol"))
        }
        Property::G | Property::K => format!("V dP term {}", size(moved(Property::G), "kJ/mol")),
        Property::A => {
            format!("V dP term {}, pV term {}", size(moved(Property::G), "kJ/mol"), size(pv, "kJ/mol"))
        }
        Property::S | Property::Cp => format!("moved by pressure {}", size(moved(property), "J/(K mol)")),
    });
    Some(words.join(", "))
}

/// Whether a call's species are gases, pure phases of any sort, and solutes.
fn species_states(call: &Call) -> (bool, bool, bool) {
    let Some(terms) = call.terms() else { return (false, false, false) };
    let states = || terms.terms().iter().map(|term| term.substance.species.phase.state);
    let solute = |state| state == Aggregate::Aqueous;
    (states().any(|s| s == Aggregate::Gas), states().any(|s| !solute(s)), states().any(solute))
}

/// The temperature, with its uncertainty where it states one. Ten digits: past them there is rounding of scales alone.
fn temperature(value: &Quantity, t_k: f64) -> String {
    let asked = call_of(value.node()).and_then(|call| match call.args.get(1) {
        Some(Value::Quantity(t)) if t.si() == t_k => t.spread().u(),
        _ => None,
    });
    match asked.filter(|u| *u > 0.0) {
        Some(u) => format!("{} K", round::with_brackets(t_k, u)),
        None => format!("{} K", rounded(t_k)),
    }
}

fn rounded(t_k: f64) -> String {
    round::shortest(round::significant(t_k, 10).parse().unwrap_or(t_k))
}

/// The reactions and substances a value was computed from, as written, each once.
pub fn about(value: &Quantity) -> Vec<String> {
    let mut texts: Vec<String> = Vec::new();
    for node in node::history(value.node()) {
        let Some(call) = call_of(&node) else { continue };
        let own = call.terms().map(|terms| terms.text().to_owned());
        for text in own.into_iter().chain(words::about(call)) {
            if !texts.contains(&text) {
                texts.push(text);
            }
        }
    }
    texts
}

/// The symbol of the IUPAC Green Book for what a formula gave: `ΔrH°` for a reaction enthalpy. Arithmetic on state functions
/// has none: twice a reaction enthalpy, or its negative, is not the enthalpy of the reaction as written.
pub fn symbol(value: &Quantity) -> String {
    let what = value.kind().what;
    let Some(call) = call_of(value.node()) else {
        return if matches!(what, What::PV | What::TS) { what.symbol().to_owned() } else { String::new() };
    };
    if let Some(Zero::From(from_k)) = value.kind().state().and_then(|state| state.zero.as_ref()) {
        let (r, t_k) = (
            if call.terms().is_some_and(Terms::is_reaction) { "Δr" } else { "" },
            value.kind().state().and_then(|s| s.t_k),
        );
        let of = if what == What::G { "G°" } else { "H" };
        let from = if what == What::G { "H°" } else { "H" };
        return t_k.map_or_else(String::new, |t_k| {
            format!("{r}{of}({} K) - {r}{from}({} K)", rounded(t_k), rounded(*from_k))
        });
    }
    match &call.args[..] {
        [Value::Reaction(_), ..] if what == What::K || what.is_temperature() => what.symbol().to_owned(),
        [Value::Substance(_), ..] if call.card.id == crate::model::vapour::VAPORISATION_ENTHALPY.id => {
            "ΔvapH".to_owned()
        }
        // A leg of a cycle is no property of the reaction.
        [Value::Reaction(_), ..] if what == What::Plain => String::new(),
        [Value::Reaction(_), ..] => {
            let standard = value.kind().state().is_some_and(|state| state.standard);
            format!("Δr{}{}", what.symbol(), if standard { "°" } else { "" })
        }
        [Value::Substance(_) | Value::Molecule(_) | Value::Crystal(_), ..] => {
            let standard = value.kind().state().is_some_and(|state| state.standard);
            format!("{}{}", what.symbol(), if standard { "°" } else { "" })
        }
        // A formula that hands its value on, per mole of something else or with an assumption attached.
        [Value::Quantity(inner), ..] if inner.kind().what == what => symbol(inner),
        // A heat or a temperature that a formula gave, not one that arithmetic made.
        _ if call.card.caution.is_some() => what.symbol().to_owned(),
        _ => String::new(),
    }
}
