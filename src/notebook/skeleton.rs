//! The derivation of values as a seal keeps it: every step once, inputs before their users.
//!
//! A derivation of more than [`MOST`] steps and inputs keeps its last steps as they are; what lies before them is kept as
//! linear forms over the inputs, as the graph itself does with long runs of arithmetic. The surprise: an input that many
//! steps use is one step here, as equal keys are one input everywhere.

use std::collections::{BTreeMap, BTreeSet};
use std::rc::Rc;

use crate::fault::Place;
use crate::model::card::{Value, call_of};
use crate::model::origin::origin_of;
use crate::model::terms::Terms;
use crate::notebook::seal::{
    Argument, InputOf, Made, SealedInput, SealedKind, SealedObject, SealedPlace, SealedState, SealedStep, SealedZero,
};
use crate::quantity::Quantity;
use crate::quantity::round::shortest;
use crate::record::evaluation::Shape;
use crate::record::node::{Input, LeafKey, Node, Operator, Origin, history};
use crate::record::spread::derivatives;
use crate::units::{Kind, What, Zero};

/// The longest derivation of one value that is kept step by step, its inputs counted.
pub const MOST: usize = 2000;

/// Stands for the call that made a table: a file that was read.
pub const TABLE: &str = "read_csv";

/// Steps of several values.
#[derive(Default)]
pub struct Skeleton {
    pub steps: Vec<SealedStep>,
    pub objects: Vec<SealedObject>,
    /// Positions of the things entered, by where they lie in memory: the values being entered hold them.
    places: BTreeMap<usize, usize>,
    nodes: BTreeMap<u64, usize>,
    /// Inputs by what they are; the same figure may have been read in several units.
    inputs: BTreeMap<(InputOf, String, String), usize>,
    /// Linear forms of the value being entered.
    forms: BTreeMap<u64, usize>,
}

/// Where a value's derivation ends, and how much of it was folded.
pub struct Ending {
    pub step: usize,
    pub folded: usize,
}

/// The part of a value's history that is kept step by step.
struct Kept {
    nodes: BTreeSet<u64>,
    /// Nodes that are kept as linear forms, with the inputs of each and the derivative with respect to it.
    forms: BTreeMap<u64, Vec<(Rc<Node>, f64)>>,
}

impl Skeleton {
    /// Enters the derivation of a value.
    pub fn enter(&mut self, value: &Quantity) -> Ending {
        let history = history(value.node());
        let kept = Kept::of(&history);
        let mut step = 0;
        self.forms.clear();
        for node in history.iter().filter(|node| kept.nodes.contains(&node.id())) {
            step = self.node(node, kept.forms.get(&node.id()));
        }
        let left_out = history.iter().filter(|node| node.input().is_none() && !kept.nodes.contains(&node.id()));
        Ending { step, folded: left_out.count() }
    }

    fn node(&mut self, node: &Rc<Node>, form: Option<&Vec<(Rc<Node>, f64)>>) -> usize {
        if let Some(&at) = self.nodes.get(&node.id()).or_else(|| self.forms.get(&node.id())) {
            return at;
        }
        let step = self.step(node, form);
        let at = match &step.made {
            Made::Input(input) => {
                let key = (input.of.clone(), step.si.clone(), step.unit.clone());
                *self.inputs.entry(key).or_insert_with(|| {
                    self.steps.push(step);
                    self.steps.len() - 1
                })
            }
            _ => {
                self.steps.push(step);
                self.steps.len() - 1
            }
        };
        // A form stands for a node in one value; another value may keep the node itself.
        let known = if form.is_none() { &mut self.nodes } else { &mut self.forms };
        known.insert(node.id(), at);
        at
    }

    fn step(&mut self, node: &Rc<Node>, form: Option<&Vec<(Rc<Node>, f64)>>) -> SealedStep {
        let inputs: Vec<(Rc<Node>, f64)> = form.cloned().unwrap_or_else(|| node.inputs().to_vec());
        let made = match (node.origin(), form) {
            (Origin::Input(input), _) => Made::Input(Box::new(sealed_input(input))),
            (_, Some(_)) => {
                let steps = history(node).iter().filter(|node| node.input().is_none()).count();
                Made::Folded { steps: steps.to_string(), at_least: false, linear: false }
            }
            (Origin::Operator(operator), None) => {
                let (operator, by) = operator_words(*operator);
                Made::Arithmetic { operator: operator.to_owned(), by: by.map(shortest) }
            }
            (Origin::Step(step), None) => match call_of(node) {
                Some(call) => Made::Formula {
                    card: call.card.id.to_owned(),
                    arguments: call.args.iter().map(|argument| self.argument(argument)).collect(),
                },
                None => Made::Formula { card: step.name().to_owned(), arguments: Vec::new() },
            },
            (Origin::Folded(folded), None) => {
                Made::Folded { steps: folded.steps.to_string(), at_least: folded.at_least, linear: folded.linear }
            }
        };
        let point = |(input, partial): &(Rc<Node>, f64)| (self.node(input, None).to_string(), shortest(*partial));
        SealedStep {
            made,
            si: shortest(node.si()),
            unit: node.dim().to_string(),
            inputs: inputs.iter().map(point).collect(),
            kind: sealed_kind(node.kind()),
            place: node.place().map(sealed_place),
            bound: node.bound().map(|entity| entity.name().to_owned()),
        }
    }

    fn argument(&mut self, value: &Value) -> Argument {
        match value {
            Value::Quantity(value) => Argument::Step(self.node(value.node(), None).to_string()),
            Value::Number(number) => Argument::Number(shortest(*number)),
            Value::Flag(flag) => Argument::Flag(*flag),
            Value::Text(text) => Argument::Text(text.to_string()),
            Value::List(list) => Argument::List(list.iter().map(|item| self.argument(item)).collect()),
            Value::Options(options) => {
                Argument::Options(options.iter().map(|(name, value)| (name.clone(), self.argument(value))).collect())
            }
            Value::Reaction(reaction) if of_tables(reaction) => Argument::Reaction(reaction.text().to_owned()),
            Value::Substance(substance) if of_tables(substance) => Argument::Substance(substance.text().to_owned()),
            Value::Table(table) => self.object((Rc::as_ptr(table) as usize, &table.name), (TABLE, None), |_| {
                let source =
                    table.source.as_ref().map_or(Argument::Nothing, |source| Argument::Text(source.to_string()));
                vec![Argument::Text(table.name.to_string()), source]
            }),
            Value::Nothing => Argument::Nothing,
            other => match (origin_of(other), thing(other)) {
                (Some(origin), Some(thing)) => {
                    let call = origin.call();
                    self.object(thing, (call.card.id, origin.part()), |skeleton| {
                        call.args.iter().map(|argument| skeleton.argument(argument)).collect()
                    })
                }
                _ => Argument::Other(other.sort().to_owned()),
            },
        }
    }

    /// The thing at an address, entered once.
    fn object(
        &mut self,
        (address, words): (usize, &str),
        (card, part): (&str, Option<&str>),
        arguments: impl FnOnce(&mut Self) -> Vec<Argument>,
    ) -> Argument {
        let at = match self.places.get(&address) {
            Some(at) => *at,
            None => {
                let arguments = arguments(self);
                let part = part.map(str::to_owned);
                self.objects.push(SealedObject { card: card.to_owned(), arguments, part });
                self.places.insert(address, self.objects.len() - 1);
                self.objects.len() - 1
            }
        };
        Argument::Object { at: at.to_string(), words: words.to_owned() }
    }
}

/// Whether tables answer for all of it.
fn of_tables(terms: &Terms) -> bool {
    terms.terms().iter().all(|term| term.own.is_none())
}

/// Where a thing lies, and its name.
fn thing(value: &Value) -> Option<(usize, &str)> {
    Some(match value {
        Value::Reaction(one) => (Rc::as_ptr(one) as usize, one.text()),
        Value::Substance(one) => (Rc::as_ptr(one) as usize, one.text()),
        Value::Molecule(one) => (Rc::as_ptr(one) as usize, one.text()),
        Value::Crystal(one) => (Rc::as_ptr(one) as usize, one.text()),
        Value::Stream(one) => (Rc::as_ptr(one) as usize, &one.name),
        _ => return None,
    })
}

impl Kept {
    fn of(history: &[Rc<Node>]) -> Kept {
        let all = || history.iter().map(|node| node.id()).collect();
        if history.len() <= MOST {
            return Kept { nodes: all(), forms: BTreeMap::new() };
        }
        let mut last = MOST / 2;
        loop {
            let kept = Kept::last(history, last);
            if last <= 1 || kept.nodes.len() <= MOST {
                return kept;
            }
            last /= 4;
        }
    }

    /// Keeps that many steps, counted from the value back; the very last one becomes a form itself where none is left.
    fn last(history: &[Rc<Node>], steps: usize) -> Kept {
        let by_id: BTreeMap<u64, &Rc<Node>> = history.iter().map(|node| (node.id(), node)).collect();
        let whole: Vec<&Rc<Node>> = history
            .iter()
            .rev()
            .filter(|node| node.input().is_none())
            .take(if steps > 1 { steps } else { 0 })
            .collect();
        let mut nodes: BTreeSet<u64> = whole.iter().map(|node| node.id()).collect();
        let mut edge: BTreeSet<u64> = BTreeSet::new();
        for node in &whole {
            let arguments = node.step().map(|step| step.arguments()).unwrap_or_default();
            let used = node.inputs().iter().map(|(input, _)| input.id()).chain(arguments.iter().map(|node| node.id()));
            edge.extend(used.filter(|id| !nodes.contains(id)));
        }
        if whole.is_empty() {
            edge.extend(history.last().map(|node| node.id()));
        }
        let mut forms = BTreeMap::new();
        for id in edge {
            let Some(node) = by_id.get(&id) else { continue };
            nodes.insert(id);
            if node.input().is_none() {
                let form = linear_form(node);
                nodes.extend(form.iter().map(|(input, _)| input.id()));
                forms.insert(id, form);
            }
        }
        Kept { nodes, forms }
    }
}

/// The inputs under a node with its derivatives: the weightiest, where there are more than a seal keeps.
fn linear_form(node: &Rc<Node>) -> Vec<(Rc<Node>, f64)> {
    let derivatives = derivatives(node);
    let mut form: Vec<(Rc<Node>, f64)> = (history(node).into_iter())
        .filter(|node| node.input().is_some())
        .filter_map(|node| derivatives.get(&node.id()).map(|partial| (Rc::clone(&node), *partial)))
        .collect();
    if form.len() > MOST {
        let weight = |(node, partial): &(Rc<Node>, f64)| {
            let u = node.input().and_then(|input| input.u).unwrap_or(0.0);
            (partial * u).abs()
        };
        form.sort_by(|a, b| weight(b).total_cmp(&weight(a)).then(a.0.id().cmp(&b.0.id())));
        form.truncate(MOST - 1);
        form.sort_by_key(|(node, _)| node.id());
    }
    form
}

fn sealed_place(place: &Place) -> SealedPlace {
    SealedPlace(place.cell.to_string(), place.line.to_string(), place.column.to_string())
}

fn sealed_input(input: &Input) -> SealedInput {
    let of = match &input.key {
        LeafKey::Datum { dataset, record, field, t_bits, way } => InputOf::Datum {
            dataset: dataset.to_string(),
            record: record.to_string(),
            field: (*field).to_owned(),
            t: (*t_bits != 0).then(|| shortest(f64::from_bits(*t_bits))),
            way: (*way).to_owned(),
        },
        LeafKey::Constant { year, name } => InputOf::Constant { year: year.to_string(), name: (*name).to_owned() },
        LeafKey::Typed { ordinal, .. } => InputOf::Typed { ordinal: ordinal.to_string() },
        LeafKey::Repeated { first, count, .. } => {
            InputOf::Repeated { first: first.to_string(), count: count.to_string() }
        }
        LeafKey::Own(name) => InputOf::Own { name: name.to_string() },
    };
    let evaluation = input.evaluation();
    SealedInput {
        of,
        u: input.u.map(shortest),
        label: input.label.as_ref().map(ToString::to_string),
        digit: input.digit.map(shortest),
        dof: evaluation.dof.map(shortest),
        shape: (evaluation.shape != Shape::Normal).then(|| evaluation.shape.word().to_owned()),
        correlated: evaluation.correlation.is_some(),
    }
}

/// The sort of a quantity, as a seal keeps it.
pub fn sealed_kind(kind: &Kind) -> SealedKind {
    let zero = |zero: &Zero| match zero {
        Zero::Elements298 => SealedZero::Elements298,
        Zero::ElementsAtT => SealedZero::ElementsAtT,
        Zero::Elements0 => SealedZero::Elements0,
        Zero::From(t_k) => SealedZero::From(shortest(*t_k)),
        Zero::Named(name) => SealedZero::Named(name.to_string()),
    };
    SealedKind {
        what: kind_word(kind.what).to_owned(),
        state: kind.state().map(|state| SealedState {
            zero: state.zero.as_ref().map(zero),
            t: state.t_k.map(shortest),
            p: state.p_pa.map(shortest),
            standard: state.standard,
            reaction: state.reaction,
        }),
    }
}

/// Words for sorts of quantities, which a seal keeps.
const KINDS: [(What, &str); 16] = [
    (What::Plain, "plain"),
    (What::OpenTemperature, "kelvin"),
    (What::TemperaturePoint, "temperature point"),
    (What::TemperatureDifference, "temperature difference"),
    (What::U, "U"),
    (What::H, "H"),
    (What::A, "A"),
    (What::G, "G"),
    (What::S, "S"),
    (What::Cp, "Cp"),
    (What::Cv, "Cv"),
    (What::Heat, "heat"),
    (What::Work, "work"),
    (What::PV, "pV"),
    (What::TS, "TS"),
    (What::K, "K"),
];

pub fn kind_word(what: What) -> &'static str {
    KINDS.iter().find(|(known, _)| *known == what).map_or("plain", |(_, word)| word)
}

/// The sort of quantity that a word of a seal means.
pub fn what_of(word: &str) -> Option<What> {
    KINDS.iter().find(|(_, known)| *known == word).map(|(what, _)| *what)
}

/// An operator's word in a seal, and the bare number it works with.
fn operator_words(operator: Operator) -> (&'static str, Option<f64>) {
    match operator {
        Operator::Add => ("add", None),
        Operator::Subtract => ("subtract", None),
        Operator::Multiply => ("multiply", None),
        Operator::Divide => ("divide", None),
        Operator::Negate => ("negate", None),
        Operator::Scale(by) => ("scale", Some(by)),
        Operator::Shift(by) => ("shift", Some(by)),
        Operator::DivideBy(by) => ("divide-by", Some(by)),
        Operator::Reciprocal(by) => ("reciprocal", Some(by)),
        Operator::Power(by) => ("power", Some(by)),
        Operator::PowerOf => ("power-of", None),
        Operator::Exp => ("exp", None),
        Operator::Ln => ("ln", None),
        Operator::Sin => ("sin", None),
        Operator::Cos => ("cos", None),
        Operator::Tan => ("tan", None),
        Operator::Absolute => ("absolute", None),
        Operator::Condition => ("condition", None),
        Operator::Mean => ("mean", None),
    }
}

/// The operator that a word of a seal means.
pub fn operator_of(word: &str, by: Option<f64>) -> Option<Operator> {
    Some(match (word, by) {
        ("add", None) => Operator::Add,
        ("subtract", None) => Operator::Subtract,
        ("multiply", None) => Operator::Multiply,
        ("divide", None) => Operator::Divide,
        ("negate", None) => Operator::Negate,
        ("scale", Some(by)) => Operator::Scale(by),
        ("shift", Some(by)) => Operator::Shift(by),
        ("divide-by", Some(by)) => Operator::DivideBy(by),
        ("reciprocal", Some(by)) => Operator::Reciprocal(by),
        ("power", Some(by)) => Operator::Power(by),
        ("power-of", None) => Operator::PowerOf,
        ("exp", None) => Operator::Exp,
        ("ln", None) => Operator::Ln,
        ("sin", None) => Operator::Sin,
        ("cos", None) => Operator::Cos,
        ("tan", None) => Operator::Tan,
        ("absolute", None) => Operator::Absolute,
        ("condition", None) => Operator::Condition,
        ("mean", None) => Operator::Mean,
        _ => return None,
    })
}
