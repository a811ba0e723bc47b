//! From a closed vessel to an open one and back, and what gas a closed vessel holds.
//!
//! open    ΔrH(T, p) = q_V + Σ ν p_c V(T, p_c) + [ΔrH(T, p) − ΔrH(T, p_c)]          q_V = ΔrU at the cell's pressure p_c
//! closed  ΔrU(T, p_c) = q_p − [ΔrH(T, p) − ΔrH(T, p_c)] − Σ ν p_c V(T, p_c)        q_p = ΔrH at the pressure p
//! gas     V = n Σ ν V(gas)          p = (n₀ + n Σ ν(gas)) R T/V,   n₀ = p₀ V/(R T₀)
//!
//! | symbol    | unit   | meaning                                                              |
//! |-----------|--------|----------------------------------------------------------------------|
//! | q_V, q_p  | J/mol  | heat taken up by the reaction as written: negative where it is released |
//! | p_c, p    | Pa     | pressure in the cell, and in the open vessel                         |
//! | V         | m³/mol | molar volumes, from one G(T, p) per substance                        |
//! | n         | mol    | extent: moles of reaction as written                                 |
//!
//! The surprise: the pV term is one of the cell's pressure, not of the process; between the two stands the V dP term, which is
//! nothing for ideal gases and 0.1 kJ/mol per 50 bar for a liquid.
//! Source: definitions of H and U; first law; IUPAC Green Book, 3rd ed., section 2.11 (from memory).

use std::rc::Rc;

use smallvec::{SmallVec, smallvec};
use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Sources, Takes, Value};
use crate::model::caution::Caution;
use crate::model::claims;
use crate::model::given::{CONSTANTS, GAS, Given, PRESSURE, VOLUME};
use crate::model::pressure::{self, AtPressure};
use crate::model::property::{self, Property};
use crate::model::terms::Terms;
use crate::num::math;
use crate::quantity::{Quantity, text};
use crate::record::node::Node;
use crate::units::constants::STANDARD_PRESSURE;
use crate::units::{Dimension, Entity, Kind, State, What};

/// What a vessel cannot be asked.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum VesselError {
    #[error("{given} is an enthalpy already, and a heat at constant volume is wanted")]
    OpenAlready { given: String },
    #[error("{given} is an internal energy already, and a heat at constant pressure is wanted")]
    ClosedAlready { given: String },
    #[error("{what} of {given} is not above zero")]
    NotPositive { what: &'static str, given: String },
    #[error("{reaction} forms no gas on balance, {delta_n} mol per mole of reaction")]
    NoGas { reaction: String, delta_n: f64 },
    #[error("the reaction would take up {taken} mol of gas, and the vessel held {held} mol at the start")]
    GasSpent { taken: String, held: String },
}

impl Explain for VesselError {
    fn code(&self) -> &'static str {
        match self {
            VesselError::OpenAlready { .. } => "heat-of-open-vessel",
            VesselError::ClosedAlready { .. } => "heat-of-closed-vessel",
            VesselError::NotPositive { .. } => "vessel-figure-not-positive",
            VesselError::NoGas { .. } => "gas-not-evolved",
            VesselError::GasSpent { .. } => "gas-of-vessel-spent",
        }
    }

    fn hint(&self) -> String {
        match self {
            VesselError::OpenAlready { .. } => "for the closed vessel ask `r.to_closed_vessel(q, T)`".to_owned(),
            VesselError::ClosedAlready { .. } => "for the open vessel ask `r.to_open_vessel(q, T)`".to_owned(),
            VesselError::NotPositive { .. } => "check sign and unit; pressures are absolute".to_owned(),
            VesselError::NoGas { .. } => {
                "for what gas takes up or gives on the way ask the reaction of that step alone".to_owned()
            }
            VesselError::GasSpent { .. } => "state the gas at the start as `initial`, or a smaller extent".to_owned(),
        }
    }
}

const T: Arg =
    Arg { name: "T", takes: Takes::Temperature, default: Default::Required, doc: "temperature: degC, degF or kelvin" };
const HEAT: Arg = Arg {
    name: "q",
    takes: Takes::Quantity { unit: "J/mol[rxn]" },
    default: Default::Required,
    doc: "heat taken up per mole of reaction as written, negative where it is released",
};
const CELL: Arg = Arg {
    name: "cell",
    takes: Takes::Quantity { unit: "Pa" },
    default: Default::Absent,
    doc: "absolute pressure in the closed cell; the standard pressure unless given",
};
const OPEN: Arg = Arg { doc: "absolute pressure of the open vessel; that of the cell unless given", ..PRESSURE };
const VESSEL_OPTIONS: Arg = Arg {
    name: "options",
    takes: Takes::Options(&[CELL, OPEN, GAS, VOLUME, CONSTANTS]),
    default: Default::NoOptions,
    doc: "the pressures, and how volumes are taken",
};
const EXTENT: Arg = Arg {
    name: "n",
    takes: Takes::Quantity { unit: "mol[rxn]" },
    default: Default::Required,
    doc: "extent: moles of reaction as written",
};
const VESSEL_CLAIMS: &[Claim] = &[
    Claim { id: "ideal-gas", test: claims::vessel_ideal },
    Claim { id: "second-virial", test: claims::vessel_virial },
    Claim { id: "condensed-volume-neglected", test: claims::vessel_volumes },
];
const GAS_CLAIMS: &[Claim] = &[
    Claim { id: "ideal-gas", test: claims::vessel_ideal },
    Claim { id: "second-virial", test: claims::vessel_virial },
    Claim { id: "complete-conversion", test: claims::complete_conversion },
];
const SOURCE: &str = "definitions of H and U, first law; IUPAC Green Book, 3rd ed., section 2.11 (from memory)";

pub static TO_OPEN_VESSEL: Card = Card {
    id: "vessel.to-open",
    name: "to_open_vessel",
    on: On::Reaction,
    args: &[HEAT, T, VESSEL_OPTIONS],
    gives: "ΔrH at T and the pressure of the open vessel, per mole of reaction as written",
    doc: "Turns a heat measured in a closed cell into the reaction enthalpy of an open vessel: adds the pV term at the cell's \
          pressure and the V dP term from there to the pressure of the open vessel.",
    source: SOURCE,
    example: "reaction(\"CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)\").to_open_vessel(\"-885.4 kJ/mol[rxn]\", \"25 degC\", \
              #{ cell: \"30 bar\", pressure: \"1 bar\" })",
    claims: VESSEL_CLAIMS,
    alternatives: &[],
    run: |cx, call| converted(cx, call, true),
    check_line: Some(check_line),
    caution: None,
};

pub static TO_CLOSED_VESSEL: Card = Card {
    id: "vessel.to-closed",
    name: "to_closed_vessel",
    on: On::Reaction,
    args: &[HEAT, T, VESSEL_OPTIONS],
    gives: "ΔrU at T and the cell's pressure, per mole of reaction as written",
    doc: "Turns a heat at constant pressure into the internal energy that a closed cell would show: takes off the V dP term \
          and the pV term at the cell's pressure.",
    source: SOURCE,
    example: "reaction(\"CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)\").to_closed_vessel(\"-890.6 kJ/mol[rxn]\", \"25 degC\")",
    claims: VESSEL_CLAIMS,
    alternatives: &[],
    run: |cx, call| converted(cx, call, false),
    check_line: Some(check_line),
    caution: None,
};

pub static GAS_EVOLVED: Card = Card {
    id: "vessel.gas-evolved",
    name: "gas_evolved",
    on: On::Reaction,
    args: &[
        EXTENT,
        T,
        Arg {
            name: "options",
            takes: Takes::Options(&[PRESSURE, GAS, CONSTANTS]),
            default: Default::NoOptions,
            doc: "the pressure, and the gas law",
        },
    ],
    gives: "volume of gas formed on balance, at T and p",
    doc: "Volume of gas that a complete conversion forms. V = n Σ ν V over the gases, p = 1 bar unless given.",
    source: SOURCE,
    example: "reaction(\"CaCO3(cr,calcite) -> CaO(cr,lime) + CO2(g)\").gas_evolved(\"2 mol[rxn]\", \"900 degC\")",
    claims: GAS_CLAIMS,
    alternatives: &[],
    run: gas_evolved,
    check_line: Some(gas_line),
    caution: Some(Caution::GasEvolved),
};

pub static VESSEL_PRESSURE: Card = Card {
    id: "vessel.pressure",
    name: "vessel_pressure",
    on: On::Reaction,
    args: &[
        EXTENT,
        T,
        Arg {
            name: "V",
            takes: Takes::Quantity { unit: "m3" },
            default: Default::Required,
            doc: "free volume of the closed vessel, without what liquids and solids fill",
        },
        Arg {
            name: "options",
            takes: Takes::Options(&[
                Arg {
                    name: "initial",
                    takes: Takes::Quantity { unit: "Pa" },
                    default: Default::Absent,
                    doc: "absolute pressure at the start; 1 bar unless given",
                },
                Arg {
                    name: "initial_T",
                    takes: Takes::Temperature,
                    default: Default::Absent,
                    doc: "temperature at the start; 25 degC unless given",
                },
            ]),
            default: Default::NoOptions,
            doc: "the gas at the start",
        },
    ],
    gives: "pressure in the closed vessel after the conversion, at T",
    doc: "Pressure in a closed vessel after a complete conversion: the gas at the start and the gas formed on balance, at T in \
          the free volume, as ideal gas.",
    source: SOURCE,
    example: "reaction(\"CaCO3(cr,calcite) -> CaO(cr,lime) + CO2(g)\").vessel_pressure(\"0.5 mol[rxn]\", \"900 degC\", \"10 L\")",
    claims: &[
        Claim { id: "ideal-gas", test: claims::vessel_gas },
        Claim { id: "complete-conversion", test: claims::complete_conversion },
    ],
    alternatives: &[],
    run: vessel_pressure,
    check_line: Some(pressure_line),
    caution: Some(Caution::ClosedVesselPressure),
};

/// The species at the cell's pressure and at that of the open vessel.
pub struct Vessels {
    pub cell: Vec<AtPressure>,
    pub open: Vec<AtPressure>,
    cell_pa: f64,
    open_pa: f64,
}

/// How a call's species stand in both vessels.
///
/// # Errors
/// A pressure is not positive, or constants that were given do not fit.
pub fn vessels(cx: &Cx, call: &Call) -> Result<Vessels, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let t_k = call.quantity(2).si();
    let r = cx.constants().molar_gas.value;
    let counted = call.option("volume").is_none_or(|word| **word == *"counted");
    let base = Given::of(call, cx)?.unwrap_or_else(Given::standard);
    let base = Given { volumes: counted, ..base };
    let cell = match call.option_quantity("cell") {
        Some(p) => Some(positive("the pressure in the cell", p)?),
        None => None,
    };
    let at = |total: Option<Quantity>| -> Result<Vec<AtPressure>, Fault> {
        let given = Given { total, ..base.clone() };
        terms.terms().iter().map(|term| pressure::resolve(&term.substance, t_k, &given, r)).collect()
    };
    let open = base.total.clone().or_else(|| cell.clone());
    let pa = |p: &Option<Quantity>| p.as_ref().map_or(STANDARD_PRESSURE.value, Quantity::si);
    let (cell_pa, open_pa) = (pa(&cell), pa(&open));
    Ok(Vessels { cell: at(cell)?, open: at(open)?, cell_pa, open_pa })
}

fn positive(what: &'static str, p: &Quantity) -> Result<Quantity, VesselError> {
    if p.si() > 0.0 { Ok(p.clone()) } else { Err(VesselError::NotPositive { what, given: text::shown_plain(p) }) }
}

/// Both terms of a conversion, J/mol.
pub struct Converted {
    pub pv: f64,
    pub vdp: f64,
}

/// The pV term of the cell, and the V dP term from there to the open vessel.
pub fn terms_of(terms: &Terms, vessels: &Vessels, t_k: f64, r: f64) -> Converted {
    let h = |at: &AtPressure| pressure::departure(Property::H, &at.matter, t_k, at.p_pa, r).si;
    let mut both = Converted { pv: 0.0, vdp: 0.0 };
    for ((term, cell), open) in terms.terms().iter().zip(&vessels.cell).zip(&vessels.open) {
        both.pv += term.nu * cell.p_pa * pressure::volume(&cell.matter, t_k, cell.p_pa, r);
        both.vdp += term.nu * (h(open) - h(cell));
    }
    both
}

fn converted(cx: &Cx, call: &Rc<Call>, to_open: bool) -> Result<Value, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let (q, t) = (call.quantity(1), call.quantity(2));
    match (q.kind().what, to_open) {
        (What::H, true) => return Err(VesselError::OpenAlready { given: text::shown(q) }.into()),
        (What::U, false) => return Err(VesselError::ClosedAlready { given: text::shown(q) }.into()),
        _ => {}
    }
    let vessels = vessels(cx, call)?;
    let (t_k, r) = (t.si(), property::gas_constant(cx.constants()));
    let both = terms_of(terms, &vessels, t_k, r.si());
    let sign = if to_open { 1.0 } else { -1.0 };
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = smallvec![(Rc::clone(q.node()), 1.0)];
    let (mut by_t, mut by_r) = (0.0, 0.0);
    // pV = H − U, so that every derivative is one of the departures of H and U.
    let mut enter = |at: &AtPressure, property: Property, weight: f64| {
        let departure = pressure::departure(property, &at.matter, t_k, at.p_pa, r.si());
        by_t += weight * departure.by_t;
        by_r += weight * departure.by_r;
        inputs.extend(at.parts(&departure).into_iter().map(|(node, by)| (node, weight * by)));
    };
    for ((term, cell), open) in terms.terms().iter().zip(&vessels.cell).zip(&vessels.open) {
        enter(cell, Property::U, -sign * term.nu);
        enter(open, Property::H, sign * term.nu);
    }
    inputs.push((property::as_argument(t), by_t));
    inputs.push((Rc::clone(r.node()), by_r));
    let (what, p_pa) = if to_open { (What::H, vessels.open_pa) } else { (What::U, vessels.cell_pa) };
    let state = State { zero: None, t_k: Some(t_k), p_pa: Some(p_pa), standard: false, reaction: true };
    let si = q.si() + sign * (both.pv + both.vdp);
    let step = Rc::clone(call);
    let kind = Kind::in_state(what, state);
    Ok(Value::Quantity(Quantity::from_step(si, energy(), kind, inputs, step, cx.place.clone())?))
}

fn energy() -> Dimension {
    Dimension::whole([2, 1, -2, 0, 0, 0]).over(&Dimension::amount(Entity::RXN))
}

fn check_line(cx: &Cx, call: &Call, value: &Quantity, _: &mut Sources) -> String {
    let (Some(terms), Ok(vessels)) = (call.terms(), vessels(cx, call)) else { return String::new() };
    let (t_k, r) = (call.quantity(2).si(), cx.constants().molar_gas.value);
    let both = terms_of(terms, &vessels, t_k, r);
    let kilo = |si: f64| {
        let text = format!("{:.4}", si / 1000.0);
        if text.starts_with('-') { format!("({text})") } else { text }
    };
    let sign = if call.card.id == TO_OPEN_VESSEL.id { "+" } else { "-" };
    let (q, result) = (kilo(call.quantity(1).si()), value.si() / 1000.0);
    format!("{q} {sign} pV {} {sign} V dP {} = {result:.3} kJ/mol", kilo(both.pv), kilo(both.vdp))
}

/// The gases of a reaction at the pressure of the call.
fn gases(cx: &Cx, call: &Call, t_k: f64) -> Result<Vec<(f64, AtPressure)>, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let given = Given::of(call, cx)?.unwrap_or_else(Given::standard);
    let r = cx.constants().molar_gas.value;
    let gases = terms.terms().iter().filter(|term| term.substance.species.is_gas());
    gases.map(|term| Ok((term.nu, pressure::resolve(&term.substance, t_k, &given, r)?))).collect()
}

fn extent(call: &Call) -> Result<&Quantity, VesselError> {
    let n = call.quantity(1);
    if n.si() > 0.0 {
        return Ok(n);
    }
    Err(VesselError::NotPositive { what: "the extent", given: text::shown_plain(n) })
}

fn gas_evolved(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let (n, t) = (extent(call)?, call.quantity(2));
    let delta_n = terms.delta_n_gas();
    if delta_n <= 0.0 {
        return Err(VesselError::NoGas { reaction: terms.text().to_owned(), delta_n }.into());
    }
    let (t_k, r) = (t.si(), property::gas_constant(cx.constants()));
    let mut molar = 0.0;
    let (mut by_t, mut by_r) = (0.0, 0.0);
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = SmallVec::new();
    for (nu, at) in gases(cx, call, t_k)? {
        molar += nu * pressure::volume(&at.matter, t_k, at.p_pa, r.si());
        let b1 = match at.matter {
            pressure::Matter::Virial(b) => b[1],
            _ => 0.0,
        };
        by_t += n.si() * nu * (r.si() / at.p_pa + b1);
        by_r += n.si() * nu * t_k / at.p_pa;
        inputs.extend(at.constants[0].iter().map(|node| (Rc::clone(node), n.si() * nu)));
        inputs.extend(at.p_node.iter().map(|p| (Rc::clone(p), -n.si() * nu * r.si() * t_k / (at.p_pa * at.p_pa))));
    }
    inputs.push((Rc::clone(n.node()), molar));
    inputs.push((property::as_argument(t), by_t));
    inputs.push((Rc::clone(r.node()), by_r));
    let step = Rc::clone(call);
    let dim = Dimension::whole([3, 0, 0, 0, 0, 0]);
    Ok(Value::Quantity(Quantity::from_step(n.si() * molar, dim, Kind::PLAIN, inputs, step, cx.place.clone())?))
}

fn gas_line(cx: &Cx, call: &Call, value: &Quantity, _: &mut Sources) -> String {
    let t_k = call.quantity(2).si();
    let Ok(gases) = gases(cx, call, t_k) else { return String::new() };
    let r = cx.constants().molar_gas.value;
    let volumes: Vec<String> = gases
        .iter()
        .map(|(nu, at)| format!("({nu}) × {:.6}", 1000.0 * pressure::volume(&at.matter, t_k, at.p_pa, r)))
        .collect();
    format!("{} × ({}) = {:.4} L", call.quantity(1).si(), volumes.join(" + "), 1000.0 * value.si())
}

/// What a closed vessel holds before and after.
pub struct Filled {
    /// Gas at the start, mol.
    pub n0: f64,
    /// Gas formed on balance by the whole extent, mol.
    pub formed: f64,
    /// p₀ and T₀.
    p0_pa: f64,
    t0_k: f64,
}

/// The gas of a call for a closed vessel.
pub fn filled(cx: &Cx, call: &Call) -> Option<Filled> {
    let terms = call.terms()?;
    let p0_pa = call.option_quantity("initial").map_or(STANDARD_PRESSURE.value, Quantity::si);
    let t0_k = call.option_quantity("initial_T").map_or(crate::model::function::T_REFERENCE, Quantity::si);
    let n0 = p0_pa * call.quantity(3).si() / (cx.constants().molar_gas.value * t0_k);
    Some(Filled { n0, formed: call.quantity(1).si() * terms.delta_n_gas(), p0_pa, t0_k })
}

fn vessel_pressure(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let (n, t, v) = (extent(call)?, call.quantity(2), call.quantity(3));
    for (what, value) in [("the free volume", Some(v)), ("the pressure at the start", call.option_quantity("initial"))]
    {
        if let Some(value) = value.filter(|value| value.si() <= 0.0) {
            return Err(VesselError::NotPositive { what, given: text::shown_plain(value) }.into());
        }
    }
    let r = property::gas_constant(cx.constants());
    let Some(gas) = filled(cx, call) else { unreachable!("{} is asked of a reaction", call.card.id) };
    let n_end = gas.n0 + gas.formed;
    if n_end <= 0.0 {
        let figure = |mol: f64| crate::quantity::round::significant(mol, 3);
        return Err(VesselError::GasSpent { taken: figure(-gas.formed), held: figure(gas.n0) }.into());
    }
    let (t_k, v_m3) = (t.si(), v.si());
    let p = n_end * r.si() * t_k / v_m3;
    let p_gas = gas.formed * r.si() * t_k / v_m3;
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = smallvec![
        (Rc::clone(n.node()), terms.delta_n_gas() * r.si() * t_k / v_m3),
        (property::as_argument(t), p / t_k),
        (Rc::clone(v.node()), -p_gas / v_m3),
        (Rc::clone(r.node()), p_gas / r.si()),
    ];
    inputs.extend(call.option_quantity("initial").map(|p0| (Rc::clone(p0.node()), t_k / gas.t0_k)));
    let from_t0 = -gas.p0_pa * t_k / (gas.t0_k * gas.t0_k);
    inputs.extend(call.option_quantity("initial_T").map(|t0| (property::as_argument(t0), from_t0)));
    let step = Rc::clone(call);
    let dim = pressure::pressure_dim();
    Ok(Value::Quantity(Quantity::from_step(p, dim, Kind::PLAIN, inputs, step, cx.place.clone())?))
}

fn pressure_line(cx: &Cx, call: &Call, value: &Quantity, _: &mut Sources) -> String {
    let Some(gas) = filled(cx, call) else { return String::new() };
    let (t_k, v, r) = (call.quantity(2).si(), call.quantity(3).si(), cx.constants().molar_gas.value);
    let formed = if gas.formed < 0.0 { format!("({:.6})", gas.formed) } else { format!("{:.6}", gas.formed) };
    format!("({:.6} + {formed}) × {r:.6} × {t_k} / {v} / 1e5 = {:.4} bar", gas.n0, value.si() / 1e5)
}

/// The share of the extent at which a reaction comes to rest, its gases ideal: in a closed vessel of `per_mole` = R T/V times the
/// extent in Pa, or open at a pressure. The reactants are taken in the amounts of the equation. 1: complete.
pub fn share_at_rest(terms: &Terms, ln_k: f64, at: Rest) -> f64 {
    let gas = |nu: f64, x: f64| if nu > 0.0 { nu * x } else { -nu * (1.0 - x) };
    let gases: Vec<f64> =
        terms.terms().iter().filter(|term| term.substance.species.is_gas()).map(|term| term.nu).collect();
    let ln_q = |x: f64| -> f64 {
        let total: f64 = gases.iter().map(|nu| gas(*nu, x)).sum();
        let pressure = |moles: f64| match at {
            Rest::Closed { per_mole_pa } => moles * per_mole_pa,
            Rest::Open { p_pa } => p_pa * moles / total,
        };
        gases.iter().map(|nu| nu * math::ln(pressure(gas(*nu, x)) / STANDARD_PRESSURE.value)).sum()
    };
    // Rises with x from where no product is there to where a reactant is spent.
    let (mut low, mut high) = (0.0, 1.0);
    let close = |x: f64| ln_q(x) - ln_k;
    if close(1.0 - 1e-12) <= 0.0 {
        return 1.0;
    }
    if gases.is_empty() || close(1e-12) >= 0.0 {
        return 0.0;
    }
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if close(middle) < 0.0 { low = middle } else { high = middle }
    }
    0.5 * (low + high)
}

/// What is held while a reaction comes to rest.
#[derive(Clone, Copy, Debug)]
pub enum Rest {
    Closed { per_mole_pa: f64 },
    Open { p_pa: f64 },
}
