//! What the usual shortcuts would have given, where they were not taken.

use super::asked;
use crate::model::card::{Call, Cx};
use crate::model::function;
use crate::model::gather::{HeatCapacity, Method};
use crate::model::path;
use crate::model::property::{self, Property};
use crate::num::math;
use crate::quantity::Quantity;
use crate::units::constants::{STANDARD_ATMOSPHERE, STANDARD_PRESSURE};

/// What ΔCp held at 298.15 K would have given, where it was integrated instead.
pub fn with_constant_heat_capacity(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    shortcut(cx, call, HeatCapacity::Constant)
}

/// What ΔCp half-way would have given.
pub fn with_midpoint_heat_capacity(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    shortcut(cx, call, HeatCapacity::Midpoint)
}

/// What the mean of ΔCp at both ends would have given.
pub fn with_mean_heat_capacity(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    shortcut(cx, call, HeatCapacity::Mean)
}

/// What ΔrU would have given in place of ΔrH.
pub fn with_internal_energy(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    other_property(cx, call, Property::H, Property::U)
}

/// What ΔrH would have given in place of ΔrU.
pub fn with_enthalpy(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    other_property(cx, call, Property::U, Property::H)
}

/// One property of a reaction in place of another, where moles of gas are made or lost, so that the two differ.
fn other_property(cx: &Cx, call: &Call, own: Property, instead: Property) -> Option<f64> {
    let asked = asked(cx, call)?;
    if asked.property != own || !asked.terms.is_reaction() || asked.terms.delta_n_gas() == 0.0 {
        return None;
    }
    property::number(instead, asked.terms, asked.t_k, &asked.method, cx).ok()
}

/// What gases counted from 1 atm would have given, as tables had them before 1982. S° is smaller by R ln 1.01325 per mole of
/// gas, and G° larger by T times that.
pub fn with_atmosphere(cx: &Cx, call: &Call, value: &Quantity) -> Option<f64> {
    let asked = asked(cx, call)?;
    let delta_n = asked.terms.delta_n_gas();
    if delta_n == 0.0 {
        return None;
    }
    let step = delta_n * math::ln(STANDARD_ATMOSPHERE.value / STANDARD_PRESSURE.value);
    let r = cx.constants().molar_gas.value;
    match asked.property {
        Property::S => Some(value.si() - r * step),
        Property::G | Property::A => Some(value.si() + r * asked.t_k * step),
        Property::K => Some(value.si() * math::exp(-step)),
        Property::H | Property::U | Property::Cp => None,
    }
}

/// What the value at 298.15 K would have given.
pub fn without_correction(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    shortcut(cx, call, HeatCapacity::Neglected)
}

/// What leaving the changes of phase out would have given, where any were inserted.
pub fn with_missed_phase_change(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    let asked = asked(cx, call)?;
    let crosses = !path::crossings(asked.terms, asked.t_k, cx.data()).is_empty();
    if crosses { shortcut(cx, call, HeatCapacity::Missed) } else { None }
}

fn shortcut(cx: &Cx, call: &Call, heat_capacity: HeatCapacity) -> Option<f64> {
    let asked = asked(cx, call)?;
    if property::is_reference(asked.t_k) || asked.method.heat_capacity != HeatCapacity::Full {
        return None;
    }
    // An equilibrium that was put in for T has no heat capacity elsewhere to be held.
    if !asked.terms.conditions().is_empty() {
        return None;
    }
    // ΔCp itself has no further shortcut than its value at 298.15 K.
    let held = matches!(heat_capacity, HeatCapacity::Constant | HeatCapacity::Midpoint | HeatCapacity::Mean);
    if asked.property == Property::Cp && held {
        return None;
    }
    let t_k = match (asked.property, heat_capacity) {
        // "No correction" means the figure of the 298.15 K table, whole.
        (Property::G | Property::A | Property::U | Property::K, HeatCapacity::Neglected) => function::T_REFERENCE,
        _ => asked.t_k,
    };
    let method = Method { heat_capacity, ..asked.method.clone() };
    property::number(asked.property, asked.terms, t_k, &method, cx).ok()
}
