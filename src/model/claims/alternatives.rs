//! What the usual shortcuts would have given, where they were not taken.

use super::asked;
use crate::model::card::{Call, Cx};
use crate::model::function;
use crate::model::gather::{HeatCapacity, Method};
use crate::model::path;
use crate::model::property::{self, Property};
use crate::quantity::Quantity;

/// What ΔCp held at 298.15 K would have given, where it was integrated instead.
pub fn with_constant_heat_capacity(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    shortcut(cx, call, HeatCapacity::Constant)
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
    // ΔCp itself has no further shortcut than its value at 298.15 K.
    if asked.property == Property::Cp && heat_capacity == HeatCapacity::Constant {
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
