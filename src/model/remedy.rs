//! Dealing with an assumption in the value itself: corrected for it, or widened for it.
//!
//! `x.corrected("id")` is the value computed with the better alternative in place of the step that leaned on the assumption.
//! `x.widened("id")` is x with a further input, of value 0 and u = |price|/√3: the price taken as a bound, rectangular
//! (JCGM 100:2008, clause 4.3.7). The surprise: correcting rebuilds the arithmetic that followed the step, so that inputs
//! and correlations are those of the better value too.

use std::collections::BTreeMap;
use std::rc::Rc;

use smallvec::smallvec;
use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::review::{self, Row};
use crate::quantity::{Mismatch, Quantity};
use crate::record::evaluation::{Evaluation, Shape};
use crate::record::node::{self, Input, LeafKey, Node, Operator, Origin};
use crate::record::register::{Finding, Tested};
use crate::source::Citation;
use crate::units::{Dimension, Kind};

/// Why an assumption cannot be dealt with this way.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum RemedyError {
    #[error("the value rests on no assumption `{id}`")]
    NoRow { id: String, known: String },
    #[error("the value has {count} assumptions `{id}`: {subjects}")]
    SeveralRows { id: String, count: usize, subjects: String },
    #[error("`{id}` about {subject} has no better value to use: {why}")]
    NoBetter { id: String, subject: String, why: String },
    #[error(
        "`{id}` about {subject} has another value beside it, from {other}, and no better one: with either, the row says the same of the other"
    )]
    AnotherOnly { id: String, subject: String, other: String },
    #[error("`{id}` about {subject} has no price to widen by: {why}")]
    NoPrice { id: String, subject: String, why: String },
    #[error("the step that leaned on `{id}` went into {function}, which cannot be computed anew from here")]
    Behind { id: String, function: String },
}

impl Explain for RemedyError {
    fn code(&self) -> &'static str {
        match self {
            RemedyError::NoRow { .. } => "assumption-not-in-value",
            RemedyError::SeveralRows { .. } => "assumption-of-several-subjects",
            RemedyError::NoBetter { .. } => "better-value-missing",
            RemedyError::AnotherOnly { .. } => "alternative-not-better",
            RemedyError::NoPrice { .. } => "price-missing",
            RemedyError::Behind { .. } => "step-not-repeatable",
        }
    }

    fn hint(&self) -> String {
        match self {
            RemedyError::NoRow { known, .. } if known.is_empty() => {
                "it rests on none; nothing needs to be done".to_owned()
            }
            RemedyError::NoRow { known, .. } => format!("it rests on {known}"),
            RemedyError::SeveralRows { .. } => "name the one that is meant as a second argument".to_owned(),
            RemedyError::NoBetter { .. } => {
                "leave the value and say why, with `justify(id, label, reason)`, or bring the missing data".to_owned()
            }
            RemedyError::AnotherOnly { id, .. } => format!(
                "keep the difference in u with `widened(\"{id}\")`, or say why this one is right with `justify(\"{id}\", label, \
                 reason)`; the option `formation` chooses the other"
            ),
            RemedyError::NoPrice { .. } => {
                "state a price of your own with `assume(value, id, claim, price)`, or justify it".to_owned()
            }
            RemedyError::Behind { .. } => "correct the earlier value, before it goes into the formula".to_owned(),
        }
    }
}

const ID: Arg = Arg {
    name: "id",
    takes: Takes::Text,
    default: Default::Required,
    doc: "the assumption's id, as the register shows it",
};

const ABOUT: Arg = Arg {
    name: "about",
    takes: Takes::Text,
    default: Default::Absent,
    doc: "what it is about, where the value has several of that id",
};

pub static CORRECTED: Card = Card {
    id: "remedy.corrected",
    name: "corrected",
    on: On::Quantity,
    args: &[ID, ABOUT],
    gives: "the value with the better alternative of that assumption",
    doc: "Computes the value anew with the better alternative in place of the assumption, through the arithmetic that \
          followed. Of two datasets neither is better, so `formation-dataset` is widened or justified instead.",
    source: "definition of the price: value with the assumption minus value of the better alternative",
    example: "reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\").enthalpy(\"450 degC\", #{ heat_capacity: \"constant\" })\
              .corrected(\"constant-heat-capacity\")",
    claims: &[],
    alternatives: &[],
    run: corrected,
    check_line: None,
    caution: None,
};

pub static WIDENED: Card = Card {
    id: "remedy.widened",
    name: "widened",
    on: On::Quantity,
    args: &[ID, ABOUT],
    gives: "the value with its uncertainty widened by the price of that assumption",
    doc: "Adds |price|/√3 to the standard uncertainty, as an input named after the assumption.",
    source: "JCGM 100:2008, clause 4.3.7 (rectangular distribution)",
    example: "reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\").enthalpy(\"450 degC\", #{ heat_capacity: \"constant\" })\
              .widened(\"constant-heat-capacity\")",
    claims: &[],
    alternatives: &[],
    run: widened,
    check_line: None,
    caution: None,
};

/// Whether a call widened a value for this assumption about this subject.
pub fn widens(call: &Call, id: &str, subject: &str) -> bool {
    let about = |about: &Value| match about {
        Value::Text(about) => subject.contains(&**about),
        _ => true,
    };
    call.card.id == WIDENED.id && **call.text(1) == *id && about(&call.args[2])
}

/// The findings that make up the one row which an id, and a subject where one is given, mean.
fn meant(cx: &Cx, call: &Call) -> Result<(Vec<Finding>, Row), Fault> {
    let (value, id) = (call.quantity(0), call.text(1));
    let about = match &call.args[2] {
        Value::Text(about) => Some(&**about),
        _ => None,
    };
    let rows = review::rows(cx, value);
    let of_id = rows.iter().filter(|(_, row)| row.id == **id);
    let chosen: Vec<_> = of_id.filter(|(_, row)| about.is_none_or(|about| row.subject.contains(about))).collect();
    // One species may stand alone in one row and among others in another.
    let exact: Vec<_> = chosen.iter().copied().filter(|(_, row)| about == Some(&*row.subject)).collect();
    let chosen = if exact.is_empty() { chosen } else { exact };
    match chosen.as_slice() {
        [(group, row)] => Ok((group.clone(), row.clone())),
        [] => {
            let mut known: Vec<String> = rows.iter().map(|(_, row)| format!("`{}`", row.id)).collect();
            known.dedup();
            Err(RemedyError::NoRow { id: id.to_string(), known: known.join(", ") }.into())
        }
        several => {
            let subjects = several.iter().map(|(_, row)| row.subject.clone()).collect::<Vec<_>>().join("; ");
            Err(RemedyError::SeveralRows { id: id.to_string(), count: several.len(), subjects }.into())
        }
    }
}

/// Assumptions whose alternative is priced and is no better than the value: taking it turns the row round, and mends nothing.
const ANOTHER: [&str; 1] = ["formation-dataset"];

fn corrected(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let value = call.quantity(0);
    let (group, row) = meant(cx, call)?;
    let mut replaced: BTreeMap<u64, Quantity> = BTreeMap::new();
    for finding in &group {
        if let Tested::Better { how, .. } = &finding.tested
            && ANOTHER.contains(&&*finding.id)
        {
            let (id, other) = (row.id, how.clone());
            return Err(RemedyError::AnotherOnly { id, subject: row.subject, other }.into());
        }
        let better = match &finding.tested {
            Tested::Better { value, .. } | Tested::False { value: Some(value), .. } => Rc::clone(value),
            Tested::True { .. } => continue,
            Tested::Missing { .. }
            | Tested::False { value: None, .. }
            | Tested::Given { .. }
            | Tested::Spread { .. } => {
                let why = row.note.clone();
                return Err(RemedyError::NoBetter { id: row.id, subject: row.subject, why }.into());
            }
        };
        replaced.insert(finding.at.id(), Quantity::of_node(better));
    }
    let rebuilt = rebuilt(cx, value, replaced, &row.id)?;
    Ok(Value::Quantity(rebuilt.in_unit(Some(value.unit()))))
}

/// The value with some of its steps replaced, and the arithmetic after them done anew.
fn rebuilt(cx: &Cx, value: &Quantity, mut made: BTreeMap<u64, Quantity>, id: &str) -> Result<Quantity, Fault> {
    for node in node::history(value.node()) {
        if made.contains_key(&node.id()) || !node.inputs().iter().any(|(input, _)| made.contains_key(&input.id())) {
            continue;
        }
        let inputs: Vec<Quantity> = node
            .inputs()
            .iter()
            .map(|(input, _)| made.get(&input.id()).cloned().unwrap_or_else(|| Quantity::of_node(Rc::clone(input))))
            .collect();
        let again = match node.origin() {
            Origin::Operator(operator) => repeated(*operator, &inputs, cx)?,
            Origin::Step(step) => {
                return Err(RemedyError::Behind { id: id.to_owned(), function: step.does() }.into());
            }
            _ => continue,
        };
        made.insert(node.id(), again);
    }
    Ok(made.remove(&value.node().id()).unwrap_or_else(|| value.clone()))
}

fn repeated(operator: Operator, inputs: &[Quantity], cx: &Cx) -> Result<Quantity, Mismatch> {
    let place = cx.place.clone();
    match (operator, inputs) {
        (Operator::Add, [a, b]) => a.plus(b, place),
        (Operator::Subtract, [a, b]) => a.minus(b, place),
        (Operator::Multiply, [a, b]) => a.times(b, place),
        (Operator::Divide, [a, b]) => a.over(b, place),
        (Operator::Negate, [a]) => a.negated(place),
        (Operator::Scale(factor), [a]) => a.scaled(factor, place),
        (Operator::DivideBy(divisor), [a]) => a.divided(divisor, place),
        (Operator::PowerOf, [a, b]) => a.power_of(b, place),
        (Operator::Sin, [a]) => a.sin(place),
        (Operator::Cos, [a]) => a.cos(place),
        (Operator::Tan, [a]) => a.tan(place),
        (Operator::Shift(by), [a]) => a.shifted(by, place),
        (Operator::Reciprocal(numerator), [a]) => a.reciprocal(numerator, place),
        (Operator::Power(exponent), [a]) => a.power(exponent, place),
        (Operator::Exp, [a]) => a.exp(place),
        (Operator::Ln, [a]) => a.ln(place),
        (Operator::Absolute, [a]) => a.absolute(place),
        (Operator::Condition, [a]) => Ok(a.clone()),
        (Operator::Mean, all) => Quantity::mean(all, place),
        _ => unreachable!("an operator node is built with the inputs its operator takes"),
    }
}

fn widened(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let value = call.quantity(0);
    let (_, row) = meant(cx, call)?;
    let Some(price) = row.price else {
        let why = row.note.clone();
        return Err(RemedyError::NoPrice { id: row.id, subject: row.subject, why }.into());
    };
    let unit = value.unit();
    // One input for each assumption about one subject, of value 0 and half-width 1; the price is how strongly this value
    // depends on it, so that two values widened for one assumption stay correlated, each by its own price.
    let name = format!("{} ({})", row.id, row.subject);
    let input = Input {
        u: Some(1.0 / f64::sqrt(3.0)),
        evaluated: Evaluation { shape: Shape::Rectangular, ..Evaluation::UNSTATED }.kept(),
        label: Some(name.as_str().into()),
        citation: Some(Citation::new("price of the assumption, taken as a bound", "")),
        ..Input::of(LeafKey::Own(name.as_str().into()))
    };
    let leaf = Quantity::input(0.0, Dimension::none(), Kind::PLAIN, input, None)?;
    let dim = value.dim().clone();
    let inputs: smallvec::SmallVec<[(Rc<Node>, f64); 2]> =
        smallvec![(Rc::clone(value.node()), 1.0), (Rc::clone(leaf.node()), price * unit.factor)];
    let step = Rc::clone(call);
    let made = Quantity::from_step(value.si(), dim, value.kind().clone(), inputs, step, cx.place.clone())?;
    Ok(Value::Quantity(made.in_unit(Some(unit))))
}
