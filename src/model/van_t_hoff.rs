//! Equilibrium constants, Gibbs energies and vapour pressures carried from one temperature to another by figures of one's own.
//!
//! ln(K₂/K₁) = (ΔH₁ − ΔCp T₁)/R · (1/T₁ − 1/T₂) + (ΔCp/R) ln(T₂/T₁)                      (van 't Hoff)
//! ΔG₂/T₂ = ΔG₁/T₁ − (ΔH₁ − ΔCp T₁)(1/T₁ − 1/T₂) − ΔCp ln(T₂/T₁)                        (Gibbs, Helmholtz)
//! ln(p₂/p₁) = (ΔvapH/R)(1/T₁ − 1/T₂)                                                    (Clausius, Clapeyron)
//!
//! | symbol   | unit      | meaning                                                         |
//! |----------|-----------|-----------------------------------------------------------------|
//! | K₁, K₂   | 1         | constants on one standard pressure at T₁ and T₂                  |
//! | ΔH₁      | J/mol     | reaction enthalpy at T₁                                         |
//! | ΔCp      | J/(mol K) | heat capacity of the reaction, constant between T₁ and T₂       |
//! | p₁, p₂   | Pa        | vapour pressures at T₁ and T₂                                   |
//!
//! The surprise: the enthalpy that two constants give is that at T₁ only with ΔCp said; without, it is a mean over the range.
//! Source: J. H. van 't Hoff; H. von Helmholtz; R. Clausius and B. P. E. Clapeyron; physical-chemistry texts (from memory).

use std::rc::Rc;

use smallvec::{SmallVec, smallvec};
use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Takes, Value};
use crate::model::claims;
use crate::model::property;
use crate::num::math;
use crate::quantity::{Quantity, round, text};
use crate::record::node::Node;
use crate::units::{Base, Dimension, Kind, What};

/// Figures that no such relation joins.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum VanTHoffError {
    #[error("{what} of {given} is not above zero, and its logarithm is asked for")]
    NotPositive { what: &'static str, given: String },
    #[error("both figures are at {t_k} K, and two temperatures are needed to tell an enthalpy")]
    SameTemperature { t_k: String },
    #[error("a pressure of {p} is not reached at any temperature by these figures")]
    NoTemperature { p: String },
}

impl Explain for VanTHoffError {
    fn code(&self) -> &'static str {
        match self {
            VanTHoffError::NotPositive { .. } => "logarithm-of-no-positive",
            VanTHoffError::SameTemperature { .. } => "two-temperatures-equal",
            VanTHoffError::NoTemperature { .. } => "boiling-point-not-reached",
        }
    }

    fn hint(&self) -> String {
        match self {
            VanTHoffError::NotPositive { .. } => {
                "give the constant itself and not its logarithm: lg K = -3 is K = 1e-3".to_owned()
            }
            VanTHoffError::SameTemperature { .. } => "give two figures at two temperatures".to_owned(),
            VanTHoffError::NoTemperature { .. } => {
                "the relation has a highest pressure, exp(ΔH/(R T1)) times p1; check the figures".to_owned()
            }
        }
    }
}

const fn arg(name: &'static str, takes: Takes, doc: &'static str) -> Arg {
    Arg { name, takes, default: Default::Required, doc }
}
const K1: Arg = arg("K1", Takes::Quantity { unit: "1" }, "equilibrium constant at T1");
const K2: Arg = arg("K2", Takes::Quantity { unit: "1" }, "equilibrium constant at T2, on the same standard pressure");
const T1: Arg = arg("T1", Takes::Temperature, "temperature of the first figure");
const T2: Arg = arg("T2", Takes::Temperature, "temperature of the second");
const DH: Arg = arg("dH", Takes::Quantity { unit: "J/mol" }, "enthalpy at T1 that belongs to it");
const P1: Arg = arg("p1", Takes::Quantity { unit: "Pa" }, "vapour pressure at T1");
const P2: Arg = arg("p2", Takes::Quantity { unit: "Pa" }, "vapour pressure at T2");
const OPTIONS: Arg = Arg {
    name: "options",
    takes: Takes::Options(&[Arg {
        name: "dCp",
        takes: Takes::Quantity { unit: "J/(mol K)" },
        default: Default::Absent,
        doc: "heat capacity of the reaction, constant in between; 0 unless given",
    }]),
    default: Default::NoOptions,
    doc: "what else is known",
};
const CONSTANT_ENTHALPY: &[Claim] = &[Claim { id: "constant-heat-capacity", test: claims::constant_enthalpy }];
const IDEAL_VAPOUR: &[Claim] = &[
    Claim { id: "saturated-vapour-ideal", test: claims::own_vapour },
    Claim { id: "constant-heat-capacity", test: claims::constant_enthalpy },
];
const VAN_T_HOFF: &str = "van 't Hoff equation; physical-chemistry texts (from memory)";
const HELMHOLTZ: &str = "Gibbs-Helmholtz equation; physical-chemistry texts (from memory)";
const CLAUSIUS: &str = "Clausius-Clapeyron equation; physical-chemistry texts (from memory)";

macro_rules! own_card {
    ($name:ident, $id:literal, $script:literal, $args:expr, $claims:expr, $source:expr, $run:expr, $gives:literal, $doc:literal, $example:literal) => {
        pub static $name: Card = Card {
            id: $id,
            name: $script,
            on: On::Nothing,
            args: $args,
            gives: $gives,
            doc: $doc,
            source: $source,
            example: $example,
            claims: $claims,
            alternatives: &[],
            run: $run,
            check_line: None,
            caution: None,
        };
    };
}

own_card!(
    CONSTANT_AT,
    "van-t-hoff.constant-at",
    "constant_at",
    &[K1, T1, T2, DH, OPTIONS],
    CONSTANT_ENTHALPY,
    VAN_T_HOFF,
    constant_at,
    "the equilibrium constant at T2",
    "Carries an equilibrium constant of one's own to another temperature. ln(K2/K1) = (dH - dCp T1)/R (1/T1 - 1/T2) + dCp/R \
     ln(T2/T1).",
    "constant_at(\"1.05e-23\", \"298.15 K\", \"1000 K\", \"178.5 kJ/mol\")"
);
own_card!(
    ENTHALPY_FROM_CONSTANTS,
    "van-t-hoff.enthalpy-from-constants",
    "enthalpy_from_constants",
    &[K1, T1, K2, T2, OPTIONS],
    CONSTANT_ENTHALPY,
    VAN_T_HOFF,
    enthalpy_from_constants,
    "the reaction enthalpy at T1; without dCp a mean between T1 and T2",
    "Reaction enthalpy from equilibrium constants at two temperatures. dH = dCp T1 + [R ln(K2/K1) - dCp ln(T2/T1)]/(1/T1 - 1/T2).",
    "enthalpy_from_constants(\"0.0956\", \"1000 K\", \"0.673\", \"1100 K\")"
);
own_card!(
    GIBBS_FROM_CONSTANT,
    "van-t-hoff.gibbs-from-constant",
    "gibbs_from_constant",
    &[
        arg("K", Takes::Quantity { unit: "1" }, "equilibrium constant at T"),
        arg("T", Takes::Temperature, "temperature")
    ],
    &[],
    "definition of K°; IUPAC Green Book, 3rd ed., section 2.11 (from memory)",
    gibbs_from_constant,
    "ΔG of the reaction at T, on the standard pressure of K",
    "Standard Gibbs energy from an equilibrium constant. dG = -R T ln K.",
    "gibbs_from_constant(\"0.0956\", \"1000 K\")"
);
own_card!(
    GIBBS_AT,
    "van-t-hoff.gibbs-at",
    "gibbs_at",
    &[arg("dG", Takes::Quantity { unit: "J/mol" }, "Gibbs energy at T1"), T1, T2, DH, OPTIONS],
    CONSTANT_ENTHALPY,
    HELMHOLTZ,
    gibbs_at,
    "the Gibbs energy at T2",
    "Carries a Gibbs energy of one's own to another temperature. dG2 = T2 [dG1/T1 - (dH - dCp T1)(1/T1 - 1/T2) - dCp ln(T2/T1)].",
    "gibbs_at(\"370.7 kJ/mol\", \"298.15 K\", \"400 K\", \"416.3 kJ/mol\")"
);
own_card!(
    VAPORISATION_FROM_PRESSURES,
    "van-t-hoff.vaporisation-from-pressures",
    "vaporisation_from_pressures",
    &[P1, T1, P2, T2],
    IDEAL_VAPOUR,
    CLAUSIUS,
    vaporisation_from_pressures,
    "the enthalpy of vaporisation, a mean between T1 and T2",
    "Enthalpy of vaporisation from two measured vapour pressures, the vapour ideal. dH = R ln(p2/p1)/(1/T1 - 1/T2).",
    "vaporisation_from_pressures(\"0.12334 bar\", \"50 degC\", \"1.01418 bar\", \"100 degC\")"
);
own_card!(
    VAPOUR_PRESSURE_AT,
    "van-t-hoff.vapour-pressure-at",
    "vapour_pressure_at",
    &[P1, T1, T2, DH],
    IDEAL_VAPOUR,
    CLAUSIUS,
    vapour_pressure_at,
    "the vapour pressure at T2",
    "Carries a vapour pressure of one's own to another temperature, the vapour ideal. p2 = p1 exp[dH/R (1/T1 - 1/T2)].",
    "vapour_pressure_at(\"1 atm\", \"100 degC\", \"90 degC\", \"40.66 kJ/mol\")"
);
own_card!(
    BOILING_POINT_AT,
    "van-t-hoff.boiling-point-at",
    "boiling_point_at",
    &[P1, T1, DH, P2],
    IDEAL_VAPOUR,
    CLAUSIUS,
    boiling_point_at,
    "the boiling point under p2",
    "Carries a boiling point of one's own to another pressure, the vapour ideal. 1/T2 = 1/T1 - R ln(p2/p1)/dH.",
    "boiling_point_at(\"1 atm\", \"100 degC\", \"40.66 kJ/mol\", \"0.7 bar\")"
);

type Inputs = SmallVec<[(Rc<Node>, f64); 2]>;

fn ln_of(what: &'static str, value: &Quantity) -> Result<f64, Fault> {
    if value.si() > 0.0 {
        return Ok(math::ln(value.si()));
    }
    Err(VanTHoffError::NotPositive { what, given: text::shown_plain(value) }.into())
}

/// 1/T₁ − 1/T₂ and ln(T₂/T₁), which must not vanish.
fn span(t1: f64, t2: f64) -> Result<(f64, f64), Fault> {
    if t1 == t2 {
        return Err(VanTHoffError::SameTemperature { t_k: round::shortest(t1) }.into());
    }
    Ok((1.0 / t1 - 1.0 / t2, math::ln(t2 / t1)))
}

fn dcp_of(call: &Call) -> Option<&Quantity> {
    call.option_quantity("dCp")
}

fn given(value: &Quantity) -> Rc<Node> {
    Rc::clone(value.node())
}

fn made(cx: &Cx, call: &Rc<Call>, si: f64, dim: Dimension, what: What, inputs: Inputs) -> Result<Value, Fault> {
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(si, dim, Kind::of(what), inputs, step, cx.place.clone())?))
}

fn energy() -> Dimension {
    property::energy_per_open_mole()
}

fn constant_at(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (k1, t1, t2, dh) = (call.quantity(0), call.quantity(1), call.quantity(2), call.quantity(3));
    let r = property::gas_constant(cx.constants());
    let (ln_k1, dcp) = (ln_of("a constant", k1)?, dcp_of(call));
    let (a, b) = (1.0 / t1.si() - 1.0 / t2.si(), math::ln(t2.si() / t1.si()));
    let cp = dcp.map_or(0.0, Quantity::si);
    let over_r = (dh.si() - cp * t1.si()) * a + cp * b;
    let k2 = math::exp(ln_k1 + over_r / r.si());
    let by_t1 = k2 / r.si() * (-cp * a - (dh.si() - cp * t1.si()) / (t1.si() * t1.si()) - cp / t1.si());
    let by_t2 = k2 / r.si() * ((dh.si() - cp * t1.si()) / (t2.si() * t2.si()) + cp / t2.si());
    let mut inputs: Inputs = smallvec![
        (given(k1), k2 / k1.si()),
        (given(dh), k2 * a / r.si()),
        (property::as_argument(t1), by_t1),
        (property::as_argument(t2), by_t2),
        (given(&r), -k2 * over_r / (r.si() * r.si())),
    ];
    inputs.extend(dcp.map(|dcp| (given(dcp), k2 / r.si() * (b - t1.si() * a))));
    made(cx, call, k2, Dimension::none(), What::Plain, inputs)
}

fn enthalpy_from_constants(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (k1, t1, k2, t2) = (call.quantity(0), call.quantity(1), call.quantity(2), call.quantity(3));
    let r = property::gas_constant(cx.constants());
    let (a, b) = span(t1.si(), t2.si())?;
    let ln_ratio = ln_of("a constant", k2)? - ln_of("a constant", k1)?;
    let dcp = dcp_of(call);
    let cp = dcp.map_or(0.0, Quantity::si);
    let bracket = (r.si() * ln_ratio - cp * b) / a;
    let dh = cp * t1.si() + bracket;
    let by_t1 = cp + cp / (t1.si() * a) + bracket / (a * t1.si() * t1.si());
    let by_t2 = -cp / (t2.si() * a) - bracket / (a * t2.si() * t2.si());
    let mut inputs: Inputs = smallvec![
        (given(k1), -r.si() / (a * k1.si())),
        (given(k2), r.si() / (a * k2.si())),
        (property::as_argument(t1), by_t1),
        (property::as_argument(t2), by_t2),
        (given(&r), ln_ratio / a),
    ];
    inputs.extend(dcp.map(|dcp| (given(dcp), t1.si() - b / a)));
    made(cx, call, dh, energy(), What::H, inputs)
}

fn gibbs_from_constant(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (k, t) = (call.quantity(0), call.quantity(1));
    let r = property::gas_constant(cx.constants());
    let ln_k = ln_of("a constant", k)?;
    let inputs = smallvec![
        (given(k), -r.si() * t.si() / k.si()),
        (property::as_argument(t), -r.si() * ln_k),
        (given(&r), -t.si() * ln_k),
    ];
    made(cx, call, -r.si() * t.si() * ln_k, energy(), What::G, inputs)
}

fn gibbs_at(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (dg, t1, t2, dh) = (call.quantity(0), call.quantity(1), call.quantity(2), call.quantity(3));
    let (a, b) = (1.0 / t1.si() - 1.0 / t2.si(), math::ln(t2.si() / t1.si()));
    let dcp = dcp_of(call);
    let cp = dcp.map_or(0.0, Quantity::si);
    let shifted = dh.si() - cp * t1.si();
    let over_t = dg.si() / t1.si() - shifted * a - cp * b;
    let (s1, s2) = (t1.si() * t1.si(), t2.si() * t2.si());
    let by_t1 = t2.si() * (-dg.si() / s1 + cp * a + shifted / s1 + cp / t1.si());
    let by_t2 = over_t + t2.si() * (-shifted / s2 - cp / t2.si());
    let mut inputs: Inputs = smallvec![
        (given(dg), t2.si() / t1.si()),
        (given(dh), -t2.si() * a),
        (property::as_argument(t1), by_t1),
        (property::as_argument(t2), by_t2),
    ];
    inputs.extend(dcp.map(|dcp| (given(dcp), t2.si() * (t1.si() * a - b))));
    made(cx, call, t2.si() * over_t, dg.dim().clone(), What::G, inputs)
}

fn vaporisation_from_pressures(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (p1, t1, p2, t2) = (call.quantity(0), call.quantity(1), call.quantity(2), call.quantity(3));
    let r = property::gas_constant(cx.constants());
    let (a, _) = span(t1.si(), t2.si())?;
    let ln_ratio = ln_of("a vapour pressure", p2)? - ln_of("a vapour pressure", p1)?;
    let dh = r.si() * ln_ratio / a;
    let inputs = smallvec![
        (given(p1), -r.si() / (a * p1.si())),
        (given(p2), r.si() / (a * p2.si())),
        (property::as_argument(t1), dh / (a * t1.si() * t1.si())),
        (property::as_argument(t2), -dh / (a * t2.si() * t2.si())),
        (given(&r), ln_ratio / a),
    ];
    made(cx, call, dh, energy(), What::H, inputs)
}

fn vapour_pressure_at(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (p1, t1, t2, dh) = (call.quantity(0), call.quantity(1), call.quantity(2), call.quantity(3));
    let r = property::gas_constant(cx.constants());
    ln_of("a vapour pressure", p1)?;
    let a = 1.0 / t1.si() - 1.0 / t2.si();
    let p2 = p1.si() * math::exp(dh.si() * a / r.si());
    let by = p2 / r.si();
    let inputs = smallvec![
        (given(p1), p2 / p1.si()),
        (given(dh), by * a),
        (property::as_argument(t1), -by * dh.si() / (t1.si() * t1.si())),
        (property::as_argument(t2), by * dh.si() / (t2.si() * t2.si())),
        (given(&r), -by * dh.si() * a / r.si()),
    ];
    made(cx, call, p2, p1.dim().clone(), What::Plain, inputs)
}

fn boiling_point_at(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (p1, t1, dh, p2) = (call.quantity(0), call.quantity(1), call.quantity(2), call.quantity(3));
    let r = property::gas_constant(cx.constants());
    let ln_ratio = ln_of("a vapour pressure", p2)? - ln_of("a vapour pressure", p1)?;
    let inverse = 1.0 / t1.si() - r.si() * ln_ratio / dh.si();
    if !(inverse.is_finite() && inverse > 0.0) {
        return Err(VanTHoffError::NoTemperature { p: text::shown_plain(p2) }.into());
    }
    let t2 = 1.0 / inverse;
    let by = t2 * t2;
    let inputs = smallvec![
        (given(p1), -by * r.si() / (dh.si() * p1.si())),
        (property::as_argument(p2), by * r.si() / (dh.si() * p2.si())),
        (given(dh), -by * r.si() * ln_ratio / (dh.si() * dh.si())),
        (property::as_argument(t1), by / (t1.si() * t1.si())),
        (given(&r), by * ln_ratio / dh.si()),
    ];
    made(cx, call, t2, Dimension::base(Base::Kelvin), What::TemperaturePoint, inputs)
}
