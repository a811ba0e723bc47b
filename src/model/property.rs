//! Properties of a reaction or a substance at a temperature: H°, U°, G°, A°, S°, Cp°, and K° of a reaction.
//!
//! ΔrH°(T) = Σ νᵢ [ΔfH°ᵢ(298.15 K) + Hᵢ(T) − Hᵢ(298.15 K)]       ΔrS°(T) = Σ νᵢ S°ᵢ(T)
//! ΔrG°(T) = ΔrH°(T) − T ΔrS°(T)       ΔrU°(T) = ΔrH°(T) − Δn(gas) R T       ΔrA°(T) = ΔrG°(T) − Δn(gas) R T
//! K°(T) = exp(−ΔrG°(T)/RT)
//!
//! | symbol  | unit        | meaning                                                            |
//! |---------|-------------|--------------------------------------------------------------------|
//! | νᵢ      | 1           | stoichiometric numbers as written, positive for products           |
//! | ΔfH°ᵢ   | J/mol       | formation enthalpy at 298.15 K, all from one dataset               |
//! | H, S    | J/mol, J/(mol K) | functions of T, closed-form integrals of Cp and Cp/T          |
//! | Δn(gas) | 1           | sum of ν of the gases, derived from the phases                     |
//! | R       | J/(mol K)   | gas constant of the current constant set                           |
//!
//! Where a condensed species changes phase between 298.15 K and T, the recorded changes are part of H and S (`path`).
//! Each species pure, in its standard state, p° = 1 bar. ΔrU° and ΔrA° take gases as ideal and neglect the volume of
//! condensed species (`ideal-gas`, `condensed-volume-neglected`).
//! Source: definitions of H, G, A; (∂H/∂T)p = Cp; IUPAC Green Book, 3rd ed., section 2.11 (from memory).

use std::rc::Rc;

use smallvec::SmallVec;
use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::card::{Call, Card, Cx};
use crate::model::function::T_REFERENCE;
use crate::model::gather::{self, Contribution, Figure, FigureOrigin, HeatCapacity, Method};
use crate::model::given::Given;
use crate::model::path;
use crate::model::pressure::{self, AtPressure};
use crate::model::shortcut::ShortcutError;
use crate::model::terms::{Term, Terms};
use crate::num::math;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey, Node, Operator, Origin};
use crate::units::constants::{ConstantSet, STANDARD_PRESSURE};
use crate::units::{Base, Dimension, Entity, Kind, State, What, Zero};

/// A property of a reaction, or of a pure substance.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Property {
    H,
    U,
    G,
    A,
    S,
    Cp,
    K,
}

impl Property {
    /// The property a card computes.
    pub fn of(card: &Card) -> Option<Property> {
        Some(match card.id {
            "reaction.enthalpy" | "substance.enthalpy" => Property::H,
            "reaction.internal-energy" | "substance.internal-energy" => Property::U,
            "reaction.gibbs-energy" | "substance.gibbs-energy" => Property::G,
            "reaction.helmholtz-energy" | "substance.helmholtz-energy" => Property::A,
            "reaction.entropy" | "substance.entropy" => Property::S,
            "reaction.heat-capacity" | "substance.heat-capacity" => Property::Cp,
            "reaction.equilibrium-constant" => Property::K,
            _ => return None,
        })
    }

    fn what(self) -> What {
        match self {
            Property::H => What::H,
            Property::U => What::U,
            Property::G => What::G,
            Property::A => What::A,
            Property::S => What::S,
            Property::Cp => What::Cp,
            Property::K => What::K,
        }
    }

    pub fn uses_formation(self) -> bool {
        !matches!(self, Property::S | Property::Cp)
    }

    pub fn uses_gas_law(self) -> bool {
        matches!(self, Property::U | Property::A)
    }
}

/// Why a property has no value.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum PropertyError {
    #[error("K° of {reaction} at {t_k} K is 10^{lg_k:.0}, beyond the range of numbers")]
    Overflow { reaction: String, t_k: f64, lg_k: f64 },
}

impl Explain for PropertyError {
    fn code(&self) -> &'static str {
        "equilibrium-constant-out-of-range"
    }

    fn hint(&self) -> String {
        "ask for `r.gibbs_energy(T)` and work with ln K° = -ΔrG°/(R T)".to_owned()
    }
}

/// One figure's weight in the result.
pub struct Part<'a> {
    pub figure: &'a Figure,
    pub weight: f64,
}

/// A property's value in SI units per mole of reaction, with its weights and its slope.
pub struct Evaluated<'a> {
    pub si: f64,
    pub parts: Vec<Part<'a>>,
    /// Pressures and constants of the terms in pressure, each with its weight.
    pub nodes: Vec<(Rc<Node>, f64)>,
    /// Derivative with respect to R, for what rests on the gas law.
    pub by_r: f64,
    /// Derivative with respect to T.
    pub slope: f64,
}

/// Evaluates a property from what the species contribute, R in J/(mol K) and T in kelvin. `at` has each species at its
/// pressure, and is empty for standard values.
///
/// # Errors
/// A species has no entropy or heat capacity, where one is needed.
pub fn evaluate<'a>(
    property: Property,
    contributions: &'a [Contribution],
    at: &[AtPressure],
    terms: &Terms,
    t_k: f64,
    r: f64,
) -> Result<Evaluated<'a>, Fault> {
    let parts = Vec::with_capacity(3 * contributions.len());
    let mut out = Evaluated { si: 0.0, parts, nodes: Vec::new(), by_r: 0.0, slope: 0.0 };
    for (contribution, term) in contributions.iter().zip(terms.terms()) {
        let species = || term.substance.species.id.to_string();
        let nu = contribution.nu;
        let mut add = |figure: &'a Figure, weight: f64| {
            out.si += weight * figure.si;
            out.parts.push(Part { figure, weight });
        };
        let entropy =
            || contribution.entropy.as_ref().ok_or_else(|| gather::GatherError::NoEntropy { species: species() });
        let slopes = &contribution.slopes;
        match property {
            Property::Cp => {
                let cp = contribution.cp.as_ref();
                add(cp.ok_or_else(|| gather::GatherError::NoFunction { species: species(), t_k })?, nu);
                out.slope += nu * slopes.cp;
            }
            Property::S => {
                add(entropy()?, nu);
                out.slope += nu * slopes.entropy;
            }
            Property::H | Property::U => {
                add(&contribution.formation, nu);
                if let Some(increment) = &contribution.increment {
                    add(increment, nu);
                }
                out.slope += nu * slopes.increment;
            }
            Property::G | Property::A | Property::K => {
                add(&contribution.formation, nu);
                if let Some(increment) = &contribution.increment {
                    add(increment, nu);
                }
                let s = entropy()?;
                add(s, -t_k * nu);
                out.slope += nu * (slopes.increment - s.si - t_k * slopes.entropy);
            }
        }
    }
    for (at, term) in at.iter().zip(terms.terms()) {
        let departure = pressure::departure(property, &at.matter, t_k, at.p_pa, r);
        out.si += term.nu * departure.si;
        out.slope += term.nu * departure.by_t;
        out.by_r += term.nu * departure.by_r;
        out.nodes.extend(at.parts(&departure).into_iter().map(|(node, weight)| (node, term.nu * weight)));
    }
    if property.uses_gas_law() && at.is_empty() {
        let delta_n = terms.delta_n_gas();
        out.si -= delta_n * r * t_k;
        out.slope -= delta_n * r;
        out.by_r = -delta_n * t_k;
    }
    if property == Property::K {
        // From ΔrG° to K°: every weight times dK/dG = −K/(RT).
        let ln_k = -out.si / (r * t_k);
        let k = math::exp(ln_k);
        if !(k.is_finite() && k >= f64::MIN_POSITIVE) {
            let lg_k = ln_k / std::f64::consts::LN_10;
            return Err(PropertyError::Overflow { reaction: terms.text().to_owned(), t_k, lg_k }.into());
        }
        let by_g = -k / (r * t_k);
        out.parts.iter_mut().for_each(|part| part.weight *= by_g);
        out.slope = by_g * (out.slope - out.si / t_k);
        out.si = k;
    }
    Ok(out)
}

/// Dimension of a property, per mole of something.
pub(super) fn dimension(property: Property, per: Entity) -> Dimension {
    let energy = Dimension::whole([2, 1, -2, 0, 0, 0]).over(&Dimension::amount(per));
    match property {
        Property::S | Property::Cp => energy.over(&Dimension::base(Base::Kelvin)),
        Property::K => Dimension::none(),
        _ => energy,
    }
}

fn kind(property: Property, terms: &Terms, t_k: f64, given: Option<&Given>) -> Kind {
    let zero = property.uses_formation().then_some(Zero::Elements298);
    let p_pa = given.map_or(Some(STANDARD_PRESSURE.value), Given::common);
    let (standard, reaction) = (given.is_none() && terms.conditions().is_empty(), terms.is_reaction());
    Kind::in_state(property.what(), State { zero, t_k: Some(t_k), p_pa, standard, reaction })
}

/// The method a call asks for.
///
/// # Errors
/// The formation dataset is unknown, or the pressure is not one that the reaction can have.
pub fn method_of(call: &Call, cx: &Cx) -> Result<Method, Fault> {
    let word = |name| call.option(name).map(|word| &**word);
    let mut method = Method::from_words(word("heat_capacity"), word("formation"), cx.data())?;
    if Property::of(call.card).is_some_and(|property| !property.uses_formation()) {
        method.formation = gather::Formation::Unneeded;
    }
    match (word("heat_capacity"), call.option_quantity("about")) {
        (Some("taylor"), Some(about)) => method.heat_capacity = HeatCapacity::FirstOrder { about_k: about.si() },
        (Some("taylor"), None) => return Err(ShortcutError::StartMissing.into()),
        (_, Some(_)) => {
            let shortcut = "the heat capacity asked for".to_owned();
            return Err(ShortcutError::StartUnused { shortcut }.into());
        }
        (_, None) => {}
    }
    method.given = Given::of(call, cx)?;
    Ok(method)
}

/// Each species at its pressure; empty where standard values are asked for.
///
/// # Errors
/// A constant that was given is of another dimension than it should be.
pub fn at_pressure(terms: &Terms, t_k: f64, method: &Method, cx: &Cx) -> Result<Vec<AtPressure>, Fault> {
    let Some(given) = &method.given else { return Ok(Vec::new()) };
    let r = cx.constants().molar_gas.value;
    // A phase that changes on the way to T takes pressure as the one that it is there.
    let crossed = path::crossings(terms, t_k, cx.data());
    let there = |(nth, term): (usize, &Term)| {
        let route = crossed.iter().find(|(of, _)| *of == nth).map(|(_, route)| route);
        let substance = route.map_or(&term.substance, |route| &route.last().substance);
        pressure::resolve(substance, t_k, given, r)
    };
    terms.terms().iter().enumerate().map(there).collect()
}

/// A property by another method, as a bare number in SI units: what tests and alternatives compare with.
///
/// # Errors
/// As [`evaluate`].
pub fn number(property: Property, terms: &Terms, t_k: f64, method: &Method, cx: &Cx) -> Result<f64, Fault> {
    let contributions = gather::contributions(terms, t_k, method, cx)?;
    let r = cx.constants().molar_gas.value;
    let at = at_pressure(terms, t_k, method, cx)?;
    Ok(evaluate(property, &contributions, &at, terms, t_k, r)?.si)
}

/// A property by another method, as a value with its inputs, made by `call`.
///
/// # Errors
/// As [`evaluate`].
pub fn quantity(property: Property, call: &Rc<Call>, method: &Method, cx: &Cx) -> Result<Quantity, Fault> {
    let Some(terms) = call.terms() else {
        unreachable!("{} is asked of a reaction or a substance", call.card.id);
    };
    value(property, terms, call.quantity(1), method, call, cx)
}

/// A property of some terms at a temperature, as a value with its inputs, made by `call`.
///
/// # Errors
/// As [`evaluate`].
pub fn value(
    property: Property,
    terms: &Terms,
    t: &Quantity,
    method: &Method,
    call: &Rc<Call>,
    cx: &Cx,
) -> Result<Quantity, Fault> {
    let t_k = t.si();
    let contributions = gather::contributions(terms, t_k, method, cx)?;
    let r = gas_constant(cx.constants());
    let at = at_pressure(terms, t_k, method, cx)?;
    let evaluated = evaluate(property, &contributions, &at, terms, t_k, r.si())?;
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> =
        SmallVec::with_capacity(evaluated.parts.len() + evaluated.nodes.len() + 2);
    for part in &evaluated.parts {
        enter(&mut inputs, part.figure, part.weight, property)?;
    }
    inputs.extend(evaluated.nodes);
    if evaluated.by_r != 0.0 {
        inputs.push((Rc::clone(r.node()), evaluated.by_r));
    }
    if property == Property::K {
        // ln K° = -ΔrG°/(R T), so dK°/dR = -K° ln K°/R.
        inputs.push((Rc::clone(r.node()), -evaluated.si * math::ln(evaluated.si) / r.si()));
    }
    inputs.push((as_argument(t), evaluated.slope));
    let step = Rc::clone(call);
    Ok(Quantity::from_step(
        evaluated.si,
        dimension(property, terms.per()),
        kind(property, terms, t_k, method.given.as_ref()),
        inputs,
        step,
        cx.place.clone(),
    )?)
}

/// A temperature as an input of what is computed at it. One that is typed as it is, without an uncertainty, was chosen and not
/// measured: its node says so, and the result is not called partial for it.
pub(super) fn as_argument(t: &Quantity) -> Rc<Node> {
    let node = t.node();
    if node.input().is_none_or(|input| input.u.is_some()) {
        return Rc::clone(node);
    }
    let inputs = SmallVec::from_iter([(Rc::clone(node), 1.0)]);
    let origin = Origin::Operator(Operator::Condition);
    Rc::new(Node::new(node.si(), node.dim().clone(), node.kind().clone(), inputs, origin, node.place().cloned()))
}

/// Enters a figure among the inputs of a property, with its weight there.
pub(super) fn enter(
    inputs: &mut SmallVec<[(Rc<Node>, f64); 2]>,
    figure: &Figure,
    weight: f64,
    property: Property,
) -> Result<(), Fault> {
    match &figure.origin {
        FigureOrigin::Input(input) => inputs.push((leaf(figure.si, input, property)?, weight)),
        FigureOrigin::Nodes(nodes) => {
            inputs.extend(nodes.iter().map(|(node, slope)| (Rc::clone(node), slope * weight)));
        }
    }
    Ok(())
}

/// A figure of the tables as an input of a property.
fn leaf(si: f64, input: &Input, property: Property) -> Result<Rc<Node>, Fault> {
    let energy = Dimension::whole([2, 1, -2, 0, 0, 0]);
    let dim = match (&input.key, property) {
        (LeafKey::Datum { field, .. }, _) if *field == gather::ENTROPY => energy.over(&Dimension::base(Base::Kelvin)),
        (_, Property::Cp) => energy.over(&Dimension::base(Base::Kelvin)),
        _ => energy,
    };
    let dim = dim.over(&Dimension::amount(Entity::OPEN));
    Ok(Rc::clone(Quantity::input(si, dim, Kind::PLAIN, input.clone(), None)?.node()))
}

/// J/mol of nothing in particular.
pub(super) fn energy_per_open_mole() -> Dimension {
    Dimension::whole([2, 1, -2, 0, 0, 0]).over(&Dimension::amount(Entity::OPEN))
}

/// R as an input, so that a change of constant set can be traced.
pub(super) fn gas_constant(constants: &ConstantSet) -> Quantity {
    let r = &constants.molar_gas;
    let dim = Dimension::whole([2, 1, -2, 0, -1, 0]).over(&Dimension::amount(Entity::OPEN));
    let key = LeafKey::Constant { year: constants.year, name: r.name };
    let input = Input { u: Some(r.u), citation: Some(r.citation()), ..Input::of(key) };
    let origin = Origin::Input(Box::new(input));
    Quantity::of_node(Rc::new(Node::new(r.value, dim, Kind::PLAIN, SmallVec::new(), origin, None)))
}

/// Whether a property at this temperature is the tabulated one, so that no correction is made.
pub fn is_reference(t_k: f64) -> bool {
    t_k == T_REFERENCE
}

#[cfg(test)]
mod tests {
    use std::cell::Cell;
    use std::collections::BTreeMap;

    use super::*;
    use crate::model::card::{self, References, Value};
    use crate::model::property_card::*;
    use crate::model::reaction::REACTION;
    use crate::units::constants;

    const SHIFT: &str = "CO(g) + H2O(g) -> CO2(g) + H2(g)";
    const REFORMING: &str = "CH4(g) + 2 H2O(g) -> CO2(g) + 4 H2(g)";

    fn ask(card: &'static Card, equation: &str, t: &str, options: &[(&str, &str)]) -> Result<Quantity, Fault> {
        let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
        let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
        let reaction = card::call(&cx, &REACTION, vec![Value::Text(equation.into())])?;
        let options: BTreeMap<String, Value> =
            options.iter().map(|(name, word)| ((*name).to_owned(), Value::Text((*word).into()))).collect();
        match card::call(&cx, card, vec![reaction, Value::Text(t.into()), Value::Options(Rc::new(options))])? {
            Value::Quantity(value) => Ok(value),
            other => panic!("{} gives {}", card.id, other.sort()),
        }
    }

    #[test]
    fn the_state_functions_of_one_reaction_are_consistent() {
        let t = 650.0;
        let at = |card| ask(card, "2 CO(g) + O2(g) -> 2 CO2(g)", "650 K", &[]).unwrap().si();
        let (h, u, g, a, s, k) = (
            at(&ENTHALPY),
            at(&INTERNAL_ENERGY),
            at(&GIBBS_ENERGY),
            at(&HELMHOLTZ_ENERGY),
            at(&ENTROPY),
            at(&EQUILIBRIUM_CONSTANT),
        );
        let rt = constants::current().molar_gas.value * t;
        // Bound: rounding of sums near 1e6 J/mol, 1e-10 relative to the largest term is far above it.
        let close = |x: f64, y: f64| assert!((x - y).abs() <= 1e-9 * (1.0 + y.abs()), "{x} {y}");
        close(g, h - t * s);
        close(u, h + rt); // Δn(gas) = -1
        close(a, g + rt);
        close(math::ln(k), -g / rt);
    }

    #[test]
    fn slopes_agree_with_differences_of_the_values() {
        // Bound: a central difference over 2 × 0.01 K is off by h²/6 of a third derivative, below 1e-6 relative here.
        for card in [
            &ENTHALPY,
            &INTERNAL_ENERGY,
            &GIBBS_ENERGY,
            &HELMHOLTZ_ENERGY,
            &ENTROPY,
            &HEAT_CAPACITY,
            &EQUILIBRIUM_CONSTANT,
        ] {
            // The shift alone would not tell ν from its sign, nor Δn(gas) from nothing.
            for (equation, mode) in
                [SHIFT, REFORMING].into_iter().flat_map(|e| HeatCapacity::WORDS.iter().map(move |m| (e, m)))
            {
                let options: &[(&str, &str)] = match *mode {
                    "taylor" => &[("heat_capacity", "taylor"), ("about", "450 K")],
                    _ => &[("heat_capacity", mode)],
                };
                let at = |t: &str| ask(card, equation, t, options).unwrap();
                let difference = (at("600.01 K").si() - at("599.99 K").si()) / 0.02;
                let with_u = at("600.00(1) K");
                let of_t = with_u
                    .sensitivities()
                    .into_iter()
                    .find(|s| matches!(s.input().unwrap().key, LeafKey::Typed { .. }));
                let slope = of_t.map_or(0.0, |s| s.derivative); // A constant ΔCp has none.
                assert!(
                    (slope - difference).abs() <= 1e-5 * (difference.abs() + 1e-3),
                    "{} of {equation} {mode}: {slope} {difference}",
                    card.id
                );
            }
        }
    }

    #[test]
    fn r_is_an_input_with_the_weight_of_what_it_multiplies() {
        // U = H - Δn R T and A = G - Δn R T, so the derivative by R is -Δn T, with Δn = 5 - 3 counted by hand.
        for (card, equation, weight) in [
            (&INTERNAL_ENERGY, REFORMING, Some(-2.0 * 600.0)),
            (&HELMHOLTZ_ENERGY, REFORMING, Some(-2.0 * 600.0)),
            (&INTERNAL_ENERGY, SHIFT, None),
        ] {
            let value = ask(card, equation, "600 K", &[]).unwrap();
            let of_r = value
                .sensitivities()
                .into_iter()
                .find(|s| matches!(s.input().unwrap().key, LeafKey::Constant { name: "molar gas constant", .. }));
            assert_eq!(of_r.map(|s| s.derivative), weight, "{} of {equation}", card.id);
        }
        // K = exp(-G/(R T)), by a central difference in R; over 2e-6 of R it is off by less than 1e-8, and rounding by 1e-9.
        let value = ask(&EQUILIBRIUM_CONSTANT, SHIFT, "600 K", &[]).unwrap();
        let of_r = value
            .sensitivities()
            .into_iter()
            .find(|s| matches!(s.input().unwrap().key, LeafKey::Constant { name: "molar gas constant", .. }));
        let (g, r) = (ask(&GIBBS_ENERGY, SHIFT, "600 K", &[]).unwrap().si(), constants::current().molar_gas.value);
        let k = |r: f64| math::exp(-g / (r * 600.0));
        let difference = (k(r * (1.0 + 1e-6)) - k(r * (1.0 - 1e-6))) / (2e-6 * r);
        let derivative = of_r.map(|s| s.derivative).unwrap();
        assert!((derivative / difference - 1.0).abs() < 1e-7, "{derivative} and {difference}");
    }

    #[test]
    fn a_temperature_without_uncertainty_is_a_condition_and_one_with_it_an_input() {
        let exact = ask(&ENTHALPY, SHIFT, "723.15 K", &[]).unwrap();
        let typed = |value: &Quantity| {
            let all = value.sensitivities();
            all.into_iter().find(|s| matches!(s.input().unwrap().key, LeafKey::Typed { .. })).unwrap()
        };
        assert!(typed(&exact).chosen && !typed(&exact).is_silent());
        let sure = exact.spread().u().unwrap();
        let unsure = ask(&ENTHALPY, SHIFT, "723(20) K", &[]).unwrap().spread().u().unwrap();
        assert!(unsure > sure);
    }

    #[test]
    fn a_temperature_outside_the_data_is_refused_with_the_range() {
        let fault = ask(&ENTHALPY, SHIFT, "100 K", &[]).unwrap_err();
        assert_eq!(fault.code(), "temperature-out-of-range");
        assert!(fault.message().contains("CO(g)") && fault.message().contains("200 K"), "{fault}");
    }
}
