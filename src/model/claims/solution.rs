//! How far solutes are from meeting each other.

use std::collections::BTreeMap;
use std::sync::Arc;

use crate::model::card::{Call, Cx};
use crate::model::equilibrium;
use crate::model::terms::Terms;
use crate::num::math;
use crate::quantity::{Quantity, round};
use crate::record::register::{Finding, Tested};
use crate::source::Citation;

/// A of the Debye-Hückel law for water at 25 °C, (kg/mol)^½, to base ten (from memory).
const A: f64 = 0.509;
/// Ionic strength up to which the extended law of Davies is used, mol/kg (from memory).
const HIGHEST: f64 = 0.5;

/// lg γ of an ion of charge z: −A z² [√I/(1 + √I) − 0.3 I], I = ½ Σ b z².
fn lg_gamma(charge: f64, ionic_strength: f64) -> f64 {
    let root = math::sqrt(ionic_strength);
    -A * charge * charge * (root / (1.0 + root) - 0.3 * ionic_strength)
}

/// `infinite-dilution`: against activity coefficients by the law of Davies, at 25 °C and up to 0.5 mol/kg.
pub fn infinite_dilution(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(terms) = call.terms() else { return Vec::new() };
    let Ok(molalities) = equilibrium::molalities(cx, call, terms) else { return Vec::new() };
    if molalities.is_empty() {
        return Vec::new();
    }
    let names = molalities.keys().map(|id| &**id).collect::<Vec<_>>().join(", ");
    let row = |tested| Finding::known("infinite-dilution", names.clone(), value.node(), None, tested);
    let strength = ionic_strength(terms, &molalities);
    let shown = round::significant(strength, 2);
    if strength > HIGHEST {
        let what = format!("the ionic strength is {shown} mol/kg, and the law of Davies holds up to {HIGHEST} mol/kg");
        return vec![row(Tested::Missing { what })];
    }
    if strength == 0.0 {
        let what = "no activity coefficients of neutral solutes are at hand".to_owned();
        return vec![row(Tested::Missing { what })];
    }
    let lg: f64 = (terms.terms().iter())
        .filter(|term| molalities.contains_key(&term.substance.species.id))
        .map(|term| term.nu * lg_gamma(f64::from(term.substance.species.charge), strength))
        .sum();
    let ln = lg * std::f64::consts::LN_10;
    let price = value.si() * (1.0 - math::exp(ln));
    let how = format!(
        "against activity coefficients by the law of Davies at 25 °C, ionic strength {shown} mol/kg of these alone"
    );
    let source = Citation::new("C. W. Davies, Ion Association (1962)", "from memory");
    vec![Finding { sources: vec![source], ..row(Tested::Given { price, how }) }]
}

fn ionic_strength(terms: &Terms, molalities: &BTreeMap<Arc<str>, Quantity>) -> f64 {
    let charge = |id: &Arc<str>| {
        terms
            .terms()
            .iter()
            .find(|term| term.substance.species.id == *id)
            .map_or(0, |term| term.substance.species.charge)
    };
    let one = |(id, b): (&Arc<str>, &Quantity)| {
        let z = f64::from(charge(id));
        0.5 * b.si() * z * z
    };
    molalities.iter().map(one).sum()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_law_of_davies_gives_the_activity_coefficient_of_sodium_chloride() {
        // Mean activity coefficient of NaCl at 25 °C, 0.1 mol/kg: 0.778 (CRC Handbook, from memory). Bound: the law is good to
        // about 2 % there.
        let gamma = math::exp(lg_gamma(1.0, 0.1) * std::f64::consts::LN_10);
        assert!((gamma / 0.778 - 1.0).abs() < 0.02, "{gamma}");
    }
}
