//! Vapour pressure, boiling point and enthalpy of vaporisation of a liquid whose vapour-pressure equation is on record.
//!
//! lg(p/Pa) = a − b/(T + c)   or   ln(p/p_c) = (T_c/T) Σ aᵢ (1 − T/T_c)^nᵢ
//! ΔvapH = T (dp/dT) (V_g − V_l),   V_g = R T/p + B       (Clapeyron, no approximation but that of V_g)
//!
//! | symbol   | unit   | meaning                                        |
//! |----------|--------|------------------------------------------------|
//! | p        | Pa     | vapour pressure at T                           |
//! | V_g, V_l | m³/mol | molar volumes of saturated vapour and liquid   |
//! | B        | m³/mol | second virial coefficient of the vapour        |
//!
//! The surprise: with `gas: "ideal"` this is the equation of Clausius and Clapeyron, which leaves out B and V_l; what that
//! costs stands in the register (`saturated-vapour-ideal`), 0.6 kJ/mol for water at its boiling point.
//! Source: R. Clausius, B. P. E. Clapeyron; physical-chemistry texts (from memory).

use std::convert::Infallible;
use std::rc::Rc;
use std::sync::Arc;

use smallvec::{SmallVec, smallvec};
use thiserror::Error;

use crate::chem::species::State as Aggregate;
use crate::data::pressure::{VapourForm, VapourPressure};
use crate::data::substance::Substance;
use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Sources, Takes, Value};
use crate::model::claims;
use crate::model::given::{CONSTANTS, GAS, Given};
use crate::model::pressure::{self, Matter};
use crate::model::property;
use crate::model::virial;
use crate::num::{math, root};
use crate::quantity::{Quantity, round};
use crate::record::node::{Input, LeafKey, Node};
use crate::units::{Base, Dimension, Kind, State, What, Zero};

/// Why a vapour pressure or what follows from one is not to be had.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum VapourError {
    #[error("no vapour-pressure equation of {species} is on record")]
    NoEquation { species: String },
    #[error("{t_k} K is outside the range of the vapour-pressure equation of {species}, {t_min} K to {t_max} K")]
    Range { species: String, t_k: f64, t_min: f64, t_max: f64 },
    #[error(
        "{species} does not boil at {p_bar} bar within the range of its vapour-pressure equation, {low} bar to {high} bar"
    )]
    NoBoiling { species: String, p_bar: String, low: String, high: String },
    #[error("{species} is no liquid, and a vapour pressure is asked of one")]
    NotLiquid { species: String, liquid: String },
}

impl Explain for VapourError {
    fn code(&self) -> &'static str {
        match self {
            VapourError::NoEquation { .. } => "vapour-pressure-missing",
            VapourError::Range { .. } => "vapour-pressure-out-of-range",
            VapourError::NoBoiling { .. } => "boiling-point-out-of-range",
            VapourError::NotLiquid { .. } => "vapour-pressure-of-no-liquid",
        }
    }

    fn hint(&self) -> String {
        match self {
            VapourError::NoEquation { .. } => {
                "with two measured pressures use `vaporisation_from_pressures(p1, T1, p2, T2)`".to_owned()
            }
            VapourError::Range { t_min, t_max, .. } => format!("choose a temperature from {t_min} K to {t_max} K"),
            VapourError::NoBoiling { .. } => {
                "choose a pressure within that range, or go on from its end with `boiling_point_at(p1, T1, dH, p2)`"
                    .to_owned()
            }
            VapourError::NotLiquid { liquid, .. } => format!("ask `substance(\"{liquid}\")`"),
        }
    }
}

/// ln(p/Pa) with its first and second derivative with respect to T.
pub fn ln_p(form: &VapourForm, t_k: f64) -> [f64; 3] {
    const LN_10: f64 = std::f64::consts::LN_10;
    match form {
        VapourForm::Antoine { a, b_k, c_k } => {
            let shifted = t_k + c_k;
            let slope = LN_10 * b_k / (shifted * shifted);
            [LN_10 * (a - b_k / shifted), slope, -2.0 * slope / shifted]
        }
        VapourForm::Reduced { terms, tc_k, pc_pa } => {
            let tau = 1.0 - t_k / tc_k;
            let mut f = [0.0; 3];
            for (a, n) in terms {
                f[0] += a * math::pow(tau, *n);
                f[1] -= a * n * math::pow(tau, n - 1.0) / tc_k;
                f[2] += a * n * (n - 1.0) * math::pow(tau, n - 2.0) / (tc_k * tc_k);
            }
            let k = tc_k / t_k;
            [
                math::ln(*pc_pa) + k * f[0],
                k * (f[1] - f[0] / t_k),
                k * (f[2] - 2.0 * f[1] / t_k + 2.0 * f[0] / (t_k * t_k)),
            ]
        }
    }
}

/// The vapour pressure above which a gas is no gas at `t_k`: of its liquid on record, else estimated from its critical
/// constants. `None` above the critical temperature, and where neither is on record.
pub fn saturation(cx: &Cx, gas: &Substance, t_k: f64) -> Option<f64> {
    let liquid = cx.data().phases_of(gas).into_iter().find_map(|phase| phase.pressure.vapour.clone());
    if let Some(record) = liquid.filter(|record| record.t_min <= t_k && t_k <= record.t_max) {
        return Some(math::exp(ln_p(&record.form, t_k)[0]));
    }
    virial::saturation_estimate(gas.pressure.critical.as_deref()?, t_k)
}

const T: Arg =
    Arg { name: "T", takes: Takes::Temperature, default: Default::Required, doc: "temperature: degC, degF or kelvin" };

const CLAPEYRON: &str = "Clapeyron equation; physical-chemistry texts (from memory)";
const EQUATION: &str = "vapour-pressure equation on record";

pub static VAPOUR_PRESSURE: Card = Card {
    id: "substance.vapour-pressure",
    name: "vapour_pressure",
    on: On::Substance,
    args: &[T],
    gives: "the vapour pressure of the liquid at T",
    doc: "Evaluates the vapour-pressure equation that is on record of a liquid.",
    source: EQUATION,
    example: "substance(\"H2O(l)\").vapour_pressure(\"80 degC\")",
    claims: &[],
    alternatives: &[],
    run: vapour_pressure,
    check_line: Some(|cx, call, value, sources| equation_line(cx, call, call.quantity(1).si(), value.si(), sources)),
    caution: None,
};

pub static BOILING_POINT: Card = Card {
    id: "substance.boiling-point",
    name: "boiling_point",
    on: On::Substance,
    args: &[Arg {
        name: "p",
        takes: Takes::Quantity { unit: "Pa" },
        default: Default::Required,
        doc: "absolute pressure",
    }],
    gives: "the temperature at which the liquid boils under that pressure",
    doc: "Solves the vapour-pressure equation that is on record of a liquid for the temperature.",
    source: EQUATION,
    example: "substance(\"H2O(l)\").boiling_point(\"1 atm\")",
    claims: &[],
    alternatives: &[],
    run: boiling_point,
    check_line: Some(|cx, call, value, sources| equation_line(cx, call, value.si(), call.quantity(1).si(), sources)),
    caution: None,
};

pub static VAPORISATION_ENTHALPY: Card = Card {
    id: "substance.vaporisation-enthalpy",
    name: "vaporisation_enthalpy",
    on: On::Substance,
    args: &[
        T,
        Arg {
            name: "options",
            takes: Takes::Options(&[GAS, CONSTANTS]),
            default: Default::NoOptions,
            doc: "the vapour by its second virial coefficient and the liquid by its volume, unless `gas: \"ideal\"`",
        },
    ],
    gives: "H(vapour) - H(liquid) at T and the vapour pressure, per mole of the substance",
    doc: "Enthalpy of vaporisation at saturation from the slope of the vapour pressure. ΔvapH = T (dp/dT)(V_g - V_l), with \
          V_g = R T/p + B; what is not on record of B and V_l counts as 0 and stands in the register.",
    source: CLAPEYRON,
    example: "substance(\"H2O(l)\").vaporisation_enthalpy(\"100 degC\")",
    claims: &[
        Claim { id: "saturated-vapour-ideal", test: claims::saturated_vapour },
        Claim { id: "second-virial", test: claims::saturated_virial },
    ],
    alternatives: &[],
    run: vaporisation_enthalpy,
    check_line: Some(check_line),
    caution: None,
};

/// The liquid that was asked, with its equation.
fn record(cx: &Cx, call: &Call) -> Result<(Arc<Substance>, Arc<VapourPressure>), Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a substance", call.card.id) };
    let substance = Arc::clone(&terms.terms()[0].substance);
    let species = substance.id().to_owned();
    if let Some(found) = &substance.pressure.vapour {
        return Ok((Arc::clone(&substance), Arc::clone(found)));
    }
    let mut phases = cx.data().phases_of(&substance).into_iter();
    if substance.species.phase.state != Aggregate::Liquid
        && let Some(liquid) = phases.find(|phase| phase.pressure.vapour.is_some())
    {
        return Err(VapourError::NotLiquid { species, liquid: liquid.id().to_owned() }.into());
    }
    Err(VapourError::NoEquation { species }.into())
}

/// p and its derivatives at T, within the range of the equation.
fn at(substance: &Substance, record: &VapourPressure, t_k: f64) -> Result<[f64; 3], VapourError> {
    let (t_min, t_max) = (record.t_min, record.t_max);
    if !(t_min <= t_k && t_k <= t_max) {
        return Err(VapourError::Range { species: substance.id().to_owned(), t_k, t_min, t_max });
    }
    let [ln, d, d2] = ln_p(&record.form, t_k);
    let p = math::exp(ln);
    Ok([p, p * d, p * (d * d + d2)])
}

/// A figure of the equation as an input.
fn leaf(substance: &Substance, record: &VapourPressure, t_k: f64, si: f64, slope: bool) -> Result<Rc<Node>, Fault> {
    let key = LeafKey::Datum {
        dataset: "pressure-constants".into(),
        record: substance.species.id.clone(),
        field: "vapour pressure",
        t_bits: t_k.to_bits(),
        way: if slope { "slope" } else { "" },
    };
    // Antoine constants of three decimals and more give p to four figures.
    let digit = (!slope).then(|| round_unit(si, 4));
    let input = Input { digit, citation: Some(record.citation.clone()), ..Input::of(key) };
    let kelvin = Dimension::base(Base::Kelvin);
    let dim = if slope { pressure::pressure_dim().over(&kelvin) } else { pressure::pressure_dim() };
    Ok(Rc::clone(Quantity::input(si, dim, Kind::PLAIN, input, None)?.node()))
}

/// One unit in the last of so many significant figures.
fn round_unit(x: f64, figures: i32) -> f64 {
    let leading = math::log10(x.abs()).floor() as i32;
    math::pow(10.0, f64::from(leading + 1 - figures))
}

fn vapour_pressure(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (substance, record) = record(cx, call)?;
    let t = call.quantity(1);
    let [p, slope, _] = at(&substance, &record, t.si())?;
    let inputs = smallvec![(leaf(&substance, &record, t.si(), p, false)?, 1.0), (property::as_argument(t), slope),];
    let step = Rc::clone(call);
    let made = Quantity::from_step(p, pressure::pressure_dim(), Kind::PLAIN, inputs, step, cx.place.clone())?;
    Ok(Value::Quantity(made))
}

fn boiling_point(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (substance, record) = record(cx, call)?;
    let given = call.quantity(1);
    let wanted = given.si();
    let species = || substance.id().to_owned();
    let bar = |p: f64| round::significant(p / 1e5, 4);
    let end = |t: f64| math::exp(ln_p(&record.form, t)[0]);
    let none = || VapourError::NoBoiling {
        species: species(),
        p_bar: bar(wanted),
        low: bar(end(record.t_min)),
        high: bar(end(record.t_max)),
    };
    if wanted.is_nan() || wanted <= 0.0 {
        return Err(none().into());
    }
    let ln_wanted = math::ln(wanted);
    let off = |t: f64| Ok::<f64, Infallible>(ln_p(&record.form, t)[0] - ln_wanted);
    let t_k = match root::bracketed(off, record.t_min, record.t_max, 1e-9) {
        Ok(Ok(root)) => root.x,
        Ok(Err(_)) => return Err(none().into()),
        Err(never) => match never {},
    };
    let [p, slope, _] = at(&substance, &record, t_k)?;
    // T(p): dT = (dp − ∂p at constant T)/(dp/dT)
    let inputs = smallvec![
        (leaf(&substance, &record, t_k, p, false)?, -1.0 / slope),
        (property::as_argument(given), 1.0 / slope),
    ];
    let (dim, kind) = (Dimension::base(Base::Kelvin), Kind::of(What::TemperaturePoint));
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(t_k, dim, kind, inputs, step, cx.place.clone())?))
}

/// The vapour-pressure equation with its figures at T.
fn equation_line(cx: &Cx, call: &Call, t_k: f64, p_pa: f64, sources: &mut Sources) -> String {
    let Ok((_, record)) = record(cx, call) else { return String::new() };
    let (source, t) = (sources.number(&record.citation), round::significant(t_k, 8));
    let p = round::significant(p_pa, 6);
    match &record.form {
        VapourForm::Antoine { a, b_k, c_k } => format!("10^({a} - {b_k} / ({t} + ({c_k})))[{source}] Pa = {p} Pa"),
        VapourForm::Reduced { terms, tc_k, pc_pa } => {
            let term = |(a, n): &(f64, f64)| format!("({a}) × (1 - {t} / {tc_k})^{n}");
            let sum = terms.iter().map(term).collect::<Vec<_>>().join(" + ");
            format!("{pc_pa} × exp({tc_k} / {t} × ({sum}))[{source}] Pa = {p} Pa")
        }
    }
}

/// The vapour that a liquid gives, by its record.
fn vapour_of(cx: &Cx, liquid: &Substance) -> Option<Arc<Substance>> {
    cx.data().phases_of(liquid).into_iter().find(|phase| phase.species.is_gas())
}

/// What the Clapeyron equation takes, and gives.
pub struct Clapeyron {
    pub dh: f64,
    /// p, dp/dT and d²p/dT² at T.
    pub p: [f64; 3],
    /// B and its derivatives, where they are counted.
    pub gas: Option<pressure::AtPressure>,
    /// The liquid's volume at T and p, where it is counted.
    pub liquid: Option<pressure::AtPressure>,
    /// What is not on record, in words.
    pub lacks: Vec<String>,
    pub substance: Arc<Substance>,
    record: Arc<VapourPressure>,
}

/// The enthalpy of vaporisation of a call, with B and V_l or without.
///
/// # Errors
/// There is no equation, or T is outside its range.
pub fn clapeyron(cx: &Cx, call: &Call, ideal: bool) -> Result<Clapeyron, Fault> {
    let (substance, record) = record(cx, call)?;
    let t_k = call.quantity(1).si();
    let r = cx.constants().molar_gas.value;
    let p = at(&substance, &record, t_k)?;
    let (mut gas, mut liquid, mut lacks) = (None, None, Vec::new());
    if !ideal {
        let own = Given::of(call, cx)?;
        let given = Given { virial: true, volumes: true, ..own.unwrap_or_else(Given::standard) };
        match vapour_of(cx, &substance) {
            None => lacks.push(format!("no vapour of {} is on record", substance.id())),
            Some(vapour) => {
                let found = pressure::resolve(&vapour, t_k, &given, r)?;
                lacks.extend(found.lacks.as_ref().map(|why| format!("B of {}: {why}", vapour.id())));
                gas = matches!(found.matter, Matter::Virial(_)).then_some(found);
            }
        }
        let found = pressure::resolve(&substance, t_k, &given, r)?;
        lacks.extend(found.lacks.as_ref().map(|why| format!("V of {}: {why}", substance.id())));
        liquid = matches!(found.matter, Matter::Condensed(_)).then_some(found);
    }
    let v = |at: &Option<pressure::AtPressure>| at.as_ref().map(|at| pressure::volume(&at.matter, t_k, p[0], r));
    let v_gas = v(&gas).unwrap_or(r * t_k / p[0]);
    let dh = t_k * p[1] * (v_gas - v(&liquid).unwrap_or(0.0));
    Ok(Clapeyron { dh, p, gas, liquid, lacks, substance, record })
}

/// Whether a call asked for the vapour as ideal, and the liquid as without volume.
pub fn asked_ideal(call: &Call) -> bool {
    call.option("gas").is_some_and(|word| **word == *"ideal")
}

fn vaporisation_enthalpy(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    Ok(Value::Quantity(vaporisation(cx, call, asked_ideal(call))?))
}

/// The same as a value, with its inputs.
///
/// # Errors
/// As [`clapeyron`].
pub fn vaporisation(cx: &Cx, call: &Rc<Call>, ideal: bool) -> Result<Quantity, Fault> {
    let made = clapeyron(cx, call, ideal)?;
    let t = call.quantity(1);
    let (t_k, r) = (t.si(), cx.constants().molar_gas.value);
    let [p, p1, p2] = made.p;
    let virial = match made.gas.as_ref().map(|at| at.matter) {
        Some(Matter::Virial(b)) => b,
        _ => [0.0; 4],
    };
    let condensed = match made.liquid.as_ref().map(|at| at.matter) {
        Some(Matter::Condensed(c)) => Some(c),
        _ => None,
    };
    let dv = made.dh / (t_k * p1);
    // Along the saturation line the volumes change with T and with p.
    let (liquid_t, liquid_p) = condensed.map_or((0.0, 0.0), |c| (c.v0 * c.alpha, -c.v0 * c.kappa));
    let dv_t = r / p + virial[1] - liquid_t;
    let dv_p = -r * t_k / (p * p) - liquid_p;
    let by_t = p1 * dv + t_k * p2 * dv + t_k * p1 * (dv_t + dv_p * p1);
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = smallvec![
        (leaf(&made.substance, &made.record, t_k, p, false)?, t_k * p1 * dv_p),
        (leaf(&made.substance, &made.record, t_k, p1, true)?, t_k * dv),
        (property::as_argument(t), by_t),
        (Rc::clone(property::gas_constant(cx.constants()).node()), t_k * p1 * t_k / p),
    ];
    if let Some(b) = made.gas.as_ref().and_then(|at| at.constants[0].clone()) {
        inputs.push((b, t_k * p1));
    }
    if let (Some(at), Some(c)) = (&made.liquid, condensed) {
        let by =
            [1.0 + c.alpha * (t_k - c.t0_k) - c.kappa * (p - c.p0_pa), c.v0 * (t_k - c.t0_k), -c.v0 * (p - c.p0_pa)];
        for (node, weight) in at.constants.iter().zip(by) {
            inputs.extend(node.iter().filter(|_| weight != 0.0).map(|node| (Rc::clone(node), -t_k * p1 * weight)));
        }
    }
    let state = State {
        zero: Some(Zero::Named(format!("the liquid at {} K", round::shortest(t_k)).into())),
        t_k: Some(t_k),
        p_pa: Some(p),
        standard: false,
        reaction: false,
    };
    let dim = Dimension::whole([2, 1, -2, 0, 0, 0]).over(&Dimension::amount(made.substance.species.entity));
    let step = Rc::clone(call);
    Ok(Quantity::from_step(made.dh, dim, Kind::in_state(What::H, state), inputs, step, cx.place.clone())?)
}

fn check_line(cx: &Cx, call: &Call, value: &Quantity, sources: &mut Sources) -> String {
    let Ok(made) = clapeyron(cx, call, asked_ideal(call)) else { return String::new() };
    let (t_k, r) = (call.quantity(1).si(), &cx.constants().molar_gas);
    let equation = sources.number(&made.record.citation);
    let mut volume = format!("{:.6} × {t_k} / {:.6e}[{equation}]", r.value, made.p[0]);
    let volume_of = |at: &pressure::AtPressure| match at.matter {
        Matter::Virial(b) => b[0],
        ref matter => pressure::volume(matter, t_k, made.p[0], r.value),
    };
    for (sign, at) in [(" + ", &made.gas), (" - ", &made.liquid)] {
        let Some(at) = at else { continue };
        let source = at.citation.as_ref().map_or_else(String::new, |c| format!("[{}]", sources.number(c)));
        volume.push_str(&format!("{sign}({:.4e}){source}", volume_of(at)));
    }
    let result = value.si() / 1000.0;
    format!("{t_k} × {:.6e}[{equation}] × ({volume}) / 1000 = {result:.3} kJ/mol", made.p[1])
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::data::catalog::Catalog;

    #[test]
    fn derivatives_of_the_equations_are_those_of_differences() {
        for id in ["H2O(l)", "methanol(l)"] {
            let record = Catalog::shipped().find(id).unwrap().pressure.vapour.clone().unwrap();
            let (t, h) = (340.0, 0.01);
            let at = |t: f64| ln_p(&record.form, t);
            for order in 1..3 {
                let difference = (at(t + h)[order - 1] - at(t - h)[order - 1]) / (2.0 * h);
                // Bound: h²/6 of the third derivative, some (10/T)² of the first, and rounding of ln p near 11 over h.
                assert!((at(t)[order] - difference).abs() < 1e-6 * difference.abs() + 1e-12, "{id} {order}");
            }
        }
    }
}
