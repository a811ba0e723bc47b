//! Heat capacities fitted to measurements: whether the terms follow the rows, and whether T lies among them.

use std::rc::Rc;

use super::{asked, asked_anew};
use crate::model::card::{Call, Cx, Value};
use crate::model::fit::{Fit, Way};
use crate::model::function::T_REFERENCE;
use crate::model::substance::PureSubstance;
use crate::model::terms::Term;
use crate::model::thermo::Thermo;
use crate::quantity::Quantity;
use crate::record::register::{Finding, Tested};

/// `fit-quality` of what was measured: priced against the shape-preserving interpolation of the same rows; false beyond them.
pub(super) fn fits(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    let mut findings = Vec::new();
    for term in asked.terms.terms() {
        let Some(fit) = term.own.as_ref().and_then(|own| own.fit()) else { continue };
        let (low, high) = fit.measured();
        // Increments run from 298.15 K, so that end counts like T.
        let ends = [asked.t_k, T_REFERENCE];
        let needed = if asked.property == crate::model::property::Property::Cp { &ends[..1] } else { &ends[..] };
        let tested = match needed.iter().find(|t| !(low <= **t && **t <= high)) {
            Some(outside) => Tested::False {
                why: format!(
                    "{} was measured from {low} K to {high} K, and the fit was carried on to {outside} K",
                    fit.name
                ),
                value: None,
            },
            None if matches!(fit.way, Way::Shape(_)) => {
                Tested::True { how: "the interpolation goes through every row".to_owned() }
            }
            None => match fit.by_shape().and_then(|shape| with_own(call, term, shape)) {
                Some(other) => match asked_anew(cx, other) {
                    Ok(value) => Tested::Better { value, how: "shape-preserving interpolation of the rows".to_owned() },
                    Err(fault) => Tested::Missing { what: fault.message().to_owned() },
                },
                None => Tested::Missing {
                    what: "the rows have temperatures twice or out of order, so nothing else can be drawn through them"
                        .to_owned(),
                },
            },
        };
        let subject = format!("{} ({})", term.substance.id(), fit.name);
        findings.push(Finding::known("fit-quality", subject, value.node(), Some(asked.t_k), tested));
    }
    findings
}

/// The call with another heat capacity for one of its species.
fn with_own(call: &Call, term: &Term, fit: Fit) -> Option<Call> {
    let own: Rc<dyn Thermo> = Rc::new(fit);
    let mut args = call.args.clone();
    args[0] = match &call.args[0] {
        Value::Substance(_) => {
            Value::Substance(Rc::new(PureSubstance::answered_by(Term { own: Some(own), ..term.clone() })))
        }
        Value::Reaction(reaction) => {
            let answered = |one: &Term| match one.substance.id() == term.substance.id() {
                true => Term { own: Some(Rc::clone(&own)), ..one.clone() },
                false => one.clone(),
            };
            Value::Reaction(Rc::new(reaction.answered_by(reaction.terms().iter().map(answered).collect())))
        }
        _ => return None,
    };
    Some(Call { card: call.card, args })
}
