//! What the conversion between vessels and the gas of a vessel rest on.

use std::rc::Rc;
use std::sync::Arc;

use super::pressure::{Sorted, names, of, reasons, sorted};
use crate::chem::species::{Species, State as Aggregate};
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::{Call, Cx, Value};
use crate::model::gather::Method;
use crate::model::given::Given;
use crate::model::pressure::{self, AtPressure, Matter};
use crate::model::property::{self, Property};
use crate::model::vessel::{self, Rest};
use crate::quantity::{Quantity, round};
use crate::record::node::Node;
use crate::record::register::{Finding, Tested};
use crate::units::constants::STANDARD_PRESSURE;

/// The same formula asked in another way.
fn rerun(cx: &Cx, call: Call) -> Result<Rc<Node>, Fault> {
    let run = call.card.run;
    match run(cx, &Rc::new(call))? {
        Value::Quantity(value) => Ok(Rc::clone(value.node())),
        other => unreachable!("a vessel's formula gives a quantity, not {}", other.sort()),
    }
}

/// The states in which a call's species stand: one for a volume of gas, two for a conversion between vessels.
fn states(cx: &Cx, call: &Call) -> Option<Vec<Vec<AtPressure>>> {
    if call.card.id == vessel::GAS_EVOLVED.id {
        let given = Given::of(call, cx).ok()?.unwrap_or_else(Given::standard);
        let (t_k, r) = (call.quantity(2).si(), cx.constants().molar_gas.value);
        let terms = call.terms()?.terms().iter();
        let at: Result<_, Fault> = terms.map(|term| pressure::resolve(&term.substance, t_k, &given, r)).collect();
        return Some(vec![at.ok()?]);
    }
    let vessels = vessel::vessels(cx, call).ok()?;
    Some(vec![vessels.cell, vessels.open])
}

fn is_virial(call: &Call) -> bool {
    call.option("gas").is_some_and(|word| **word == *"virial")
}

/// Gases of both states, each once: a gas too dense in one of them is too dense.
fn gases<'a>(cx: &Cx, call: &'a Call) -> Option<Sorted<'a>> {
    let terms = call.terms()?;
    let all = of(terms, Species::is_gas);
    let mut whole = Sorted::default();
    for at in states(cx, &call.with_option("gas", "virial"))? {
        let one = sorted(cx, &all, &at, call.quantity(2).si());
        for (id, why) in one.dense {
            if !whole.dense.iter().any(|(known, _)| *known == id) {
                whole.dense.push((id, why));
            }
        }
        if whole.lacking.is_empty() {
            whole.lacking = one.lacking;
        }
        for (substance, share) in one.thin {
            match whole.thin.iter_mut().find(|(known, _)| known.id() == substance.id()) {
                Some((_, known)) => *known = known.max(share),
                None => whole.thin.push((substance, share)),
            }
        }
        whole.citations.extend(one.citations);
        whole.estimated |= one.estimated;
    }
    whole.thin.retain(|(substance, _)| !whole.dense.iter().any(|(id, _)| *id == substance.id()));
    whole.citations.dedup();
    Some(whole)
}

/// `ideal-gas`: against the second virial coefficients; broken where the gas is too dense for them.
pub fn vessel_ideal(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(gases) = gases(cx, call) else { return Vec::new() };
    let t_k = call.quantity(2).si();
    let row = |subject: String, tested| Finding::known("ideal-gas", subject, value.node(), Some(t_k), tested);
    let mut findings = Vec::new();
    if !gases.lacking.is_empty() {
        let what = format!("no second virial coefficient: {}", reasons(&gases.lacking));
        findings.push(row(names(gases.lacking.iter().map(|(id, _)| *id)), Tested::Missing { what }));
    }
    if is_virial(call) {
        return findings;
    }
    if !gases.dense.is_empty() {
        let why = reasons(&gases.dense);
        findings.push(row(names(gases.dense.iter().map(|(id, _)| *id)), Tested::False { why, value: None }));
    }
    if !gases.thin.is_empty() {
        let subject = names(gases.thin.iter().map(|(substance, _)| substance.id()));
        let estimated = if gases.estimated { ", in part by corresponding states" } else { "" };
        let tested = match rerun(cx, call.with_option("gas", "virial")) {
            _ if !gases.dense.is_empty() => {
                Tested::Missing { what: "beside a gas that is too dense it is not priced alone".to_owned() }
            }
            Ok(value) => Tested::Better { value, how: format!("second virial coefficients{estimated}") },
            Err(fault) => Tested::Missing { what: fault.message().to_owned() },
        };
        findings.push(Finding { sources: gases.citations, ..row(subject, tested) });
    }
    findings
}

/// `second-virial`: broken where |B|p/RT passes 0.15 in either vessel, or above the vapour pressure.
pub fn vessel_virial(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    if !is_virial(call) {
        return Vec::new();
    }
    let Some(gases) = gases(cx, call) else { return Vec::new() };
    let t_k = call.quantity(2).si();
    let row = |subject: String, tested| Finding::known("second-virial", subject, value.node(), Some(t_k), tested);
    let mut findings = Vec::new();
    if !gases.dense.is_empty() {
        let why = reasons(&gases.dense);
        findings.push(row(names(gases.dense.iter().map(|(id, _)| *id)), Tested::False { why, value: None }));
    }
    if !gases.thin.is_empty() {
        let subject = names(gases.thin.iter().map(|(substance, _)| substance.id()));
        let one = |(substance, share): &(&Arc<Substance>, f64)| {
            format!("{} for {}", round::significant(*share, 2), substance.id())
        };
        let how = format!("|B|p/RT is {}", gases.thin.iter().map(one).collect::<Vec<_>>().join(", "));
        findings.push(Finding { sources: gases.citations, ..row(subject, Tested::True { how }) });
    }
    findings
}

/// `condensed-volume-neglected`: untested for phases whose volume is not on record, priced where it was asked to be left out.
pub fn vessel_volumes(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(terms) = call.terms() else { return Vec::new() };
    let counted = call.with_option("volume", "counted");
    let Ok(vessels) = vessel::vessels(cx, &counted) else { return Vec::new() };
    let t_k = call.quantity(2).si();
    let row = |subject: String, tested| {
        Finding::known("condensed-volume-neglected", subject, value.node(), Some(t_k), tested)
    };
    let phases = of(terms, |species| !species.is_gas());
    let mut findings = Vec::new();
    let lacking: Vec<(&str, String)> =
        phases.iter().filter_map(|(nth, phase, _)| Some((phase.id(), vessels.cell[*nth].lacks.clone()?))).collect();
    if !lacking.is_empty() {
        let what = reasons(&lacking);
        findings.push(row(names(lacking.iter().map(|(id, _)| *id)), Tested::Missing { what }));
    }
    let known = || phases.iter().filter(|(nth, ..)| matches!(vessels.cell[*nth].matter, Matter::Condensed(_)));
    if call.option("volume").is_some_and(|word| **word == *"neglected") && known().next().is_some() {
        let subject = names(known().map(|(_, phase, _)| phase.id()));
        let sources = known().filter_map(|(nth, ..)| vessels.cell[*nth].citation.clone()).collect();
        let tested = match rerun(cx, counted) {
            Ok(value) => Tested::Better { value, how: "their volumes".to_owned() },
            Err(fault) => Tested::Missing { what: fault.message().to_owned() },
        };
        findings.push(Finding { sources, ..row(subject, tested) });
    }
    findings
}

/// `ideal-gas` of the pressure in a closed vessel: against the second virial coefficients of the gases that are formed.
pub fn vessel_gas(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let (Some(terms), Some(gas)) = (call.terms(), vessel::filled(cx, call)) else { return Vec::new() };
    let (t_k, v_m3, r) = (call.quantity(2).si(), call.quantity(3).si(), cx.constants().molar_gas.value);
    let formed: Vec<_> = of(terms, Species::is_gas).into_iter().filter(|(.., nu)| *nu > 0.0).collect();
    let given = Given { virial: true, total: Some(value.clone()), ..Given::standard() };
    let at: Result<Vec<AtPressure>, Fault> =
        terms.terms().iter().map(|term| pressure::resolve(&term.substance, t_k, &given, r)).collect();
    let Ok(at) = at else { return Vec::new() };
    let sorted = sorted(cx, &formed, &at, t_k);
    let row = |subject: String, tested| Finding::known("ideal-gas", subject, value.node(), Some(t_k), tested);
    let mut findings = Vec::new();
    if !sorted.lacking.is_empty() {
        let what = format!("no second virial coefficient: {}", reasons(&sorted.lacking));
        findings.push(row(names(sorted.lacking.iter().map(|(id, _)| *id)), Tested::Missing { what }));
    }
    if !sorted.dense.is_empty() {
        let why = reasons(&sorted.dense);
        findings.push(row(names(sorted.dense.iter().map(|(id, _)| *id)), Tested::False { why, value: None }));
    } else if sorted.lacking.is_empty() && !sorted.thin.is_empty() {
        let subject = names(sorted.thin.iter().map(|(substance, _)| substance.id()));
        let share = |nth: usize| match at[nth].matter {
            Matter::Virial(b) => b[0],
            _ => 0.0,
        };
        let nu: f64 = formed.iter().map(|(.., nu)| nu).sum();
        let b: f64 = formed.iter().map(|(nth, _, nu)| nu * share(*nth)).sum::<f64>() / nu;
        let n = gas.n0 + gas.formed;
        let better = n * r * t_k / (v_m3 - n * b);
        let how = "against the second virial coefficients of what is formed, taken for all the gas".to_owned();
        let tested = Tested::Given { price: value.si() - better, how };
        findings.push(Finding { sources: sorted.citations, ..row(subject, tested) });
    }
    findings
}

/// `complete-conversion`: against the extent at which the reaction comes to rest, its gases ideal and its reactants in the
/// amounts of the equation.
pub fn complete_conversion(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(terms) = call.terms() else { return Vec::new() };
    let (t_k, r) = (call.quantity(2).si(), cx.constants().molar_gas.value);
    let row = |tested| Finding::known("complete-conversion", terms.text(), value.node(), Some(t_k), tested);
    let solute = |species: &Species| species.phase.state == Aggregate::Aqueous;
    if terms.terms().iter().any(|term| solute(&term.substance.species)) {
        return vec![row(Tested::Missing { what: "the amount of solution is not known".to_owned() })];
    }
    let Ok(method) = Method::from_words(None, None, cx.data()) else { return Vec::new() };
    let g = match property::number(Property::G, terms, t_k, &method, cx) {
        Ok(g) => g,
        Err(fault) => return vec![row(Tested::Missing { what: fault.message().to_owned() })],
    };
    let n = call.quantity(1).si();
    let (at, formed) = if call.card.id == vessel::GAS_EVOLVED.id {
        let p_pa = call.option_quantity("pressure").map_or(STANDARD_PRESSURE.value, Quantity::si);
        (Rest::Open { p_pa }, value.si())
    } else {
        let per_mole_pa = n * r * t_k / call.quantity(3).si();
        (Rest::Closed { per_mole_pa }, per_mole_pa * terms.delta_n_gas())
    };
    let share = vessel::share_at_rest(terms, -g / (r * t_k), at);
    let percent = round::significant(100.0 * share, 3);
    let tested = if share > 1.0 - 1e-9 {
        Tested::True { how: format!("lg K° is {}, and the reaction goes to its end", round::fixed(lg(g, r, t_k), 1)) }
    } else {
        let how = format!("against rest at {percent} % of the extent, reactants in the amounts of the equation");
        Tested::Given { price: formed * (1.0 - share), how }
    };
    vec![row(tested)]
}

fn lg(g: f64, r: f64, t_k: f64) -> f64 {
    -g / (r * t_k) / std::f64::consts::LN_10
}
