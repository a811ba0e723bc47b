//! How gases and condensed phases take up volume.

use super::asked;
use crate::chem::species::State as Aggregate;
use crate::model::card::{Call, Cx};
use crate::quantity::Quantity;
use crate::record::register::{Finding, Tested};

/// `ideal-gas`: untested as long as no second virial coefficients are shipped.
pub fn ideal_gas(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    gas_law(cx, call, value, "ideal-gas", Aggregate::Gas, "no second virial coefficient of")
}

/// `condensed-volume-neglected`: untested as long as no molar volumes are shipped.
pub fn condensed_volume(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let mut findings = gas_law(cx, call, value, "condensed-volume-neglected", Aggregate::Liquid, "no molar volume of");
    findings.extend(gas_law(cx, call, value, "condensed-volume-neglected", Aggregate::Crystal, "no molar volume of"));
    findings
}

fn gas_law(cx: &Cx, call: &Call, value: &Quantity, id: &'static str, state: Aggregate, lacking: &str) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    let species: Vec<&str> = (asked.terms.terms().iter())
        .map(|term| &term.substance.species)
        .filter(|species| species.phase.state == state)
        .map(|species| &*species.id)
        .collect();
    if species.is_empty() {
        return Vec::new();
    }
    let names = species.join(", ");
    let what = format!("{lacking} {names} is shipped");
    vec![Finding::known(id, names, value.node(), Some(asked.t_k), Tested::Missing { what })]
}
