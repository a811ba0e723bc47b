//! Formulas asked of quantities themselves: another unit, the bare number, its uncertainty, agreement, means, and the
//! analyst's own assumption.

use std::rc::Rc;

use smallvec::smallvec;
use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Takes, Value};
use crate::quantity::{Mismatch, Quantity};
use crate::record::register::{Finding, Tested};
use crate::units::{Unit, What, parse as unit_parse};

const UNIT: Arg = Arg {
    name: "unit",
    takes: Takes::Text,
    default: Default::Required,
    doc: "a unit of the value's dimension, such as \"kcal_th/mol\"; an open mole takes the value's own basis",
};

pub static MEAN: Card = Card {
    id: "quantity.mean",
    name: "mean",
    on: On::Nothing,
    args: &[
        Arg { name: "a", takes: Takes::AnyQuantity, default: Default::Required, doc: "a value" },
        Arg { name: "b", takes: Takes::AnyQuantity, default: Default::Required, doc: "another of the same dimension" },
    ],
    gives: "their arithmetic mean; of two temperature points a point",
    doc: "Arithmetic mean of two values, (a + b)/2.",
    source: "definition",
    example: "mean(\"200 degC\", \"450 degC\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let pair = [call.quantity(0).clone(), call.quantity(1).clone()];
        Ok(Value::Quantity(Quantity::mean(&pair, cx.place.clone())?))
    },
    check_line: None,
    caution: None,
};

pub static TO: Card = Card {
    id: "quantity.to",
    name: "to",
    on: On::Quantity,
    args: &[UNIT],
    gives: "the same value, shown in that unit",
    doc: "Shows a value in another unit. Nothing is rounded.",
    source: "definition",
    example: "q(\"-285.830(20) kJ/mol[H2O]\").to(\"kcal_th/mol\")",
    claims: &[],
    alternatives: &[],
    run: |_, call| Ok(Value::Quantity(in_unit(call)?)),
    check_line: None,
    caution: None,
};

pub static VALUE: Card = Card {
    id: "quantity.value",
    name: "value",
    on: On::Quantity,
    args: &[UNIT],
    gives: "the bare number in that unit",
    doc: "The number in a unit. What is computed with it further carries no unit, basis, uncertainty or source.",
    source: "definition",
    example: "q(\"450 degC\").value(\"K\")",
    claims: &[],
    alternatives: &[],
    run: |_, call| {
        let value = in_unit(call)?;
        Ok(Value::Number(value.unit().from_si(value.si())))
    },
    check_line: None,
    caution: None,
};

pub static UNCERTAINTY: Card = Card {
    id: "quantity.uncertainty",
    name: "uncertainty",
    on: On::Quantity,
    args: &[UNIT],
    gives: "the standard uncertainty as a bare number in that unit, nothing where none is stated",
    doc: "Standard uncertainty by linear propagation with correlation. Where some inputs state none, it covers the others only.",
    source: "JCGM 100:2008, clause 5",
    example: "q(\"-285.830(20) kJ/mol[H2O]\").uncertainty(\"kJ/mol\")",
    claims: &[],
    alternatives: &[],
    run: |_, call| {
        let value = in_unit(call)?;
        let u = value.spread().u();
        Ok(u.map_or(Value::Nothing, |u| Value::Number(u / value.unit().factor)))
    },
    check_line: None,
    caution: None,
};

pub static AGREES: Card = Card {
    id: "quantity.agrees",
    name: "agrees",
    on: On::Nothing,
    args: &[
        Arg { name: "a", takes: Takes::AnyQuantity, default: Default::Required, doc: "a value" },
        Arg {
            name: "b",
            takes: Takes::AnyQuantity,
            default: Default::Required,
            doc: "another of the same dimension and kind",
        },
        Arg { name: "k", takes: Takes::Number, default: Default::Number(2.0), doc: "coverage factor" },
    ],
    gives: "whether |a - b| is within k standard uncertainties of the difference",
    doc: "Compares two values by the uncertainty of their difference, correlation included.",
    source: "JCGM 100:2008, clause 5.2",
    example: "agrees(\"-285.830(20) kJ/mol[H2O]\", \"-285.80(4) kJ/mol[H2O]\", 2)",
    claims: &[],
    alternatives: &[],
    run: |_, call| Ok(Value::Flag(call.quantity(0).agrees(call.quantity(1), call.number(2))?)),
    check_line: None,
    caution: None,
};

pub static ASSUME: Card = Card {
    id: "quantity.assume",
    name: "assume",
    on: On::Nothing,
    args: &[
        Arg { name: "value", takes: Takes::AnyQuantity, default: Default::Required, doc: "the value that rests on it" },
        Arg {
            name: "id",
            takes: Takes::Text,
            default: Default::Required,
            doc: "a short name in lower case with dashes, such as \"no-heat-loss\"",
        },
        Arg { name: "claim", takes: Takes::Text, default: Default::Required, doc: "the claim in words" },
        Arg {
            name: "price",
            takes: Takes::AnyQuantity,
            default: Default::Absent,
            doc: "value with the assumption minus the better value; without it the assumption is untested",
        },
    ],
    gives: "the same value, with the assumption attached",
    doc: "Attaches an assumption of one's own to a value, so that whatever is computed from it carries the assumption.",
    source: "the analyst's own step",
    example: "assume(q(\"12.5(3) kJ\"), \"no-heat-loss\", \"the vessel loses no heat\", \"0.4 kJ\")",
    claims: &[Claim { id: "own", test: own_assumption }],
    alternatives: &[],
    run: attach,
    check_line: None,
    caution: None,
};

/// A temperature on a scale, where the size of a difference is wanted.
#[derive(Clone, Debug, Error)]
#[error("`{function}` wants the size of a difference, not a temperature point, {t_k} K")]
pub struct PointForDifference {
    pub function: &'static str,
    pub t_k: f64,
}

impl Explain for PointForDifference {
    fn code(&self) -> &'static str {
        "point-for-difference"
    }

    fn hint(&self) -> String {
        "write the difference in kelvin, as in \"2 K\"".to_owned()
    }
}

fn in_unit(call: &Call) -> Result<Quantity, Fault> {
    let unit: Unit = unit_parse::unit(call.text(1))?;
    Ok(call.quantity(0).to(unit)?)
}

fn attach(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let value = call.quantity(0);
    let id = call.text(1);
    let kebab = !id.is_empty() && id.chars().all(|c| c.is_ascii_lowercase() || c.is_ascii_digit() || c == '-');
    if !kebab {
        return Err(Fault::new(
            "claim-id-unreadable",
            format!("`{id}` is no name for an assumption"),
            "use lower-case words joined by dashes, such as \"no-heat-loss\"",
        ));
    }
    if let Value::Quantity(price) = &call.args[3] {
        if price.kind().what == What::TemperaturePoint {
            return Err(PointForDifference { function: "assume", t_k: price.si() }.into());
        }
        // The price must be a difference of such values, so subtracting it must make sense.
        let fits = price.dim() == value.dim() || price.dim().bindings_to(value.dim()).len() == 1;
        if !fits {
            return Err(Mismatch::between("subtract", value.dim(), price.dim()).into());
        }
    }
    let inputs = smallvec![(Rc::clone(value.node()), 1.0)];
    let step = Rc::clone(call);
    let made =
        Quantity::from_step(value.si(), value.dim().clone(), value.kind().clone(), inputs, step, cx.place.clone())?;
    Ok(Value::Quantity(made.in_unit(Some(value.unit()))))
}

fn own_assumption(_: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let tested = match &call.args[3] {
        Value::Quantity(price) => Tested::Given { price: price.si(), how: "price given by the analyst".to_owned() },
        _ => Tested::Missing { what: "no price was given".to_owned() },
    };
    vec![Finding {
        id: Rc::clone(call.text(1)),
        claim: Rc::clone(call.text(2)),
        subject: call.text(2).to_string(),
        at: Rc::clone(value.node()),
        t_k: None,
        tested,
        sources: Vec::new(),
    }]
}
