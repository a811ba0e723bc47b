//! Tests the assumption that first derivatives are enough to propagate the uncertainties of a value.
//!
//! `x.tested("linear-propagation")` gives the same value; where it is reported, the register has the row, with the price:
//! standard uncertainty by first derivatives minus that by Monte Carlo, both from the same draws. The surprise: the test
//! runs when it is asked for, not at the report, since it takes time; its outcome stands in the step's options, seed included.
//! Source: JCGM 101:2008, clause 8; JCGM 100:2008, clause 5.1.2 (note on second-order terms).

use std::collections::BTreeMap;
use std::rc::Rc;

use smallvec::smallvec;

use crate::fault::Fault;
use crate::model::answer;
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Takes, Value};
use crate::model::monte_carlo::{self, Propagation, Settings};
use crate::num::math;
use crate::quantity::{Quantity, round};
use crate::record::register::{Finding, Tested};
use crate::units::reader_text;

const ID: &str = "linear-propagation";

pub static TESTED: Card = Card {
    id: "uncertainty.tested",
    name: "tested",
    on: On::Quantity,
    args: &[
        Arg {
            name: "id",
            takes: Takes::Word(&[ID]),
            default: Default::Required,
            doc: "the assumption to test: those whose test takes long are tested when asked only",
        },
        Arg {
            name: "options",
            takes: Takes::Options(monte_carlo::OPTIONS),
            default: Default::NoOptions,
            doc: "how to draw, as for `monte_carlo`",
        },
    ],
    gives: "the same value, with the assumption tested",
    doc: "Tests by Monte Carlo whether first derivatives are enough to propagate the uncertainties of this value. The row \
          stands in the register of the value it was asked of, not of what is computed from it.",
    source: "JCGM 101:2008, clause 8",
    example: "q(\"2.0(3) bar\").tested(\"linear-propagation\", #{ seed: 1 })",
    claims: &[Claim { id: "linear-propagation", test: linear_propagation }],
    alternatives: &[],
    run: test,
    check_line: None,
    caution: None,
};

/// Names of the outcome's numbers among the step's options; SI units, of K itself for an equilibrium constant.
const U_DRAWN: &str = "u_drawn";
const U_LINEAR: &str = "u_linear";
const SHIFT: &str = "shift";

/// What rounding of up to 4 million draws leaves between two standard deviations, relative; far below two digits.
const ROUNDING: f64 = 1e-11;

fn test(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let value = call.quantity(0);
    let Some(Value::Options(options)) = call.args.last() else {
        unreachable!("the options of a call are its last argument")
    };
    let number = |name: &str| match options.get(name) {
        Some(Value::Number(number)) => Some(*number),
        _ => None,
    };
    let run = Propagation::of(cx, call, value, Settings::read(number)?)?;
    let scale = if run.logarithmic { value.si() } else { run.unit.factor };
    let at = if run.logarithmic { math::ln(value.si()) } else { run.unit.from_si(value.si()) };
    let outcome: BTreeMap<String, Value> = [
        ("seed", run.settings.seed as f64),
        ("draws", run.draws as f64),
        (U_DRAWN, run.drawn.u * scale),
        (U_LINEAR, run.u_linear * scale),
        (SHIFT, (run.drawn.mean - at) * scale),
    ]
    .into_iter()
    .map(|(name, number)| (name.to_owned(), Value::Number(number)))
    .collect();
    let mut args = call.args.clone();
    args.pop();
    args.push(Value::Options(Rc::new(outcome)));
    let step = Rc::new(Call { card: call.card, args });
    let inputs = smallvec![(Rc::clone(value.node()), 1.0)];
    let made =
        Quantity::from_step(value.si(), value.dim().clone(), value.kind().clone(), inputs, step, cx.place.clone())?;
    Ok(Value::Quantity(made.in_unit(Some(value.unit()))))
}

fn linear_propagation(_: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(Value::Options(outcome)) = call.args.last() else { return Vec::new() };
    let number = |name: &str| match outcome.get(name) {
        Some(Value::Number(number)) => *number,
        _ => f64::NAN,
    };
    let (drawn, linear) = (number(U_DRAWN), number(U_LINEAR));
    let unit = answer::difference_unit(call.quantity(0));
    let shown = |si: f64| format!("{} {}", round::significant(si / unit.factor, 3), reader_text(&unit));
    let how = format!(
        "{} draws, seed {}: u = {} by draws and {} by first derivatives from the same draws, and the mean of the draws is off \
         by {}; the price is that of u",
        number("draws"),
        number("seed"),
        shown(drawn).trim_end(),
        shown(linear).trim_end(),
        shown(number(SHIFT)).trim_end(),
    );
    // The two come from the same draws, so for a linear value only rounding tells them apart.
    let price = if (linear - drawn).abs() <= ROUNDING * drawn { 0.0 } else { linear - drawn };
    let tested = Tested::Spread { price, how };
    vec![Finding::known("linear-propagation", "the standard uncertainty", value.node(), None, tested)]
}
