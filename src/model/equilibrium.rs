//! Where a reaction comes to rest: temperatures of ΔrG = 0, the reaction quotient, and the direction from a given state.
//!
//! ΔrG(T, p) = 0 at T_eq        dT_eq/dx = −(∂ΔrG/∂x)/(∂ΔrG/∂T),   ∂ΔrG/∂T = −ΔrS
//! Q = Π aᵢ^νᵢ       ΔrG = ΔrG°(T) + R T ln Q       aᵢ = pᵢ/p° of a gas, bᵢ/b° of a solute, 1 of a pure phase
//!
//! | symbol | unit     | meaning                                                     |
//! |--------|----------|-------------------------------------------------------------|
//! | Q      | 1        | reaction quotient; at equilibrium it is K°                   |
//! | pᵢ     | Pa       | partial pressure, the gases ideal; p° = 1 bar                |
//! | bᵢ     | mol/kg   | molality, the solution ideal; b° = 1 mol/kg                  |
//!
//! The surprise: a temperature of equilibrium is one node with implicit derivatives, so that its uncertainty is that of
//! ΔrG over ΔrS, and none of it is made by the search. A reaction can have several, or none.
//! Source: definitions; IUPAC Green Book, 3rd ed., section 2.11 (from memory).

use std::collections::BTreeMap;
use std::rc::Rc;
use std::sync::Arc;

use smallvec::{SmallVec, smallvec};
use thiserror::Error;

use crate::chem::species::State as Aggregate;
use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Sources, Takes, Value};
use crate::model::claims;
use crate::model::gather::Method;
use crate::model::given::{CONSTANTS, GAS, PARTIAL, PRESSURE, VOLUME};
use crate::model::property::{self, Property};
use crate::model::property_card;
use crate::model::shortcut;
use crate::model::terms::Terms;
use crate::num::{math, root};
use crate::quantity::Quantity;
use crate::record::node::{Node, Operator, Origin};
use crate::units::constants::STANDARD_PRESSURE;
use crate::units::{Base, Dimension, Kind, State, What};

/// Why there is no equilibrium to give.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum EquilibriumError {
    #[error(
        "ΔrG of {reaction} does not pass through 0 between {from_k} K and {to_k} K: it is {low} kJ/mol and {high} kJ/mol there"
    )]
    NoTemperature { reaction: String, from_k: f64, to_k: f64, low: String, high: String },
    #[error("the range from {from_k} K to {to_k} K is empty, or beyond the data of {reaction}, {t_min} K to {t_max} K")]
    Range { reaction: String, from_k: f64, to_k: f64, t_min: f64, t_max: f64 },
    #[error("no molality of {missing} is given, which {reaction} has as a solute")]
    MolalityMissing { missing: String, reaction: String },
    #[error("no partial pressure of {missing} is given, which {reaction} has as a gas")]
    PressureMissing { missing: String, reaction: String },
    #[error("`molality` names {name}, which is no solute of {reaction}")]
    NoSolute { name: String, reaction: String, known: String },
    #[error("the molality of {name} is not above zero")]
    MolalityNotPositive { name: String },
    #[error("Q of {reaction} is 10^{lg_q:.0}, beyond the range of numbers")]
    Overflow { reaction: String, lg_q: f64 },
}

impl Explain for EquilibriumError {
    fn code(&self) -> &'static str {
        match self {
            EquilibriumError::NoTemperature { .. } => "equilibrium-temperature-missing",
            EquilibriumError::Range { .. } => "equilibrium-range",
            EquilibriumError::MolalityMissing { .. } => "molality-missing",
            EquilibriumError::PressureMissing { .. } => "quotient-pressure-missing",
            EquilibriumError::NoSolute { .. } => "molality-of-no-solute",
            EquilibriumError::MolalityNotPositive { .. } => "molality-not-positive",
            EquilibriumError::Overflow { .. } => "reaction-quotient-out-of-range",
        }
    }

    fn hint(&self) -> String {
        match self {
            EquilibriumError::NoTemperature { .. } => {
                "where both are below 0 the reaction runs as written at every temperature in between, and where both are \
                 above, against it; widen the range, or state other pressures"
                    .to_owned()
            }
            EquilibriumError::Range { t_min, t_max, .. } => format!("give temperatures from {t_min} K to {t_max} K"),
            EquilibriumError::MolalityMissing { missing, .. } => {
                format!("add it, as in `molality: #{{ \"{missing}\": \"0.1 mol/kg\" }}`")
            }
            EquilibriumError::PressureMissing { missing, .. } => {
                format!("add it, as in `partial: #{{ \"{missing}\": \"1 bar\" }}`")
            }
            EquilibriumError::NoSolute { known, .. } => format!("it can be {known}"),
            EquilibriumError::MolalityNotPositive { .. } => {
                "a species that is not there makes Q zero or infinite: the reaction then runs towards it".to_owned()
            }
            EquilibriumError::Overflow { .. } => "check the powers of ten of the pressures and molalities".to_owned(),
        }
    }
}

const MOLALITY: Arg = Arg {
    name: "molality",
    takes: Takes::Named { unit: "mol/kg" },
    default: Default::Absent,
    doc: "molality of each solute of the reaction, by name",
};

const STATE_DOC: &str = "the state: partial pressures of the gases, molalities of the solutes";
const SOURCE: &str = "definitions; IUPAC Green Book, 3rd ed., section 2.11 (from memory)";

pub static EQUILIBRIUM_TEMPERATURE: Card = Card {
    id: "reaction.equilibrium-temperature",
    name: "equilibrium_temperature",
    on: On::Reaction,
    args: &[Arg {
        name: "options",
        takes: Takes::Options(&[
            Arg {
                name: "from",
                takes: Takes::Temperature,
                default: Default::Absent,
                doc: "lowest temperature to look at; the lowest of the data unless given",
            },
            Arg {
                name: "to",
                takes: Takes::Temperature,
                default: Default::Absent,
                doc: "highest temperature to look at; the highest of the data unless given",
            },
            property_card::HEAT_CAPACITY_OPTION,
            property_card::FORMATION_OPTION,
            PRESSURE,
            GAS,
            VOLUME,
            PARTIAL,
            CONSTANTS,
        ]),
        default: Default::NoOptions,
        doc: "where to look, and the state of the species",
    }],
    gives: "a list of all temperatures in the range at which ΔrG is 0, lowest first",
    doc: "Temperatures at which ΔrG is 0: of ΔrG°, where all species are in their standard states, or at the pressures given. \
          Changes of sign are looked for on a grid of 1 K and then closed in.",
    source: SOURCE,
    example: "reaction(\"CaCO3(cr,calcite) -> CaO(cr,lime) + CO2(g)\").equilibrium_temperature()",
    claims: &[],
    alternatives: &[],
    run: equilibrium_temperature,
    check_line: Some(temperature_line),
    caution: None,
};

pub static REACTION_QUOTIENT: Card = Card {
    id: "reaction.quotient",
    name: "reaction_quotient",
    on: On::Reaction,
    args: &[Arg {
        name: "state",
        takes: Takes::Options(&[PARTIAL, MOLALITY]),
        default: Default::Required,
        doc: STATE_DOC,
    }],
    gives: "Q, a pure number; pure liquids and solids count as 1",
    doc: "Reaction quotient of a state. Q = Π (pᵢ/p°)^νᵢ over the gases and Π (bᵢ/b°)^νᵢ over the solutes, p° = 1 bar, \
          b° = 1 mol/kg, all ideal.",
    source: SOURCE,
    example: "reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\").reaction_quotient(\
              #{ partial: #{ \"CO(g)\": \"2 bar\", \"H2O(g)\": \"4 bar\", \"CO2(g)\": \"1 bar\", \"H2(g)\": \"5 bar\" } })",
    claims: &[Claim { id: "infinite-dilution", test: claims::infinite_dilution }],
    alternatives: &[],
    run: |cx, call| Ok(Value::Quantity(quotient(cx, call)?)),
    check_line: Some(quotient_line),
    caution: None,
};

pub static DIRECTION: Card = Card {
    id: "reaction.direction",
    name: "direction",
    on: On::Reaction,
    args: &[
        Arg {
            name: "T",
            takes: Takes::Temperature,
            default: Default::Required,
            doc: "temperature: degC, degF or kelvin",
        },
        Arg { name: "state", takes: Takes::Options(&[PARTIAL, MOLALITY]), default: Default::Required, doc: STATE_DOC },
    ],
    gives: "a map: `Q`, `K`, `dG` at that state, and `runs`: \"forward\", \"backward\" or \"not told apart\" within 2 u of dG",
    doc: "Which way a reaction runs from a state: ΔrG = ΔrG°(T) + R T ln Q, forward where it is negative.",
    source: SOURCE,
    example: "reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\").direction(\"450 degC\", \
              #{ partial: #{ \"CO(g)\": \"2 bar\", \"H2O(g)\": \"4 bar\", \"CO2(g)\": \"1 bar\", \"H2(g)\": \"5 bar\" } })",
    claims: &[],
    alternatives: &[],
    run: direction,
    check_line: None,
    caution: None,
};

/// The card whose value at T a temperature of equilibrium makes zero.
fn gibbs_call(call: &Call, t: Quantity) -> Call {
    let mut options = match call.args.last() {
        Some(Value::Options(options)) => (**options).clone(),
        _ => BTreeMap::new(),
    };
    options.remove("from");
    options.remove("to");
    let args = vec![call.args[0].clone(), Value::Quantity(t), Value::Options(Rc::new(options))];
    Call { card: &property_card::GIBBS_ENERGY, args }
}

/// ΔrG at a temperature, with its slope.
fn gibbs(terms: &Terms, t_k: f64, method: &Method, cx: &Cx) -> Result<f64, Fault> {
    property::number(Property::G, terms, t_k, method, cx)
}

fn equilibrium_temperature(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let method = property::method_of(call, cx)?;
    let (mut t_min, mut t_max) = (0.0_f64, f64::INFINITY);
    for term in terms.terms() {
        let (low, high) = shortcut::range_of(term, terms, cx.data())?;
        (t_min, t_max) = (t_min.max(low), t_max.min(high));
    }
    let end = |name: &str, otherwise: f64| match call.given(name) {
        Some(Value::Quantity(t)) => t.si(),
        _ => otherwise,
    };
    let (from_k, to_k) = (end("from", t_min), end("to", t_max));
    let reaction = || terms.text().to_owned();
    if !(t_min <= from_k && from_k < to_k && to_k <= t_max) {
        return Err(EquilibriumError::Range { reaction: reaction(), from_k, to_k, t_min, t_max }.into());
    }
    let steps = (to_k - from_k).ceil().max(1.0) as usize;
    let grid = |i: usize| (from_k + i as f64).min(to_k);
    let mut found = Vec::new();
    let first = gibbs(terms, from_k, &method, cx)?;
    let (mut below, mut last) = (first, first);
    for i in 1..=steps {
        if i % 64 == 0
            && let Some(halted) = (cx.halted)()
        {
            return Err(halted);
        }
        last = gibbs(terms, grid(i), &method, cx)?;
        // A grid point on the zero itself belongs to the interval that ends there.
        if below != 0.0 && (last == 0.0 || (below < 0.0) != (last < 0.0)) {
            let closed = root::bracketed(|t| gibbs(terms, t, &method, cx), grid(i - 1), grid(i), 1e-9)?;
            if let Ok(root) = closed {
                found.push(Value::Quantity(temperature(cx, call, terms, root.x, &method)?));
            }
        }
        below = last;
    }
    if found.is_empty() {
        let kilo = |g: f64| format!("{:.1}", g / 1000.0);
        let (low, high) = (kilo(first), kilo(last));
        return Err(EquilibriumError::NoTemperature { reaction: reaction(), from_k, to_k, low, high }.into());
    }
    Ok(Value::List(found))
}

/// One temperature of equilibrium, with the derivatives of ΔrG over ΔrS.
fn temperature(cx: &Cx, call: &Rc<Call>, terms: &Terms, t_k: f64, method: &Method) -> Result<Quantity, Fault> {
    let kelvin = Dimension::base(Base::Kelvin);
    let at_t = Quantity::of_node(Rc::new(Node::new(
        t_k,
        kelvin.clone(),
        Kind::of(What::TemperaturePoint),
        SmallVec::new(),
        Origin::Operator(Operator::Condition),
        None,
    )));
    let made = Rc::new(gibbs_call(call, at_t.clone()));
    let g = property::value(Property::G, terms, &at_t, method, &made, cx)?;
    let mut slope = 0.0;
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = SmallVec::new();
    for (node, by) in g.node().inputs() {
        if is_temperature(node, at_t.node()) {
            slope += by;
        } else {
            inputs.push((Rc::clone(node), *by));
        }
    }
    inputs.iter_mut().for_each(|(_, by)| *by /= -slope);
    let kind = Kind::of(What::TemperaturePoint);
    let step = Rc::clone(call);
    Ok(Quantity::from_step(t_k, kelvin, kind, inputs, step, cx.place.clone())?)
}

/// Whether a node is the temperature itself, or stands for it as a condition.
fn is_temperature(node: &Rc<Node>, t: &Rc<Node>) -> bool {
    Rc::ptr_eq(node, t) || node.inputs().iter().any(|(input, _)| Rc::ptr_eq(input, t))
}

fn temperature_line(cx: &Cx, call: &Call, value: &Quantity, sources: &mut Sources) -> String {
    let again = Rc::new(gibbs_call(call, value.clone()));
    let Ok(method) = property::method_of(&again, cx) else { return String::new() };
    let Ok(g) = property::quantity(Property::G, &again, &method, cx) else { return String::new() };
    property_card::GIBBS_ENERGY.check_line.map_or_else(String::new, |line| line(cx, &again, &g, sources))
}

/// The power of a species in Q, and what says its activity where there is something.
struct Activity<'a> {
    nu: f64,
    value: Option<(&'a Quantity, f64)>,
}

fn named(call: &Call, option: &str) -> BTreeMap<String, Quantity> {
    match call.given(option) {
        Some(Value::Options(map)) => map
            .iter()
            .filter_map(|(name, value)| match value {
                Value::Quantity(value) => Some((name.clone(), value.clone())),
                _ => None,
            })
            .collect(),
        _ => BTreeMap::new(),
    }
}

/// Molalities by the id of the solute, as given.
///
/// # Errors
/// A name is no solute of the reaction, or a molality is not positive.
pub fn molalities(cx: &Cx, call: &Call, terms: &Terms) -> Result<BTreeMap<Arc<str>, Quantity>, Fault> {
    let mut all = BTreeMap::new();
    for (name, molality) in named(call, "molality") {
        let id = cx.data().find(&name)?.species.id.clone();
        let solute = |id: &str| {
            terms.terms().iter().any(|term| {
                *term.substance.species.id == *id && term.substance.species.phase.state == Aggregate::Aqueous
            })
        };
        if !solute(&id) {
            let solutes = terms.terms().iter().map(|term| &*term.substance.species.id).filter(|id| solute(id));
            let known = crate::model::card::listed(solutes);
            return Err(EquilibriumError::NoSolute { name, reaction: terms.text().to_owned(), known }.into());
        }
        if molality.si() <= 0.0 {
            return Err(EquilibriumError::MolalityNotPositive { name }.into());
        }
        all.insert(id, molality);
    }
    Ok(all)
}

/// The quotient of a call's state.
///
/// # Errors
/// The state of a gas or solute is missing, or Q is beyond the range of numbers.
pub fn quotient(cx: &Cx, call: &Rc<Call>) -> Result<Quantity, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let given = property::method_of(call, cx)?.given;
    let partial = given.map(|given| given.partial).unwrap_or_default();
    let molalities = molalities(cx, call, terms)?;
    let mut activities = Vec::new();
    for term in terms.terms() {
        let (species, reaction) = (&term.substance.species, || terms.text().to_owned());
        let missing = || species.id.to_string();
        let value = match species.phase.state {
            Aggregate::Gas => match partial.get(&species.id) {
                Some(p) => Some((p, STANDARD_PRESSURE.value)),
                None => {
                    return Err(EquilibriumError::PressureMissing { missing: missing(), reaction: reaction() }.into());
                }
            },
            // b° = 1 mol/kg, in SI units.
            Aggregate::Aqueous => match molalities.get(&species.id) {
                Some(b) => Some((b, 1.0)),
                None => {
                    return Err(EquilibriumError::MolalityMissing { missing: missing(), reaction: reaction() }.into());
                }
            },
            _ => None,
        };
        activities.push(Activity { nu: term.nu, value });
    }
    let ln_q: f64 =
        activities.iter().filter_map(|a| a.value.map(|(value, unit)| a.nu * math::ln(value.si() / unit))).sum();
    let q = math::exp(ln_q);
    if !(q.is_finite() && q >= f64::MIN_POSITIVE) {
        let lg_q = ln_q / std::f64::consts::LN_10;
        return Err(EquilibriumError::Overflow { reaction: terms.text().to_owned(), lg_q }.into());
    }
    let inputs = activities
        .iter()
        .filter_map(|a| a.value.map(|(value, _)| (property::as_argument(value), q * a.nu / value.si())))
        .collect();
    let step = Rc::clone(call);
    Ok(Quantity::from_step(q, Dimension::none(), Kind::PLAIN, inputs, step, cx.place.clone())?)
}

fn quotient_line(cx: &Cx, call: &Call, value: &Quantity, _: &mut Sources) -> String {
    let Some(terms) = call.terms() else { return String::new() };
    let Ok(method) = property::method_of(call, cx) else { return String::new() };
    let partial = method.given.map(|given| given.partial).unwrap_or_default();
    let Ok(molalities) = molalities(cx, call, terms) else { return String::new() };
    let factors: Vec<String> = (terms.terms().iter())
        .filter_map(|term| {
            let id = &term.substance.species.id;
            let activity = match (partial.get(id), molalities.get(id)) {
                (Some(p), _) => p.si() / STANDARD_PRESSURE.value,
                (_, Some(b)) => b.si(),
                _ => return None,
            };
            let activity = crate::quantity::round::significant(activity, 7);
            Some(if term.nu == 1.0 { activity } else { format!("{activity}^({})", term.nu) })
        })
        .collect();
    format!("{} = {}", factors.join(" × "), crate::quantity::round::significant(value.si(), 6))
}

fn direction(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let state = call.args[2].clone();
    let t = call.quantity(1).clone();
    let part = |card: &'static Card, args: Vec<Value>| (card.run)(cx, &Rc::new(Call { card, args }));
    let quantity = |value: Value| match value {
        Value::Quantity(value) => value,
        other => unreachable!("a quotient, a constant and an energy are quantities, not {}", other.sort()),
    };
    let none = || Value::Options(Rc::default());
    let q = quantity(part(&REACTION_QUOTIENT, vec![call.args[0].clone(), state])?);
    let (reaction, at) = (call.args[0].clone(), Value::Quantity(t.clone()));
    let k = quantity(part(&property_card::EQUILIBRIUM_CONSTANT, vec![reaction.clone(), at.clone(), none()])?);
    let standard = quantity(part(&property_card::GIBBS_ENERGY, vec![reaction, at, none()])?);
    let r = property::gas_constant(cx.constants());
    let (t_k, ln_q) = (t.si(), math::ln(q.si()));
    let inputs = smallvec![
        (Rc::clone(standard.node()), 1.0),
        (Rc::clone(q.node()), r.si() * t_k / q.si()),
        (property::as_argument(&t), r.si() * ln_q),
        (Rc::clone(r.node()), t_k * ln_q),
    ];
    let state = State { standard: false, p_pa: None, ..standard.kind().state().cloned().unwrap_or_default() };
    let (si, kind) = (standard.si() + r.si() * t_k * ln_q, Kind::in_state(What::G, state));
    let step = Rc::clone(call);
    let dg = Quantity::from_step(si, standard.dim().clone(), kind, inputs, step, cx.place.clone())?;
    let runs = match dg.spread().u() {
        Some(u) if dg.si().abs() <= 2.0 * u => "not told apart",
        _ if dg.si() < 0.0 => "forward",
        _ if dg.si() > 0.0 => "backward",
        _ => "not told apart",
    };
    let answer = [
        ("Q", Value::Quantity(q)),
        ("K", Value::Quantity(k)),
        ("dG", Value::Quantity(dg)),
        ("runs", Value::Text(runs.into())),
    ];
    Ok(Value::Options(Rc::new(answer.map(|(name, value)| (name.to_owned(), value)).into())))
}
