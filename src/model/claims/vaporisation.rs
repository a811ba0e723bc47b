//! What a vaporisation of the records leaves out.

use super::asked;
use crate::chem::species::State as Aggregate;
use crate::model::card::{Call, Cx};
use crate::model::property::Property;
use crate::model::terms::Term;
use crate::quantity::Quantity;
use crate::record::register::{Finding, Tested};

/// `saturated-vapour-ideal`: H(g) − H(l) of the records is to the ideal gas, and the enthalpy of vaporisation that is measured
/// is to the saturated vapour. Untested without the second virial coefficient of the vapour. Above the critical temperature
/// there is no such vapour, and no row.
pub fn vapour_of_records(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    if asked.property != Property::H {
        return Vec::new();
    }
    let terms = asked.terms.terms();
    let is_vapour = |gas: &&Term| {
        let critical = gas.substance.critical_temperature.as_ref();
        gas.substance.species.is_gas() && critical.is_none_or(|critical| asked.t_k < critical.t_k)
    };
    let from_liquid = |gas: &&Term| {
        terms.iter().any(|liquid| {
            liquid.substance.species.phase.state == Aggregate::Liquid
                && liquid.substance.species.entity == gas.substance.species.entity
                && liquid.nu * gas.nu < 0.0
        })
    };
    let vapours = terms.iter().filter(is_vapour).filter(from_liquid).map(|term| term.substance.id());
    let row = |id: &str| {
        let what = format!(
            "no second virial coefficient of {id} is shipped, so the step to its saturated vapour is not known"
        );
        Finding::known("saturated-vapour-ideal", id, value.node(), Some(asked.t_k), Tested::Missing { what })
    };
    vapours.map(row).collect()
}
