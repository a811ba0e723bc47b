//! Derives sealed values again from their steps and records alone, without running the author's cells.
//!
//! Typed inputs are read from their text, arithmetic is done again, and every formula is called again with the arguments
//! that it had, on the sealed records. The surprise: what cannot be done again, because it was folded or took something of
//! the author's, is taken by its recorded linear form and is *named*, so that nobody takes it for checked.

use std::cell::Cell;
use std::collections::{BTreeMap, BTreeSet};
use std::rc::Rc;

use crate::data::own;
use crate::fault::Fault;
use crate::model::CARDS;
use crate::model::card::{self, Card, Cx, References, Value, call_of};
use crate::model::reaction::Reaction;
use crate::model::substance::PureSubstance;
use crate::notebook::holdings::Holdings;
use crate::notebook::parting::made_words;
use crate::notebook::seal::{
    Argument, InputOf, Made, Seal, SealedInput, SealedKind, SealedPlace, SealedStep, SealedZero,
};
use crate::notebook::skeleton::{operator_of, what_of};
use crate::notebook::verdict::Rederived;
use crate::quantity::round::shortest;
use crate::quantity::{Quantity, text};
use crate::record::evaluation::{Evaluation, Shape};
use crate::record::node::{Input, LeafKey, Node, Operator, history};
use crate::source::Embedded;
use crate::units::{self, Dimension, Kind, State, Zero};

/// One step, done again.
struct Done {
    value: Option<Quantity>,
    /// Why it was taken as recorded, where it was.
    as_recorded: Option<String>,
    /// Where it gives another value than recorded.
    parts: Option<String>,
    /// In SI units.
    recorded: Option<f64>,
}

/// Derives every value of a seal again.
///
/// # Errors
/// The records make no catalogue.
pub fn rederive(seal: &Seal, holdings: &Holdings) -> Result<Vec<Rederived>, Fault> {
    let mut catalog = holdings.catalog()?;
    for (name, bytes) in &holdings.files {
        let sha256 = crate::source::sha256(bytes);
        // A file of figures is no dataset, and is passed over.
        if let Ok(own) = own::read(&Embedded { path: name, bytes, sha256: &sha256 }, &catalog) {
            catalog = catalog.overlaid(&own)?.0.into();
        }
    }
    let references = References::of(catalog, holdings.constants);
    let ordinal = Cell::new(0);
    let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
    let mut done: Vec<Done> = Vec::with_capacity(seal.steps.len());
    for step in &seal.steps {
        let again = again(&cx, step, &done);
        done.push(again);
    }
    Ok(seal.values.iter().map(|value| summed_up(seal, value, &done)).collect())
}

/// What is to be said of one value.
fn summed_up(seal: &Seal, value: &crate::notebook::seal::SealedValue, done: &[Done]) -> Rederived {
    let record = &value.record;
    let mut told = Rederived {
        label: record.label.clone(),
        value: None,
        off_by: None,
        same: false,
        u: None,
        u_same: None,
        steps: 0,
        not_rederived: Vec::new(),
        parts_at: None,
    };
    let last = value.step.parse::<usize>().ok().filter(|at| *at < seal.steps.len());
    let Some(last) = last else {
        told.not_rederived.push("the seal has no such step".to_owned());
        return told;
    };
    let mut seen = BTreeSet::from([last]);
    let mut pending = vec![last];
    while let Some(at) = pending.pop() {
        for used in used_by(&seal.steps[at]) {
            if used < at && seen.insert(used) {
                pending.push(used);
            }
        }
    }
    for &at in &seen {
        let step = &done[at];
        told.steps += usize::from(!matches!(seal.steps[at].made, Made::Input(_)));
        told.not_rederived.extend(step.as_recorded.iter().map(|why| format!("{}{why}", place_words(&seal.steps[at]))));
        if told.parts_at.is_none() {
            told.parts_at = step.parts.as_ref().map(|parts| format!("{}{parts}", place_words(&seal.steps[at])));
        }
    }
    if value.folded != "0" {
        told.not_rederived.push(format!("{} earlier steps, folded when it was sealed", value.folded));
    }
    let unit = units::parse::unit(&record.unit).ok();
    let Some((again, unit)) = done[last].value.as_ref().zip(unit).filter(|(again, unit)| *again.dim() == unit.dim)
    else {
        return told;
    };
    let now = unit.from_si(again.si());
    told.same = shortest(now) == record.value;
    told.off_by = record.value.parse::<f64>().ok().map(|then| shortest(now - then));
    told.value = Some(shortest(now));
    if told.not_rederived.is_empty() {
        told.u = again.spread().u().map(|u| shortest(u / crate::notebook::comparison::factor_of(&record.unit)));
        told.u_same = Some(close(told.u.as_deref(), record.u.as_deref()));
    }
    told
}

/// Whether two uncertainties are the same but for the order in which their parts were added.
fn close(now: Option<&str>, then: Option<&str>) -> bool {
    let number = |text: &str| text.parse::<f64>().ok();
    match (now.and_then(number), then.and_then(number)) {
        // A sum of n squares in another order is off by some n units of the last place; n is some thousands at most.
        (Some(now), Some(then)) => (now - then).abs() <= 1e-12 * then.abs(),
        (now, then) => now.is_none() && then.is_none(),
    }
}

fn place_words(step: &SealedStep) -> String {
    match &step.place {
        Some(SealedPlace(cell, line, _)) => format!("{cell}, line {line}: "),
        None => String::new(),
    }
}

/// Positions of the steps that a step names.
fn used_by(step: &SealedStep) -> Vec<usize> {
    fn within(argument: &Argument, all: &mut Vec<usize>) {
        match argument {
            Argument::Step(at) => all.extend(at.parse::<usize>().ok()),
            Argument::List(list) => list.iter().for_each(|item| within(item, all)),
            Argument::Options(options) => options.values().for_each(|item| within(item, all)),
            _ => {}
        }
    }
    match &step.made {
        // A formula finds its figures in the records itself: the inputs that were recorded are not used.
        Made::Formula { arguments, .. } => {
            let mut all = Vec::new();
            arguments.iter().for_each(|argument| within(argument, &mut all));
            all
        }
        _ => step.inputs.iter().filter_map(|(at, _)| at.parse().ok()).collect(),
    }
}

fn again(cx: &Cx, step: &SealedStep, done: &[Done]) -> Done {
    let tried = match &step.made {
        Made::Input(input) => input_again(cx, step, input),
        Made::Arithmetic { operator, by } => arithmetic_again(step, operator, by.as_deref(), done),
        Made::Formula { card, arguments } => formula_again(cx, step, card, arguments, done),
        Made::Folded { steps, .. } => Err(format!("{steps} steps folded, taken by their linear form")),
    };
    let (value, as_recorded) = match tried {
        Ok(value) => (Some(value), None),
        Err(why) => (linear(step, done), Some(why)),
    };
    let recorded = step.si.parse::<f64>().ok();
    let parts = match (&value, recorded) {
        (Some(value), Some(recorded)) if value.si() != recorded => {
            Some(format!("{}: {recorded} sealed, {} derived again, in {}", made_words(step), value.si(), step.unit))
        }
        (None, _) => Some(format!("{}: could not be derived again", made_words(step))),
        _ => None,
    };
    Done { value, as_recorded, parts, recorded }
}

fn value_at<'a>(done: &'a [Done], at: &str) -> Option<&'a Quantity> {
    done.get(at.parse::<usize>().ok()?)?.value.as_ref()
}

/// A step by its recorded linear form over what it was computed from, as those are now.
fn linear(step: &SealedStep, done: &[Done]) -> Option<Quantity> {
    let mut si: f64 = step.si.parse().ok()?;
    for (at, partial) in &step.inputs {
        let (now, partial) = (value_at(done, at)?, partial.parse::<f64>().ok()?);
        let then = done.get(at.parse::<usize>().ok()?)?.recorded?;
        si += partial * (now.si() - then);
    }
    own_input(step, si, Input::of(LeafKey::Own("a step as it was sealed".into())))
}

fn own_input(step: &SealedStep, si: f64, input: Input) -> Option<Quantity> {
    Quantity::input(si, dim_of(step)?, kind_of(&step.kind)?, input, None).ok()
}

fn dim_of(step: &SealedStep) -> Option<Dimension> {
    if step.unit == "1" { Some(Dimension::none()) } else { units::parse::unit(&step.unit).ok().map(|unit| unit.dim) }
}

fn kind_of(kind: &SealedKind) -> Option<Kind> {
    let what = what_of(&kind.what)?;
    let Some(state) = &kind.state else { return Some(Kind::of(what)) };
    let number = |text: &Option<String>| text.as_ref().and_then(|text| text.parse::<f64>().ok());
    let zero = match &state.zero {
        None => None,
        Some(SealedZero::Elements298) => Some(Zero::Elements298),
        Some(SealedZero::ElementsAtT) => Some(Zero::ElementsAtT),
        Some(SealedZero::Elements0) => Some(Zero::Elements0),
        Some(SealedZero::From(t)) => Some(Zero::From(t.parse().ok()?)),
        Some(SealedZero::Named(name)) => Some(Zero::Named(name.as_str().into())),
    };
    let state = State {
        zero,
        t_k: number(&state.t),
        p_pa: number(&state.p),
        standard: state.standard,
        reaction: state.reaction,
    };
    Some(Kind::in_state(what, state))
}

/// An input: a typed one from its text, a constant from the set; others as they stand, since the formula that used them
/// reads them from the records again.
fn input_again(cx: &Cx, step: &SealedStep, sealed: &SealedInput) -> Result<Quantity, String> {
    let unusable = || format!("the input {} is not readable", made_words(step));
    let recorded: f64 = step.si.parse().map_err(|_| unusable())?;
    let number = |text: &Option<String>| text.as_ref().and_then(|text| text.parse::<f64>().ok());
    let (mut si, mut u) = (recorded, number(&sealed.u));
    let name = match &sealed.of {
        InputOf::Typed { ordinal } => {
            if let Some(read) = sealed.label.as_ref().and_then(|label| text::parse(label, None, 0).ok()) {
                // A mean of readings has a text of its own that says another thing.
                if dim_of(step).is_some_and(|dim| dim == *read.dim()) && sealed.dof.is_none() {
                    (si, u) = (read.si(), read.node().input().and_then(|input| input.u));
                }
            }
            format!("typed {ordinal} {}", step.place.as_ref().map_or("", |place| &place.0))
        }
        InputOf::Constant { name, .. } => {
            if let Some(constant) = cx.constants().all().into_iter().find(|constant| constant.name == name) {
                (si, u) = (constant.value, Some(constant.u));
            }
            format!("constant {name}")
        }
        other => format!("{other:?}"),
    };
    let shape = match sealed.shape.as_deref() {
        Some("rectangular") => Shape::Rectangular,
        Some("triangular") => Shape::Triangular,
        _ => Shape::Normal,
    };
    let evaluated = Evaluation { shape, dof: number(&sealed.dof), correlation: None }.kept();
    let input = Input { u, evaluated, digit: number(&sealed.digit), ..Input::of(LeafKey::Own(name.into())) };
    own_input(step, si, input).ok_or_else(unusable)
}

fn arithmetic_again(step: &SealedStep, word: &str, by: Option<&str>, done: &[Done]) -> Result<Quantity, String> {
    let unknown = || format!("the operation {word} is not known here");
    let by = by.map(|by| by.parse::<f64>().map_err(|_| unknown())).transpose()?;
    let operator = operator_of(word, by).ok_or_else(unknown)?;
    let mut inputs = Vec::with_capacity(step.inputs.len());
    for (at, _) in &step.inputs {
        inputs.push(value_at(done, at).ok_or_else(|| "an input of it is missing".to_owned())?.clone());
    }
    let done = match (operator, inputs.as_slice()) {
        (Operator::Add, [a, b]) => a.plus(b, None),
        (Operator::Subtract, [a, b]) => a.minus(b, None),
        (Operator::Multiply, [a, b]) => a.times(b, None),
        (Operator::Divide, [a, b]) => a.over(b, None),
        (Operator::PowerOf, [a, b]) => a.power_of(b, None),
        (Operator::Negate, [a]) => a.negated(None),
        (Operator::Scale(by), [a]) => a.scaled(by, None),
        (Operator::Shift(by), [a]) => a.shifted(by, None),
        (Operator::DivideBy(by), [a]) => a.divided(by, None),
        (Operator::Reciprocal(by), [a]) => a.reciprocal(by, None),
        (Operator::Power(by), [a]) => a.power(by, None),
        (Operator::Exp, [a]) => a.exp(None),
        (Operator::Ln, [a]) => a.ln(None),
        (Operator::Sin, [a]) => a.sin(None),
        (Operator::Cos, [a]) => a.cos(None),
        (Operator::Tan, [a]) => a.tan(None),
        (Operator::Absolute, [a]) => a.absolute(None),
        (Operator::Condition, [a]) => Ok(a.clone()),
        (Operator::Mean, all) => Quantity::mean(all, None),
        _ => return Err(unknown()),
    };
    done.map_err(|refusal| format!("{word} is refused: {refusal}"))
}

fn formula_again(
    cx: &Cx,
    step: &SealedStep,
    id: &str,
    arguments: &[Argument],
    done: &[Done],
) -> Result<Quantity, String> {
    let card = CARDS.iter().find(|card| card.id == id).ok_or_else(|| format!("the formula {id} is not known here"))?;
    let mut given = Vec::with_capacity(arguments.len());
    for argument in arguments {
        given.push(argument_again(cx, argument, done).map_err(|what| format!("{} took {what}", card.name))?);
    }
    let before = Quantity::input(0.0, Dimension::none(), Kind::PLAIN, Input::of(LeafKey::Own("mark".into())), None)
        .map_or(0, |mark| mark.node().id());
    let value = card::call(cx, card, given).map_err(|fault| format!("{} refuses: {}", card.name, fault.message()))?;
    let dim = dim_of(step).ok_or_else(|| format!("its unit {} is not known here", step.unit))?;
    let mut candidates = Vec::new();
    gather(&value, card, before, &mut candidates);
    let recorded: Option<f64> = step.si.parse().ok();
    let fits = |one: &&Rc<Node>| *one.dim() == dim;
    let same = candidates.iter().filter(fits).find(|one| Some(one.si()) == recorded);
    let chosen = same.or_else(|| candidates.iter().find(fits));
    chosen.map(|node| Quantity::of_node(Rc::clone(node))).ok_or_else(|| format!("{} gives nothing like it", card.name))
}

/// The values that a call gave: what it returned, and what it made on the way there.
fn gather(value: &Value, card: &'static Card, before: u64, found: &mut Vec<Rc<Node>>) {
    match value {
        Value::Quantity(value) => {
            found.push(Rc::clone(value.node()));
            let own = |node: &Rc<Node>| call_of(node).is_some_and(|call| call.card.id == card.id) && node.id() > before;
            found.extend(history(value.node()).into_iter().filter(own));
        }
        Value::List(list) => list.iter().for_each(|item| gather(item, card, before, found)),
        Value::Options(options) => options.values().for_each(|item| gather(item, card, before, found)),
        Value::Answer(answer) => answer.parts().iter().for_each(|(_, part)| gather(part, card, before, found)),
        _ => {}
    }
}

fn argument_again(cx: &Cx, argument: &Argument, done: &[Done]) -> Result<Value, String> {
    let fault = |fault: Fault| fault.message().to_owned();
    Ok(match argument {
        Argument::Step(at) => {
            let value = value_at(done, at).ok_or_else(|| "a value that could not be derived".to_owned())?;
            Value::Quantity(value.clone())
        }
        Argument::Number(text) => Value::Number(text.parse().map_err(|_| format!("the number {text}"))?),
        Argument::Flag(flag) => Value::Flag(*flag),
        Argument::Text(text) => Value::Text(text.as_str().into()),
        Argument::List(list) => {
            Value::List(list.iter().map(|item| argument_again(cx, item, done)).collect::<Result<_, _>>()?)
        }
        Argument::Options(options) => {
            let option = |(name, value): (&String, &Argument)| Ok((name.clone(), argument_again(cx, value, done)?));
            Value::Options(Rc::new(options.iter().map(option).collect::<Result<BTreeMap<_, _>, String>>()?))
        }
        Argument::Reaction(text) => Value::Reaction(Rc::new(Reaction::read(text, cx.data()).map_err(fault)?)),
        Argument::Substance(text) => {
            let found = cx.data().find(text).map_err(|error| fault(error.into()))?;
            Value::Substance(Rc::new(PureSubstance::new(found)))
        }
        Argument::Other(what) => return Err(format!("{what}, which a seal cannot keep")),
        Argument::Nothing => Value::Nothing,
    })
}
