//! Whether the molecules of a vapour stay single.

use std::rc::Rc;
use std::sync::Arc;

use super::{Asked, asked, asked_anew};
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::association::{self, Associates, Paired, Pairing};
use crate::model::card::{Call, Cx, Value};
use crate::model::gather;
use crate::model::property::Property;
use crate::model::substance::PureSubstance;
use crate::model::terms::Term;
use crate::quantity::{Quantity, round};
use crate::record::node::Node;
use crate::record::register::{Finding, Tested};

/// `monomer-vapour`: priced against the equilibrium of each vapour with its dimer at T and 1 bar. No row where the dimer is a
/// species of the reaction itself, nor for K°, which is defined for the unpaired vapour.
pub fn monomer_vapour(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    if asked.property == Property::K {
        return Vec::new();
    }
    let r = cx.constants().molar_gas.value;
    let (mut names, mut shares, mut missing): (Vec<&str>, Vec<String>, Vec<&str>) = Default::default();
    let mut paired = Vec::new();
    for term in asked.terms.terms() {
        let substance = &term.substance;
        if term.own.is_some() {
            paired.push(None);
            continue;
        }
        let pairing = match association::of(substance, cx.data()) {
            Associates::No => None,
            Associates::Into(dimer) if asked.terms.terms().iter().any(|other| other.substance.id() == dimer.id()) => {
                None
            }
            Associates::Into(dimer) => {
                let at_t = Pairing::at(substance, &dimer, asked.t_k, r);
                if at_t.is_none() {
                    missing.push(substance.id());
                }
                at_t.map(|pairing| (dimer, pairing))
            }
            Associates::WithoutRecord => {
                missing.push(substance.id());
                None
            }
        };
        if let Some((dimer, pairing)) = &pairing {
            names.push(substance.id());
            let percent = round::significant(200.0 * pairing.n, 2);
            shares.push(format!("{percent} % of {} as {}", substance.id(), dimer.id()));
        }
        paired.push(pairing);
    }
    let at_t =
        |subject: String, tested| Finding::known("monomer-vapour", subject, value.node(), Some(asked.t_k), tested);
    let mut findings = Vec::new();
    if !names.is_empty() {
        let how = format!("the equilibrium at {} K and 1 bar, with {}", asked.t_k, shares.join(" and "));
        let tested = match instead(cx, call, &asked, paired) {
            Ok(value) => Tested::Better { value, how },
            Err(fault) => Tested::Missing { what: fault.message().to_owned() },
        };
        findings.push(at_t(names.join(", "), tested));
    }
    if !missing.is_empty() {
        let names = missing.join(", ");
        let what = format!(
            "{names} associates, and no function of its associated form that reaches {} K is shipped",
            asked.t_k
        );
        findings.push(at_t(names, Tested::Missing { what }));
    }
    findings
}

/// The same property with each vapour as it is.
fn instead(
    cx: &Cx,
    call: &Call,
    asked: &Asked,
    paired: Vec<Option<(Arc<Substance>, Pairing)>>,
) -> Result<Rc<Node>, Fault> {
    let datasets = gather::datasets_for(asked.terms, &asked.method.formation, cx.data())?;
    let as_it_is = |((term, pairing), dataset): ((&Term, Option<_>), &_)| {
        let own = pairing.map(|(dimer, pairing)| {
            let how = (asked.property, asked.method.heat_capacity);
            Paired::new(term, dimer, pairing, Clone::clone(dataset), asked.t_k, how, cx)
        });
        match own {
            Some(own) => Term { own: Some(Rc::new(own)), ..term.clone() },
            None => term.clone(),
        }
    };
    let terms: Vec<Term> = asked.terms.terms().iter().zip(paired).zip(&datasets).map(as_it_is).collect();
    let mut args = call.args.clone();
    args[0] = match &call.args[0] {
        Value::Reaction(reaction) => Value::Reaction(Rc::new(reaction.answered_by(terms))),
        Value::Substance(_) => {
            let only = terms.into_iter().next().unwrap_or_else(|| unreachable!("a substance is one term"));
            Value::Substance(Rc::new(PureSubstance::answered_by(only)))
        }
        other => unreachable!("a property is asked of a reaction or a substance, not of {}", other.sort()),
    };
    asked_anew(cx, Call { card: call.card, args })
}
