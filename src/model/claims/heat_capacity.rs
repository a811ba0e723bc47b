//! How the heat capacity was taken between 298.15 K and T.

use super::{asked, asked_anew};
use crate::chem::species::State as Aggregate;
use crate::model::card::{Call, Cx};
use crate::model::function::T_REFERENCE;
use crate::model::gather::HeatCapacity;
use crate::model::property;
use crate::model::tabulated::is_tabulated;
use crate::model::terms::Term;
use crate::quantity::{Quantity, round};
use crate::record::register::{Finding, Tested};

/// `constant-heat-capacity`: priced against the integral of Cp. No row where Cp was integrated.
pub fn constant_heat_capacity(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    if asked.method.heat_capacity == HeatCapacity::Full || property::is_reference(asked.t_k) {
        return Vec::new();
    }
    let tested = match asked_anew(cx, call.with_option("heat_capacity", "full").without_option("about")) {
        Ok(value) => {
            Tested::Better { value, how: format!("the integral over T; Cp was {}", asked.method.heat_capacity.words()) }
        }
        Err(fault) => Tested::Missing { what: fault.message().to_owned() },
    };
    vec![Finding::known("constant-heat-capacity", asked.terms.text(), value.node(), Some(asked.t_k), tested)]
}

/// `aqueous-heat-capacity`: solutes whose heat capacity at 298.15 K was held up to T. Untested, since what is on record of
/// them ends there; the row says how much hangs on it.
pub fn aqueous_heat_capacity(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    let held = asked.method.heat_capacity == HeatCapacity::Constant && !property::is_reference(asked.t_k);
    let solute = |term: &&Term| term.substance.species.phase.state == Aggregate::Aqueous && is_tabulated(term);
    let solutes: Vec<&str> = asked.terms.terms().iter().filter(solute).map(|term| term.substance.id()).collect();
    if !held || solutes.is_empty() {
        return Vec::new();
    }
    let names = solutes.join(", ");
    let per_ten = 10.0 * (asked.t_k - T_REFERENCE) / 1000.0;
    let what = format!(
        "no heat capacity of {names} away from 298.15 K is shipped; each 10 J/(K mol) by which their ΔCp is off on average \
         moves the enthalpy by {} kJ/mol",
        round::significant(per_ten.abs(), 2)
    );
    vec![Finding::known("aqueous-heat-capacity", names, value.node(), Some(asked.t_k), Tested::Missing { what })]
}
