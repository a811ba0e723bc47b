//! Which table the formation enthalpies were taken from.

use super::{asked, asked_anew};
use crate::model::card::{Call, Cx};
use crate::model::gather;
use crate::quantity::Quantity;
use crate::record::register::{Finding, Tested};

/// `formation-dataset`: priced against the next dataset that has all species.
pub fn formation_dataset(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    let Ok(used) = gather::datasets_for(asked.terms, &asked.method.formation, cx.data()) else { return Vec::new() };
    let mut names: Vec<String> = Vec::new();
    for id in &used {
        let short = cx.data().dataset(id).map_or_else(|| id.to_string(), |dataset| dataset.short.to_string());
        if !names.contains(&short) {
            names.push(short);
        }
    }
    let subject = names.join(" and ");
    let other = gather::covering(asked.terms, cx.data()).into_iter().find(|id| used.iter().any(|taken| taken != id));
    let tested = match other {
        None => Tested::Missing { what: "no other shipped dataset has all species of this reaction".to_owned() },
        Some(id) => {
            let name = cx.data().dataset(&id).map_or_else(|| id.to_string(), |dataset| dataset.short.to_string());
            match asked_anew(cx, call.with_option("formation", id.as_str())) {
                Ok(value) => Tested::Better { value, how: format!("formation enthalpies of {name}") },
                Err(fault) => Tested::Missing { what: fault.message().to_owned() },
            }
        }
    };
    vec![Finding::known("formation-dataset", subject, value.node(), None, tested)]
}
