//! Whether the species would be there at all.

use super::asked;
use crate::chem::species::State as Aggregate;
use crate::model::card::{Call, Cx};
use crate::model::decomposition::{Decomposition, Products};
use crate::model::path::Route;
use crate::quantity::Quantity;
use crate::record::register::{Finding, Tested};

/// Gibbs energies nearer to zero than this decide nothing, J/mol. Bound: what formation enthalpies of one table are off by
/// against another, for most of the shipped records (ATcT and CODATA against the report; see `formation-dataset`).
const RESOLUTION: f64 = 1000.0;

/// `no-decomposition`: each species against the most stable products it could fall apart into. A solid or liquid that gives
/// off its gas at more than 1 bar cannot stand, so the claim is broken. Whether a molecule that could do better does so is a
/// matter of rates, of which nothing is on record: that is untested, and says what could come of it.
pub fn no_decomposition(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    let t_k = asked.t_k;
    let at_t = |subject: String, tested| Finding::known("no-decomposition", subject, value.node(), Some(t_k), tested);
    let (mut findings, mut lasting, mut open, mut ways) = (Vec::new(), Vec::new(), Vec::new(), Vec::new());
    for term in asked.terms.terms().iter().filter(|term| term.own.is_none()) {
        let id = term.substance.id();
        if term.substance.species.phase.state == Aggregate::Aqueous || term.substance.species.charge != 0 {
            continue;
        }
        let route = Route::to(&term.substance, t_k, cx.data());
        let there = route.as_ref().map_or(&term.substance, |route| &route.last().substance);
        let best = |which| Decomposition::most_stable(there, which, t_k, cx.data());
        let downhill = |way: &Decomposition| way.dg < -RESOLUTION;
        if !there.species.is_gas()
            && let Some(way) = best(Products::GivenOff).filter(downhill)
        {
            let why = format!("{} at {t_k} K and 1 bar: it gives off gas at more than 1 bar", way.words());
            findings.push(at_t(id.to_owned(), Tested::False { why, value: None }));
            continue;
        }
        // What a reaction makes of a species is what is being asked about, and no assumption.
        match best(Products::All) {
            Some(way) if downhill(&way) => {
                open.push(id);
                ways.push(way.words());
            }
            Some(_) => lasting.push(id),
            None => {}
        }
    }
    if !lasting.is_empty() {
        let how = format!(
            "no decomposition into elements, oxides or simple molecules on record is downhill at {t_k} K and 1 bar"
        );
        findings.push(at_t(lasting.join(", "), Tested::True { how }));
    }
    if !open.is_empty() {
        let what = format!(
            "{}: downhill at {t_k} K and 1 bar; no rates are on record, so whether it runs is not known",
            ways.join("; ")
        );
        findings.push(at_t(open.join(", "), Tested::Missing { what }));
    }
    findings
}
