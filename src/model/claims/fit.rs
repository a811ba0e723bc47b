//! How good the heat capacity functions are.

use super::{asked, measured};
use crate::model::card::{Call, Cx};
use crate::model::function::{self, T_REFERENCE};
use crate::model::path::Route;
use crate::model::property::Property;
use crate::num::math;
use crate::quantity::Quantity;
use crate::record::register::{Finding, Tested};

/// J/mol. Bound: what the digits of the printed constants leave of two sums of terms that ought to be equal.
const ROUNDING: f64 = 0.01;

/// `fit-quality`: what the joins passed between 298.15 K and T make a function jump by, and what is known against a record.
/// The jumps are priced together. A warning is about one species; where it gives a difference of entropies, it is priced,
/// and where it only says how far off a table is at most, which of the two is right is not known.
pub fn fit_quality(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    let (t_k, rt) = (asked.t_k, cx.constants().molar_gas.value * asked.t_k);
    let at_t = |subject: String, tested| Finding::known("fit-quality", subject, value.node(), Some(t_k), tested);
    // What an enthalpy too large by `h` and an entropy too large by `s` make the property too large by.
    let price = |h: f64, s: f64| match asked.property {
        Property::H | Property::U => h,
        Property::G | Property::A => h - t_k * s,
        Property::S => s,
        Property::K => value.si() - value.si() * math::exp((h - t_k * s) / rt),
        Property::Cp => 0.0,
    };
    let (mut jumped, mut joins, mut h, mut s, mut findings) = (Vec::new(), 0, 0.0, 0.0, Vec::new());
    for term in asked.terms.terms().iter().filter(|term| term.own.is_none()) {
        let Ok(route) = Route::to(&term.substance, t_k, cx.data()) else { continue };
        let passed = |t: f64| t > T_REFERENCE.min(t_k) && t < T_REFERENCE.max(t_k);
        // From 298.15 K down to T the jumps come with the other sign.
        let sign = if t_k < T_REFERENCE { -term.nu } else { term.nu };
        let found = joins;
        for phase in route.phases() {
            for jump in function::jumps(&phase.function).filter(|jump| passed(jump.t_k)) {
                (joins, h, s) = (joins + 1, h + sign * jump.h, s + sign * jump.s);
            }
        }
        if joins > found {
            jumped.push(term.substance.id());
        }
        let warnings: Vec<&str> = (route.last().function.warnings.iter())
            .map(|warning| &**warning)
            .filter(|warning| concerns(warning, asked.property, t_k))
            .collect();
        if !warnings.is_empty() {
            let what = format!("known against the record: {}", warnings.join("; "));
            findings.push(at_t(term.substance.id().to_owned(), Tested::Missing { what }));
        }
    }
    if joins > 0 && asked.property != Property::Cp {
        let number = if joins == 1 { "1 join".to_owned() } else { format!("{joins} joins") };
        let how = format!("what the functions jump by at {number} passed between 298.15 K and {t_k} K");
        let price = if h.abs() + t_k * s.abs() < ROUNDING { 0.0 } else { price(h, s) };
        findings.push(at_t(format!("joins of {}", jumped.join(", ")), Tested::Given { price, how }));
    }
    findings.extend(measured::fits(cx, call, value));
    findings
}

/// Whether what is known against a record touches a property at T. Formation enthalpies are compared by `formation-dataset`,
/// where they are used.
fn concerns(warning: &str, property: Property, t_k: f64) -> bool {
    let heated = t_k != T_REFERENCE || property == Property::Cp;
    match warning.split([' ', '(']).next() {
        Some("dHf") => false,
        Some("S") => !matches!(property, Property::H | Property::U | Property::Cp),
        Some("Cp") => heated,
        _ => true,
    }
}
