//! The polynomials behind a reaction enthalpy, as the Python side of a bench is told them.

use hessbook::model::card::{Cx, Value};
use hessbook::model::function;

/// For each species its stoichiometric number, gas constant, formation enthalpy, H(298.15 K) and intervals.
pub fn species(reaction: &Value, cx: &Cx) -> serde_json::Value {
    let Value::Reaction(reaction) = reaction else { panic!("a reaction was asked for") };
    let species = reaction.terms().iter().map(|term| {
        let function = term.substance.function.as_ref().expect("gases have functions");
        let dataset = &cx.data().datasets().iter().find(|one| one.rank.is_some()).expect("one is first").id;
        let record = term.substance.formation(dataset);
        // An element has no record where its convention needs none.
        let formation = record.map_or(0.0, |record| record.dhf.value);
        let intervals = function.intervals.iter();
        let intervals: Vec<_> =
            intervals.map(|one| serde_json::json!({ "t_max": one.t_max, "a": one.a, "b": one.b })).collect();
        let h_298 = function::evaluate(function, function::T_REFERENCE).h;
        serde_json::json!({
            "nu": term.nu, "r": function.r_of_source, "formation": formation, "h_298": h_298, "intervals": intervals,
        })
    });
    species.collect()
}
