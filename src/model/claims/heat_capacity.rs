//! How the heat capacity was taken between 298.15 K and T.

use super::{asked, asked_anew};
use crate::model::card::{Call, Cx};
use crate::model::gather::HeatCapacity;
use crate::model::property;
use crate::quantity::Quantity;
use crate::record::register::{Finding, Tested};

/// `constant-heat-capacity`: priced against the integral of Cp. No row where Cp was integrated.
pub fn constant_heat_capacity(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    if asked.method.heat_capacity == HeatCapacity::Full || property::is_reference(asked.t_k) {
        return Vec::new();
    }
    let tested = match asked_anew(cx, call.with_option("heat_capacity", "full")) {
        Ok(value) => {
            Tested::Better { value, how: format!("the integral over T; Cp was {}", asked.method.heat_capacity.words()) }
        }
        Err(fault) => Tested::Missing { what: fault.message().to_owned() },
    };
    vec![Finding::known("constant-heat-capacity", asked.terms.text(), value.node(), Some(asked.t_k), tested)]
}
