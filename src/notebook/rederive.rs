//! Derives sealed values again from their steps and records alone, without running the author's cells.
//!
//! Typed inputs are read from their text, arithmetic is done again, and every formula is called again with the arguments
//! that it had, on the sealed records. The surprise: what cannot be done again, because it was folded or took something of
//! the author's, is taken by its recorded linear form and is *named*, so that nobody takes it for checked.

use std::cell::Cell;
use std::collections::{BTreeMap, BTreeSet};
use std::rc::Rc;
use std::sync::Arc;

use crate::data::own;
use crate::fault::Fault;
use crate::model::CARDS;
use crate::model::card::{self, Card, Cx, References, Value, call_of};
use crate::model::reaction::Reaction;
use crate::model::substance::PureSubstance;
use crate::model::table::Table;
use crate::notebook::holdings::Holdings;
use crate::notebook::parting::made_words;
use crate::notebook::seal::{
    Argument, InputOf, Made, Seal, SealedInput, SealedKind, SealedObject, SealedPlace, SealedStep, SealedZero,
};
use crate::notebook::skeleton::{TABLE, operator_of, what_of};
use crate::notebook::verdict::Rederived;
use crate::quantity::round::shortest;
use crate::quantity::{Quantity, text};
use crate::record::evaluation::{Evaluation, Shape};
use crate::record::node::{Input, LeafKey, Node, Operator, history};
use crate::source::Embedded;
use crate::units::{self, Dimension, Entity, Kind, State, Zero};

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

/// What is at hand while steps are done again.
struct Bench<'a> {
    cx: Cx<'a>,
    seal: &'a Seal,
    files: &'a BTreeMap<String, Arc<[u8]>>,
    done: Vec<Done>,
    /// Things made again, by their positions: one that several steps took is one, or its figures would be independent.
    made: BTreeMap<usize, Result<Value, String>>,
    /// What calls gave, by formula, arguments and place: a call of several values, such as readings taken together, is one
    /// call, or what it found of their correlation would be lost.
    calls: BTreeMap<String, Given>,
}

/// What a call gave, with the number of the last node before it.
#[derive(Clone)]
struct Given {
    value: Value,
    before: u64,
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
    let mut bench =
        Bench { cx, seal, files: &holdings.files, done: Vec::new(), made: BTreeMap::new(), calls: BTreeMap::new() };
    for step in &seal.steps {
        let again = again(&mut bench, step);
        bench.done.push(again);
    }
    let done = bench.done;
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
        for used in used_by(seal, &seal.steps[at]) {
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
    let Some(again) = done[last].value.as_ref() else { return told };
    let Some(unit) = unit.filter(|unit| *again.dim() == unit.dim) else {
        told.not_rederived.push(format!(
            "its last step comes out in {}, and the seal has {}",
            again.dim(),
            record.unit
        ));
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
fn used_by(seal: &Seal, step: &SealedStep) -> Vec<usize> {
    fn within(seal: &Seal, argument: &Argument, objects: &mut BTreeSet<usize>, all: &mut Vec<usize>) {
        match argument {
            Argument::Step(at) => all.extend(at.parse::<usize>().ok()),
            Argument::List(list) => list.iter().for_each(|item| within(seal, item, objects, all)),
            Argument::Options(options) => options.values().for_each(|item| within(seal, item, objects, all)),
            Argument::Object { at, .. } => {
                let Some(at) = at.parse::<usize>().ok().filter(|at| objects.insert(*at)) else { return };
                let Some(object) = seal.objects.get(at) else { return };
                object.arguments.iter().for_each(|item| within(seal, item, objects, all));
            }
            _ => {}
        }
    }
    match &step.made {
        // A formula finds its figures in the records itself: the inputs that were recorded are not used.
        Made::Formula { arguments, .. } => {
            let (mut all, mut objects) = (Vec::new(), BTreeSet::new());
            arguments.iter().for_each(|argument| within(seal, argument, &mut objects, &mut all));
            all
        }
        _ => step.inputs.iter().filter_map(|(at, _)| at.parse().ok()).collect(),
    }
}

fn again(bench: &mut Bench, step: &SealedStep) -> Done {
    let mut unread = None;
    let tried = match &step.made {
        Made::Input(input) => input_again(&bench.cx, step, input).map(|(value, why)| {
            unread = why;
            value
        }),
        Made::Arithmetic { operator, by } => arithmetic_again(step, operator, by.as_deref(), &bench.done),
        Made::Formula { card, arguments } => formula_again(bench, step, card, arguments),
        Made::Folded { steps, .. } => Err(format!("{steps} steps folded, taken by their linear form")),
    };
    let (value, as_recorded) = match tried {
        Ok(value) => (Some(value), unread),
        Err(why) => (linear(step, &bench.done), Some(why)),
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
fn input_again(cx: &Cx, step: &SealedStep, sealed: &SealedInput) -> Result<(Quantity, Option<String>), String> {
    let unusable = || format!("the input {} is not readable", made_words(step));
    let recorded: f64 = step.si.parse().map_err(|_| unusable())?;
    let number = |text: &Option<String>| text.as_ref().and_then(|text| text.parse::<f64>().ok());
    let (mut si, mut u) = (recorded, number(&sealed.u));
    let label = sealed.label.as_deref().unwrap_or("an input without a text");
    let mut unread = Some(format!("the figure of {label}, which is taken as sealed"));
    let name = match &sealed.of {
        InputOf::Typed { ordinal } => {
            let read = sealed.label.as_ref().and_then(|label| text::parse(label, None, 0).ok());
            // A text of another sort, as that of readings, says another thing than the value.
            let says_it = |read: &Quantity| {
                let dof = read.node().input().and_then(|input| input.evaluation().dof);
                dim_of(step).is_some_and(|dim| dim == *read.dim()) && dof == number(&sealed.dof)
            };
            if let Some(read) = read.filter(says_it) {
                (si, u, unread) = (read.si(), read.node().input().and_then(|input| input.u), None);
            }
            format!("typed {ordinal} {}", step.place.as_ref().map_or("", |place| &place.0))
        }
        InputOf::Constant { name, .. } => {
            if let Some(constant) = cx.constants().all().into_iter().find(|constant| constant.name == name) {
                (si, u, unread) = (constant.value, Some(constant.u), None);
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
    own_input(step, si, input).map(|value| (value, unread)).ok_or_else(unusable)
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
        // An open mole that took a name on its way into a unit: a factor of 1 that binds.
        (Operator::Scale(1.0), [a]) if step.bound.is_some() => {
            let entity = Entity::named(step.bound.as_deref().unwrap_or_default());
            a.bound(entity, None)
        }
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

fn card_of(id: &str) -> Result<&'static Card, String> {
    CARDS.iter().copied().find(|card| card.id == id).ok_or_else(|| format!("the formula {id} is not known here"))
}

fn formula_again(bench: &mut Bench, step: &SealedStep, id: &str, arguments: &[Argument]) -> Result<Quantity, String> {
    let card = card_of(id)?;
    let key = serde_json::to_string(&(id, arguments, &step.place)).map_err(|error| error.to_string())?;
    let Given { value, before } = match bench.calls.get(&key) {
        Some(given) => given.clone(),
        None => {
            let given = arguments_again(bench, card, arguments)?;
            let mark = Input::of(LeafKey::Own("mark".into()));
            let before =
                Quantity::input(0.0, Dimension::none(), Kind::PLAIN, mark, None).map_or(0, |mark| mark.node().id());
            let called = card::call(&bench.cx, card, given);
            let value = called.map_err(|fault| format!("{} refuses: {}", card.name, fault.message()))?;
            bench.calls.insert(key, Given { value: value.clone(), before });
            Given { value, before }
        }
    };
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
        Value::Stream(stream) => {
            let own = |node: &Rc<Node>| call_of(node).is_some_and(|call| call.card.id == card.id) && node.id() > before;
            found.extend(stream.nodes().into_iter().flat_map(|node| history(&node)).filter(own));
        }
        Value::List(list) => list.iter().for_each(|item| gather(item, card, before, found)),
        Value::Options(options) => options.values().for_each(|item| gather(item, card, before, found)),
        Value::Answer(answer) => answer.parts().iter().for_each(|(_, part)| gather(part, card, before, found)),
        _ => {}
    }
}

fn arguments_again(bench: &mut Bench, card: &Card, arguments: &[Argument]) -> Result<Vec<Value>, String> {
    let again = |argument| argument_again(bench, argument).map_err(|what| format!("{} took {what}", card.name));
    arguments.iter().map(again).collect()
}

fn argument_again(bench: &mut Bench, argument: &Argument) -> Result<Value, String> {
    let fault = |fault: Fault| fault.message().to_owned();
    Ok(match argument {
        Argument::Step(at) => {
            let value = value_at(&bench.done, at).ok_or_else(|| "a value that could not be derived".to_owned())?;
            Value::Quantity(value.clone())
        }
        Argument::Number(text) => Value::Number(text.parse().map_err(|_| format!("the number {text}"))?),
        Argument::Flag(flag) => Value::Flag(*flag),
        Argument::Text(text) => Value::Text(text.as_str().into()),
        Argument::List(list) => {
            Value::List(list.iter().map(|item| argument_again(bench, item)).collect::<Result<_, _>>()?)
        }
        Argument::Options(options) => {
            let option = |(name, value): (&String, &Argument)| Ok((name.clone(), argument_again(bench, value)?));
            Value::Options(Rc::new(options.iter().map(option).collect::<Result<BTreeMap<_, _>, String>>()?))
        }
        Argument::Reaction(text) => Value::Reaction(Rc::new(Reaction::read(text, bench.cx.data()).map_err(fault)?)),
        Argument::Substance(text) => {
            let found = bench.cx.data().find(text).map_err(|error| fault(error.into()))?;
            Value::Substance(Rc::new(PureSubstance::on_record(found, bench.cx.data())))
        }
        Argument::Object { at, words } => object_again(bench, at).map_err(|why| format!("{words}: {why}"))?,
        Argument::Other(what) => return Err(format!("{what}, which a seal cannot keep")),
        Argument::Nothing => Value::Nothing,
    })
}

/// A thing that steps took, made again at its first use.
fn object_again(bench: &mut Bench, at: &str) -> Result<Value, String> {
    let missing = || "the seal has no such thing".to_owned();
    let at: usize = at.parse().map_err(|_| missing())?;
    if let Some(made) = bench.made.get(&at) {
        return made.clone();
    }
    let seal = bench.seal;
    let object = seal.objects.get(at).ok_or_else(missing)?;
    // Until it is made it has been refused: a seal that was tampered with may name a thing as a part of itself.
    bench.made.insert(at, Err("it is made of itself".to_owned()));
    let made = made_again(bench, object);
    bench.made.insert(at, made.clone());
    made
}

fn made_again(bench: &mut Bench, object: &SealedObject) -> Result<Value, String> {
    if object.card == TABLE {
        let [Argument::Text(file), source] = object.arguments.as_slice() else {
            return Err("the file of the table is not named".to_owned());
        };
        let bytes = bench.files.get(file).ok_or_else(|| format!("the seal does not keep what was in {file}"))?;
        let text = String::from_utf8_lossy(bytes);
        let source = if let Argument::Text(source) = source { Some(source.as_str()) } else { None };
        let table = Table::read(&bench.cx, file, &text, source).map_err(|fault| fault.message().to_owned())?;
        return Ok(Value::Table(Rc::new(table)));
    }
    let card = card_of(&object.card)?;
    let given = arguments_again(bench, card, &object.arguments)?;
    let whole = card::call(&bench.cx, card, given);
    let whole = whole.map_err(|fault| format!("{} refuses: {}", card.name, fault.message()))?;
    let Some(part) = &object.part else { return Ok(whole) };
    let parts = if let Value::Answer(answer) = &whole { answer.parts() } else { Vec::new() };
    let found = parts.into_iter().find(|(name, _)| name == part).map(|(_, value)| value);
    found.ok_or_else(|| format!("{} has no part {part}", card.name))
}
