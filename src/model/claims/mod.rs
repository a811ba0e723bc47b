//! Tests of the assumptions that reaction properties lean on, and what the usual shortcuts would have given.
//!
//! One file for each noun that is assumed of. Every test computes the alternative with the same code as the value itself.

mod alternatives;
mod association;
mod decomposition;
mod fit;
mod formation;
mod heat_capacity;
mod independence;
mod measured;
mod own_figures;
mod phase;
mod pressure;
mod saturation;
mod solution;
mod vessel;

pub use alternatives::{
    with_atmosphere, with_constant_heat_capacity, with_enthalpy, with_internal_energy, with_mean_heat_capacity,
    with_midpoint_heat_capacity, with_missed_phase_change, without_correction,
};
pub use association::monomer_vapour;
pub use decomposition::no_decomposition;
pub use fit::fit_quality;
pub use formation::formation_dataset;
pub use heat_capacity::{aqueous_heat_capacity, constant_heat_capacity};
pub use independence::worst_correlation;
pub use own_figures::{constant_enthalpy, own_vapour};
pub use phase::stable_phase;
pub(in crate::model) use phase::{RESOLUTION_CONDENSED, RESOLUTION_GAS};
pub use pressure::{
    condensed_volume, constant_expansivity, ideal_gas, pressure_neglected, second_virial, standard_pressure, unmixed,
};
pub use saturation::{saturated_leg, saturated_vapour, saturated_virial};
pub use solution::infinite_dilution;
pub use vessel::{complete_conversion, vessel_gas, vessel_ideal, vessel_virial, vessel_volumes};

use std::rc::Rc;

use crate::fault::Fault;
use crate::model::card::{Call, Cx};
use crate::model::gather::Method;
use crate::model::property::{self, Property};
use crate::model::terms::Terms;
use crate::record::node::Node;

struct Asked<'a> {
    property: Property,
    terms: &'a Terms,
    t_k: f64,
    method: Method,
}

fn asked<'a>(cx: &Cx, call: &'a Call) -> Option<Asked<'a>> {
    let property = Property::of(call.card)?;
    let method = property::method_of(call, cx).ok()?;
    Some(Asked { property, terms: call.terms()?, t_k: call.quantity(1).si(), method })
}

/// The better alternative of a test: the same formula asked in another way, with inputs of its own.
fn asked_anew(cx: &Cx, call: Call) -> Result<Rc<Node>, Fault> {
    let property = Property::of(call.card).unwrap_or_else(|| unreachable!("{} is a property's card", call.card.id));
    let method = property::method_of(&call, cx)?;
    Ok(Rc::clone(property::quantity(property, &Rc::new(call), &method, cx)?.node()))
}
