//! What figures of one's own rest on when they are carried to another temperature.

use crate::model::card::{Call, Cx, Value};
use crate::quantity::Quantity;
use crate::record::register::{Finding, Tested};

/// `constant-heat-capacity`: an enthalpy that is held between two temperatures. Untested, since ΔCp was not given; no row where
/// it was.
pub fn constant_enthalpy(_: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    if call.option_quantity("dCp").is_some() {
        return Vec::new();
    }
    let temperatures: Vec<f64> = (call.args.iter().chain([&Value::Quantity(value.clone())]))
        .filter_map(|arg| match arg {
            Value::Quantity(t) if t.kind().what.is_temperature() => Some(t.si()),
            _ => None,
        })
        .collect();
    let (low, high) = temperatures.iter().fold((f64::INFINITY, 0.0_f64), |(low, high), t| (low.min(*t), high.max(*t)));
    let what = "no heat capacity of the change is given, and its enthalpy is held".to_owned();
    let finding =
        Finding::known("constant-heat-capacity", "figures of one's own", value.node(), None, Tested::Missing { what });
    vec![Finding { t_k: Some((low, high)), ..finding }]
}

/// `saturated-vapour-ideal` of measured vapour pressures: nothing is known of the vapour and of the liquid.
pub fn own_vapour(_: &Cx, _: &Call, value: &Quantity) -> Vec<Finding> {
    let what = "the second virial coefficient of the vapour and the volume of the liquid are not among these figures";
    let tested = Tested::Missing { what: what.to_owned() };
    vec![Finding::known("saturated-vapour-ideal", "figures of one's own", value.node(), None, tested)]
}
