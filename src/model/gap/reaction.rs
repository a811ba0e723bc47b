//! Mistakes about a reaction as a whole: which state function, which temperature, which pressure, per mole of what.

use std::rc::Rc;

use crate::model::card::{Value, call_of};
use crate::model::function::T_REFERENCE;
use crate::model::gap::candidate::{Candidate, Mistake, Scale};
use crate::model::gap::case::{Case, cited};
use crate::model::gap::{digits, whole};
use crate::model::gather::{self, Formation, HeatCapacity, Method};
use crate::model::property::Property;
use crate::model::reaction::Reaction;
use crate::num::math;
use crate::quantity::{Quantity, round, text};
use crate::record::node::{self, LeafKey};
use crate::source::Citation;
use crate::units;
use crate::units::constants::{STANDARD_ATMOSPHERE, STANDARD_PRESSURE};

/// What each mistake about the reaction would do.
pub fn candidates(case: &Case, out: &mut Vec<Candidate>) {
    pv_term(case, out);
    state_function(case, out);
    standard_pressure(case, out);
    temperature(case, out);
    heat_capacity(case, out);
    dataset(case, out);
}

/// Δn(gas)·R·T left out, put in, or of the wrong sign.
fn pv_term(case: &Case, out: &mut Vec<Candidate>) {
    let (toward, left, right) = match case.property {
        Property::H => (-1.0, "the internal energy", "the enthalpy"),
        Property::U => (1.0, "the enthalpy", "the internal energy"),
        Property::G => (-1.0, "the Helmholtz energy", "the Gibbs energy"),
        Property::A => (1.0, "the Gibbs energy", "the Helmholtz energy"),
        _ => return,
    };
    let Some(si) = case.evaluated(case.property, &case.contributions, case.delta_n()) else { return };
    let delta_n = case.delta_n();
    if delta_n == 0.0 {
        return;
    }
    let source = case.cx.constants().molar_gas.citation();
    let mut temperatures = vec![case.t_k];
    if case.t_k != T_REFERENCE {
        temperatures.push(T_REFERENCE);
    }
    for t_k in temperatures {
        let term = delta_n * case.r() * t_k;
        let at = format!("Δn(gas)·R·T with Δn(gas) = {delta_n} at {} K", round::shortest(t_k));
        let words = format!("{left} was taken for {right}: {at}");
        case.push(out, Mistake::PvTerm, words, Some(si + toward * term), [source.clone()]);
        let words = format!("{right} was made from {left} with the wrong sign of {at}");
        case.push(out, Mistake::PvTerm, words, Some(si + 2.0 * toward * term), [source.clone()]);
    }
}

/// The TΔS term forgotten.
fn state_function(case: &Case, out: &mut Vec<Candidate>) {
    let (other, words) = match case.property {
        Property::H => (Property::G, "the Gibbs energy was taken for the enthalpy"),
        Property::G => (Property::H, "the enthalpy was taken for the Gibbs energy"),
        Property::U => (Property::A, "the Helmholtz energy was taken for the internal energy"),
        Property::A => (Property::U, "the internal energy was taken for the Helmholtz energy"),
        _ => return,
    };
    let with = case.evaluated(other, &case.contributions, case.delta_n());
    let entropies = case.contributions.iter().filter_map(|contribution| contribution.entropy.as_ref());
    case.push(out, Mistake::StateFunction, words.to_owned(), with, cited(entropies));
}

/// Entropies of gases at 1 atm for those at 1 bar, R ln 1.01325 per mole of gas.
fn standard_pressure(case: &Case, out: &mut Vec<Candidate>) {
    let delta_n = case.delta_n();
    let Some(si) = case.evaluated(case.property, &case.contributions, delta_n) else { return };
    if delta_n == 0.0 {
        return;
    }
    let ln_ratio = math::ln(STANDARD_ATMOSPHERE.value / STANDARD_PRESSURE.value);
    let sources = || [STANDARD_ATMOSPHERE.citation(), case.cx.constants().molar_gas.citation()];
    let at_one_atmosphere = |turned: f64| {
        let shift = turned * delta_n * ln_ratio;
        Some(match case.property {
            Property::S => si - case.r() * shift,
            Property::G | Property::A => si + case.r() * case.t_k * shift,
            Property::K => si * math::exp(-shift),
            Property::H | Property::U | Property::Cp => return None,
        })
    };
    let words = format!("values at 1 atm were taken for values at 1 bar, Δn(gas) = {delta_n}");
    case.push(out, Mistake::StandardPressure, words, at_one_atmosphere(1.0), sources());
    let words = format!("the step from 1 atm to 1 bar was made the wrong way round, Δn(gas) = {delta_n}");
    case.push(out, Mistake::StandardPressure, words, at_one_atmosphere(-1.0), sources());
}

/// Degrees Celsius for kelvin, and digits of the temperature swapped.
fn temperature(case: &Case, out: &mut Vec<Candidate>) {
    let (offset, source) = whole::celsius_zero();
    // A difference of two decimals is off in the last bits, which nobody typed.
    let shown = |t: f64| format!("{t:.6}").trim_end_matches('0').trim_end_matches('.').to_owned();
    let (t_k, up, down) = (case.t_k, case.t_k + offset, case.t_k - offset);
    let words = format!("{} °C was taken where {} K was meant", shown(t_k), shown(t_k));
    case.push(out, Mistake::Celsius, words, case.number(up, &case.method), [source.clone()]);
    if down > 0.0 {
        let words = format!("{} K was taken where {} °C was meant", shown(down), shown(down));
        case.push(out, Mistake::Celsius, words, case.number(down, &case.method), [source.clone()]);
    }
    let typed = case.call.quantity(1).node().input();
    let Some(label) = typed.filter(|input| matches!(input.key, LeafKey::Typed { .. })).and_then(|i| i.label.as_ref())
    else {
        return;
    };
    for swapped in digits::swapped(label) {
        let Ok(other) = text::parse(&swapped, None, 0) else { continue };
        let words = format!("the temperature {label} was typed as {swapped}");
        case.push(out, Mistake::Digits, words, case.number(other.si(), &case.method), []);
    }
}

/// ΔCp held at one value, or no correction at all, where it was integrated, and the other way round.
fn heat_capacity(case: &Case, out: &mut Vec<Candidate>) {
    if case.t_k == T_REFERENCE {
        return;
    }
    let capacities = case.contributions.iter().filter_map(|contribution| contribution.cp.as_ref());
    let sources = cited(capacities);
    let modes = [
        (HeatCapacity::Full, "the heat capacities were integrated, and not held at one value"),
        (HeatCapacity::Constant, "ΔCp was held at its value at 298.15 K"),
        (HeatCapacity::Midpoint, "ΔCp was held at its value half-way to T"),
        (HeatCapacity::Mean, "ΔCp was held at the mean of its values at 298.15 K and T"),
        (HeatCapacity::Neglected, "enthalpies and entropies at 298.15 K were taken for those at T"),
    ];
    for (mode, words) in modes.into_iter().filter(|(mode, _)| *mode != case.method.heat_capacity) {
        let method = Method { heat_capacity: mode, ..case.method.clone() };
        case.push(out, Mistake::HeatCapacity, words.to_owned(), case.number(case.t_k, &method), sources.clone());
    }
    if (0..case.contributions.len()).any(|at| case.route(at).is_some()) {
        let method = Method { heat_capacity: HeatCapacity::Missed, ..case.method.clone() };
        let words =
            "the changes of phase on the way to T were left out, and Cp of the phases as written held on".to_owned();
        case.push(out, Mistake::PhaseChange, words, case.number(case.t_k, &method), sources.clone());
    }
    let words = "the value at 298.15 K was taken for the value at T".to_owned();
    case.push(out, Mistake::HeatCapacity, words, case.number(T_REFERENCE, &case.method), sources);
}

/// All formation enthalpies of another dataset.
fn dataset(case: &Case, out: &mut Vec<Candidate>) {
    if !case.property.uses_formation() {
        return;
    }
    let data = case.cx.data();
    for id in gather::covering(case.terms, data).into_iter().filter(|id| !case.datasets.iter().all(|used| used == id)) {
        let name = data.dataset(&id).map_or_else(|| id.to_string(), |dataset| dataset.short.to_string());
        let method = Method { formation: Formation::Of(id.clone()), ..case.method.clone() };
        let figures = gather::contributions(case.terms, case.t_k, &method, case.cx).unwrap_or_default();
        let sources = cited(figures.iter().map(|contribution| &contribution.formation));
        let words = format!("the formation enthalpies are those of {name}");
        case.push(out, Mistake::Dataset, words, case.number(case.t_k, &method), sources);
    }
}

/// A value per mole of another species than it says, by the numbers of the reaction it rests on.
pub fn per_mole(value: &Quantity, scale: Scale) -> Vec<Candidate> {
    let history = node::history(value.node());
    let reactions = history.iter().filter_map(|node| match &call_of(node)?.args[..] {
        [Value::Reaction(reaction), ..] => Some(Rc::clone(reaction)),
        _ => None,
    });
    let mut reactions: Vec<Rc<Reaction>> = reactions.collect();
    reactions.dedup_by(|a, b| a.text() == b.text());
    let (Some(y), [reaction]) = (scale.of(value.si()), &reactions[..]) else { return Vec::new() };
    let own = history.iter().rev().filter_map(|node| call_of(node)).find_map(|call| match &call.args[..] {
        [Value::Quantity(_), Value::Text(species)] if call.card.id == "quantity.per" => {
            let entity = units::entity(species)?;
            reaction.terms().iter().find(|term| term.substance.species.entity == entity).map(|term| term.nu.abs())
        }
        _ => None,
    });
    let now = own.unwrap_or(1.0);
    let said =
        own.map_or("per mole of reaction as written".to_owned(), |nu| format!("per mole of a species with ν = {nu}"));
    let source = Citation::new("IUPAC Green Book, 3rd ed., section 2.11.1", "from memory");
    let mut candidates = Vec::new();
    let mut push = |words: String, factor: f64| {
        if factor != 1.0 {
            let sources = vec![source.clone()];
            candidates.push(Candidate { mistake: Mistake::PerMole, words, predicted: y * (factor - 1.0), sources });
        }
    };
    push("the figure is per mole of reaction as written".to_owned(), now);
    for term in reaction.terms() {
        let (id, size) = (term.substance.id(), term.nu.abs());
        push(format!("the figure is per mole of {id}, ν = {}, and not {said}", term.nu), now / size);
        push(format!("the figure was multiplied by the number of {id}, ν = {}, once too often", term.nu), size);
    }
    candidates
}
