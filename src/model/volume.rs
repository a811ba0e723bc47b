//! Molar volume, and what a heat capacity at constant volume is less than at constant pressure.
//!
//! Cp − Cv = T (∂V/∂T)p² / −(∂V/∂p)T
//!         = T V₀ α²/κ                of a liquid or solid
//!         = (R + p dB/dT)²/R         of a gas by its second virial coefficient, R of an ideal one
//!
//! | symbol | unit   | meaning                                  |
//! |--------|--------|------------------------------------------|
//! | V₀     | m³/mol | molar volume on record                   |
//! | α, κ   | 1/K, 1/Pa | expansivity and compressibility       |
//! | B      | m³/mol | second virial coefficient                |
//!
//! The surprise: for metals the difference is what a Debye model lacks at room temperature, 0.7 J/(mol K) for copper.
//! Source: physical-chemistry texts under "difference of the heat capacities" (from memory).

use std::rc::Rc;

use smallvec::{SmallVec, smallvec};
use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::given::{CONSTANTS, GAS, Given, PRESSURE};
use crate::model::pressure::{self, AtPressure, Matter};
use crate::model::property::{self, Property};
use crate::quantity::Quantity;
use crate::record::node::Node;
use crate::units::{Dimension, Kind, State, What};

/// A volume that is not known.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum VolumeError {
    #[error("no molar volume of {species} is at hand: {why}")]
    Unknown { species: String, why: String },
    #[error("Cp - Cv of {species} needs its expansivity and compressibility: {why}")]
    Rigid { species: String, why: String },
}

impl Explain for VolumeError {
    fn code(&self) -> &'static str {
        match self {
            VolumeError::Unknown { .. } => "molar-volume-missing",
            VolumeError::Rigid { .. } => "compressibility-missing",
        }
    }

    fn hint(&self) -> String {
        let (VolumeError::Unknown { species, .. } | VolumeError::Rigid { species, .. }) = self;
        format!(
            "bring them: `constants: #{{ \"{species}\": #{{ V: \"... cm3/mol\", alpha: \"... 1/K\", kappa: \"... 1/Pa\" }} }}`"
        )
    }
}

const T: Arg =
    Arg { name: "T", takes: Takes::Temperature, default: Default::Required, doc: "temperature: degC, degF or kelvin" };
const OPTIONS: Arg = Arg {
    name: "options",
    takes: Takes::Options(&[PRESSURE, GAS, CONSTANTS]),
    default: Default::NoOptions,
    doc: "the pressure, the gas law, and constants of one's own",
};
const SOURCE: &str = "physical-chemistry texts, difference of the heat capacities (from memory)";

pub static MOLAR_VOLUME: Card = Card {
    id: "substance.molar-volume",
    name: "molar_volume",
    on: On::Substance,
    args: &[T, OPTIONS],
    gives: "volume per mole of the substance at T and p",
    doc: "Molar volume. R T/p of an ideal gas, R T/p + B by the second virial coefficient, V₀[1 + α(T - T₀) - κ(p - p₀)] of a \
          liquid or solid; p = 1 bar unless given.",
    source: "definitions; IUPAC Green Book, 3rd ed., section 2.11 (from memory)",
    example: "substance(\"H2O(l)\").molar_volume(\"25 degC\")",
    claims: &[],
    alternatives: &[],
    run: molar_volume,
    check_line: None,
    caution: None,
};

pub static HEAT_CAPACITY_V: Card = Card {
    id: "substance.heat-capacity-v",
    name: "heat_capacity_v",
    on: On::Substance,
    args: &[T, OPTIONS],
    gives: "Cv per mole of the substance at T and p",
    doc: "Heat capacity at constant volume. Cv = Cp - T V₀ α²/κ of a liquid or solid, Cp - (R + p dB/dT)²/R of a gas.",
    source: SOURCE,
    example: "substance(\"Cu(cr)\").heat_capacity_v(\"25 degC\")",
    claims: &[],
    alternatives: &[],
    run: heat_capacity_v,
    check_line: None,
    caution: None,
};

pub static HEAT_CAPACITY_DIFFERENCE: Card = Card {
    id: "volume.heat-capacity-difference",
    name: "heat_capacity_difference",
    on: On::Nothing,
    args: &[
        T,
        Arg {
            name: "V",
            takes: Takes::AnyQuantity,
            default: Default::Required,
            doc: "volume per mole or per kilogram, such as \"14.8 cm3/mol\"",
        },
        Arg { name: "alpha", takes: Takes::Quantity { unit: "1/K" }, default: Default::Required, doc: "expansivity" },
        Arg {
            name: "kappa",
            takes: Takes::Quantity { unit: "1/Pa" },
            default: Default::Required,
            doc: "compressibility",
        },
    ],
    gives: "Cp - Cv, per mole or per kilogram as V is",
    doc: "Difference of the heat capacities of a liquid or solid by figures of one's own. Cp - Cv = T V α²/κ.",
    source: SOURCE,
    example: "heat_capacity_difference(\"273 K\", \"14.8 cm3/mol\", \"1.8e-4 1/K\", \"3.9e-11 1/Pa\")",
    claims: &[],
    alternatives: &[],
    run: difference,
    check_line: None,
    caution: None,
};

/// The phase at T and p, its volume counted.
fn at(cx: &Cx, call: &Call) -> Result<AtPressure, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a substance", call.card.id) };
    let given = Given { volumes: true, ..Given::of(call, cx)?.unwrap_or_else(Given::standard) };
    let substance = &terms.terms()[0].substance;
    let at = pressure::resolve(substance, call.quantity(1).si(), &given, cx.constants().molar_gas.value)?;
    let virial_missing = given.virial && matches!(at.matter, Matter::IdealGas);
    if virial_missing || matches!(at.matter, Matter::Untouched) {
        let why = at.lacks.unwrap_or_default();
        return Err(VolumeError::Unknown { species: substance.id().to_owned(), why }.into());
    }
    Ok(at)
}

fn molar_volume(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let at = at(cx, call)?;
    let (t, r) = (call.quantity(1), property::gas_constant(cx.constants()));
    let (t_k, p) = (t.si(), at.p_pa);
    let v = pressure::volume(&at.matter, t_k, p, r.si());
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = SmallVec::new();
    let (by_t, by_p, by) = match at.matter {
        Matter::Condensed(c) => {
            let of_v0 = 1.0 + c.alpha * (t_k - c.t0_k) - c.kappa * (p - c.p0_pa);
            (c.v0 * c.alpha, -c.v0 * c.kappa, [of_v0, c.v0 * (t_k - c.t0_k), -c.v0 * (p - c.p0_pa)])
        }
        Matter::Virial(b) => (r.si() / p + b[1], -r.si() * t_k / (p * p), [1.0, 0.0, 0.0]),
        _ => (r.si() / p, -r.si() * t_k / (p * p), [0.0; 3]),
    };
    if !matches!(at.matter, Matter::Condensed(_)) {
        inputs.push((Rc::clone(r.node()), t_k / p));
    }
    for (node, weight) in at.constants.iter().zip(by) {
        inputs.extend(node.iter().filter(|_| weight != 0.0).map(|node| (Rc::clone(node), weight)));
    }
    inputs.push((property::as_argument(t), by_t));
    inputs.extend(at.p_node.iter().map(|node| (Rc::clone(node), by_p)));
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a substance", call.card.id) };
    let dim = Dimension::whole([3, 0, 0, 0, 0, 0]).over(&Dimension::amount(terms.per()));
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(v, dim, Kind::PLAIN, inputs, step, cx.place.clone())?))
}

fn heat_capacity_v(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a substance", call.card.id) };
    let at = at(cx, call)?;
    let (t, r) = (call.quantity(1), property::gas_constant(cx.constants()));
    let t_k = t.si();
    let method = property::method_of(call, cx)?;
    let cp = property::value(Property::Cp, terms, t, &method, call, cx)?;
    // The difference, and its derivatives by the constants, by T and by R.
    let (less, by, by_t, by_r) = match at.matter {
        Matter::Condensed(c) if c.kappa > 0.0 => {
            let less = t_k * c.v0 * c.alpha * c.alpha / c.kappa;
            (less, [less / c.v0, 2.0 * t_k * c.v0 * c.alpha / c.kappa, -less / c.kappa], less / t_k, 0.0)
        }
        Matter::Condensed(_) => {
            let why = at.lacks.unwrap_or_default();
            return Err(VolumeError::Rigid { species: terms.text().to_owned(), why }.into());
        }
        Matter::Virial(b) => {
            let sum = r.si() + at.p_pa * b[1];
            let by_slope = 2.0 * sum * at.p_pa / r.si();
            (
                sum * sum / r.si(),
                [0.0, by_slope, 0.0],
                by_slope * b[2],
                2.0 * sum / r.si() - sum * sum / (r.si() * r.si()),
            )
        }
        _ => (r.si(), [0.0; 3], 0.0, 1.0),
    };
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = smallvec![(Rc::clone(cp.node()), 1.0)];
    for (node, weight) in at.constants.iter().zip(by) {
        inputs.extend(node.iter().filter(|_| weight != 0.0).map(|node| (Rc::clone(node), -weight)));
    }
    inputs.push((property::as_argument(t), -by_t));
    if by_r != 0.0 {
        inputs.push((Rc::clone(r.node()), -by_r));
    }
    let state =
        State { zero: None, t_k: Some(t_k), p_pa: Some(at.p_pa), standard: method.given.is_none(), reaction: false };
    let (dim, kind) = (cp.dim().clone(), Kind::in_state(What::Cv, state));
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(cp.si() - less, dim, kind, inputs, step, cx.place.clone())?))
}

fn difference(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (t, v, alpha, kappa) = (call.quantity(0), call.quantity(1), call.quantity(2), call.quantity(3));
    let si = t.si() * v.si() * alpha.si() * alpha.si() / kappa.si();
    let dim = v.dim().times(alpha.dim()).times(alpha.dim()).times(t.dim()).over(kappa.dim());
    let inputs = smallvec![
        (property::as_argument(t), si / t.si()),
        (Rc::clone(v.node()), si / v.si()),
        (Rc::clone(alpha.node()), 2.0 * si / alpha.si()),
        (Rc::clone(kappa.node()), -si / kappa.si()),
    ];
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(si, dim, Kind::PLAIN, inputs, step, cx.place.clone())?))
}
