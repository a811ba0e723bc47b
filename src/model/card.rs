//! A formula as the program knows it, and the shared way of calling one.
//!
//! A [`Card`] declares name, receiver, arguments, claims and the function. [`call`] checks the arguments against it,
//! reads text where a quantity is wanted, fills in defaults and keeps the call as a step of the result. The surprise:
//! the result's node holds the card and its arguments, so that claims can be tested when someone looks, not before.

use std::any::Any;
use std::cell::{Cell, OnceCell};
use std::collections::BTreeMap;
use std::fmt;
use std::rc::Rc;
use std::sync::Arc;

use crate::data::catalog::Catalog;
use crate::fault::{Fault, Place};
use crate::model::answer::Answer;
use crate::model::argument::{ArgumentError, checked};
use crate::model::caution::Caution;
use crate::model::curve::Curve;
use crate::model::grid::Grid;
use crate::model::molecule::Molecule;
use crate::model::origin;
use crate::model::plant::stream::Stream;
use crate::model::reaction::Reaction;
use crate::model::solid::Crystal;
use crate::model::substance::PureSubstance;
use crate::model::table::Table;
use crate::model::terms::Terms;
use crate::quantity::{Quantity, text};
use crate::record::node::{Node, Step};
use crate::record::register::Finding;
use crate::source::Citation;
use crate::units::constants::ConstantSet;

/// A value that formulas take and give.
#[derive(Clone)]
pub enum Value {
    Quantity(Quantity),
    Number(f64),
    Flag(bool),
    Text(Rc<str>),
    List(Vec<Value>),
    Options(Rc<BTreeMap<String, Value>>),
    Reaction(Rc<Reaction>),
    Substance(Rc<PureSubstance>),
    Stream(Rc<Stream>),
    Molecule(Rc<Molecule>),
    Crystal(Rc<Crystal>),
    /// Temperatures at which a formula is asked in one call.
    Grid(Rc<Grid>),
    Curve(Rc<Curve>),
    /// Figures with units that were read from a file.
    Table(Rc<Table>),
    /// What was asked of an uncertainty.
    Answer(Answer),
    /// Something no formula takes, by its name in words.
    Other(Rc<str>),
    Nothing,
}

impl Value {
    /// The sort of value, in words for messages.
    pub fn sort(&self) -> &str {
        match self {
            Value::Quantity(_) => "a quantity",
            Value::Number(_) => "a number",
            Value::Flag(_) => "true or false",
            Value::Text(_) => "a text",
            Value::List(_) => "a list",
            Value::Options(_) => "a map of options",
            Value::Reaction(_) => "a reaction",
            Value::Substance(_) => "a substance",
            Value::Stream(_) => "a stream",
            Value::Molecule(_) => "a molecule",
            Value::Crystal(_) => "a crystal",
            Value::Grid(_) => "a grid of temperatures",
            Value::Curve(_) => "a curve",
            Value::Table(_) => "a table",
            Value::Answer(answer) => answer.sort(),
            Value::Other(name) => name,
            Value::Nothing => "nothing",
        }
    }
}

/// What a formula is asked of: `reaction.enthalpy(T)` is asked of a reaction, `reaction("...")` of nothing.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum On {
    Nothing,
    Quantity,
    Reaction,
    Substance,
    Molecule,
    Crystal,
    Curve,
    Table,
}

/// What an argument takes.
#[derive(Clone, Copy)]
pub enum Takes {
    /// A quantity of this unit's dimension.
    Quantity {
        unit: &'static str,
    },
    /// A quantity of any dimension.
    AnyQuantity,
    /// A temperature point: degC, degF or kelvin.
    Temperature,
    /// The same, or a grid of them: then the formula is asked at each, and gives a curve.
    Temperatures,
    Number,
    /// A bare number, or a quantity or text that is a pure number, such as "35 %".
    Fraction,
    Text,
    Word(&'static [&'static str]),
    Quantities,
    Reaction,
    /// A list of streams, or one alone.
    Streams,
    /// A list of maps, each with these entries.
    Maps(&'static [Arg]),
    Options(&'static [Arg]),
    /// A map from names to quantities of this unit's dimension.
    Named {
        unit: &'static str,
    },
    /// A map from names to maps of quantities, each by its own name.
    NamedMaps,
    /// Whatever it is; the formula looks for itself.
    Any,
}

/// What stands for an argument that was not given.
#[derive(Clone, Copy)]
pub enum Default {
    /// It must be given.
    Required,
    Number(f64),
    NoOptions,
    /// Nothing: the formula does without.
    Absent,
}

/// One argument.
pub struct Arg {
    pub name: &'static str,
    pub takes: Takes,
    pub default: Default,
    pub doc: &'static str,
}

/// An assumption a formula leans on, with its test. The test runs when a value is reported or shown, not at the call.
pub struct Claim {
    pub id: &'static str,
    pub test: fn(&Cx, &Call, &Quantity) -> Vec<Finding>,
}

/// What a shortcut *not* taken would have given, to be priced beside the value.
pub struct Alternative {
    pub id: &'static str,
    pub words: &'static str,
    /// `None` where the shortcut was taken, or does not apply.
    pub value: fn(&Cx, &Call, &Quantity) -> Option<f64>,
}

/// Writes the figures of a calculation, each with the number of its source.
pub type CheckLine = fn(&Cx, &Call, &Quantity, &mut Sources) -> String;

/// A formula.
pub struct Card {
    pub id: &'static str,
    /// Name in scripts.
    pub name: &'static str,
    pub on: On,
    pub args: &'static [Arg],
    pub gives: &'static str,
    pub doc: &'static str,
    pub source: &'static str,
    pub example: &'static str,
    pub claims: &'static [Claim],
    pub alternatives: &'static [Alternative],
    pub run: fn(&Cx, &Rc<Call>) -> Result<Value, Fault>,
    /// Figures of the calculation in the order a pocket calculator takes them.
    pub check_line: Option<CheckLine>,
    /// What must stand beside each value that rests on it, where a figure can hurt someone.
    pub caution: Option<Caution>,
}

/// What formulas look up: substances and constants. Substances are read at their first use, since a start of the program
/// that asks for none should not wait for them.
#[derive(Clone, Debug)]
pub struct References {
    catalog: OnceCell<Arc<Catalog>>,
    pub constants: &'static ConstantSet,
}

impl References {
    pub fn new(constants: &'static ConstantSet) -> Self {
        References { catalog: OnceCell::new(), constants }
    }

    /// Substances of another catalogue than the shipped one.
    pub fn of(catalog: Arc<Catalog>, constants: &'static ConstantSet) -> Self {
        References { catalog: OnceCell::from(catalog), constants }
    }

    pub fn catalog(&self) -> &Catalog {
        self.catalog.get_or_init(Catalog::shipped)
    }
}

/// What a call needs of its surroundings.
pub struct Cx<'a> {
    pub references: &'a References,
    pub place: Option<Place>,
    /// Counts evaluations in a cell, so that inputs typed in a loop are told apart.
    pub ordinal: &'a Cell<u64>,
    /// Why the work must end now, if it must: to be asked by every loop that may take longer than a millisecond.
    pub halted: &'a dyn Fn() -> Option<Fault>,
}

impl<'a> Cx<'a> {
    pub fn data(&self) -> &'a Catalog {
        self.references.catalog()
    }

    pub fn constants(&self) -> &'static ConstantSet {
        self.references.constants
    }

    pub fn next_ordinal(&self) -> u64 {
        let ordinal = self.ordinal.get();
        self.ordinal.set(ordinal + 1);
        ordinal
    }
}

/// Numbered sources of one report.
#[derive(Default)]
pub struct Sources {
    list: Vec<Citation>,
}

impl Sources {
    /// The number of a source, from 1; a new one is added at the end.
    pub fn number(&mut self, citation: &Citation) -> usize {
        match self.list.iter().position(|known| known == citation) {
            Some(at) => at + 1,
            None => {
                self.list.push(citation.clone());
                self.list.len()
            }
        }
    }

    pub fn list(&self) -> &[Citation] {
        &self.list
    }
}

/// A formula with the arguments it was called with, receiver first.
pub struct Call {
    pub card: &'static Card,
    pub args: Vec<Value>,
}

impl Call {
    pub fn quantity(&self, at: usize) -> &Quantity {
        match &self.args[at] {
            Value::Quantity(value) => value,
            other => unreachable!("{}: argument {at} was checked to be a quantity, not {}", self.card.id, other.sort()),
        }
    }

    /// What the receiver is made of, where it is a reaction or a substance.
    pub fn terms(&self) -> Option<&Terms> {
        match self.args.first() {
            Some(Value::Reaction(reaction)) => Some(reaction),
            Some(Value::Substance(substance)) => Some(substance),
            Some(Value::Molecule(molecule)) => Some(molecule.terms()),
            Some(Value::Crystal(crystal)) => Some(crystal.terms()),
            _ => None,
        }
    }

    pub fn text(&self, at: usize) -> &Rc<str> {
        match &self.args[at] {
            Value::Text(text) => text,
            other => unreachable!("{}: argument {at} was checked to be a text, not {}", self.card.id, other.sort()),
        }
    }

    pub fn number(&self, at: usize) -> f64 {
        match &self.args[at] {
            Value::Number(number) => *number,
            other => unreachable!("{}: argument {at} was checked to be a number, not {}", self.card.id, other.sort()),
        }
    }

    /// A word given in the option map, which is the last argument.
    pub fn option(&self, name: &str) -> Option<&Rc<str>> {
        let Some(Value::Options(options)) = self.args.last() else { return None };
        match options.get(name) {
            Some(Value::Text(word)) => Some(word),
            _ => None,
        }
    }

    /// What was given for an option, whatever it is.
    pub fn given(&self, name: &str) -> Option<&Value> {
        let Some(Value::Options(options)) = self.args.last() else { return None };
        options.get(name)
    }

    /// A quantity given in the option map.
    pub fn option_quantity(&self, name: &str) -> Option<&Quantity> {
        let Some(Value::Options(options)) = self.args.last() else { return None };
        match options.get(name) {
            Some(Value::Quantity(value)) => Some(value),
            _ => None,
        }
    }

    /// The same call without one of its options.
    #[must_use]
    pub fn without_option(mut self, name: &str) -> Call {
        if let Some(Value::Options(options)) = self.args.last_mut() {
            Rc::make_mut(options).remove(name);
        }
        self
    }

    /// The same call with one option set to another word.
    #[must_use]
    pub fn with_option(&self, name: &str, word: &str) -> Call {
        self.with_given(name, Value::Text(word.into()))
    }

    /// The same call with one option set to another value.
    #[must_use]
    pub fn with_given(&self, name: &str, value: Value) -> Call {
        let mut args = self.args.clone();
        if let Some(Value::Options(options)) = args.last_mut() {
            Rc::make_mut(options).insert(name.to_owned(), value);
        }
        Call { card: self.card, args }
    }
}

/// `pressure: 20 bar`, `partial: CO(g) 2 bar, H2(g) 5 bar`: options as they are told of in a step.
fn in_words(options: &BTreeMap<String, Value>) -> Vec<String> {
    let one = |(name, value): (&String, &Value)| match value {
        Value::Text(word) => Some(format!("{name}: {word}")),
        Value::Number(number) => Some(format!("{name}: {number}")),
        Value::Quantity(value) => Some(format!("{name}: {}", text::shown(value))),
        Value::List(list) => Some(format!("{name}: {} values", list.len())),
        Value::Options(inner) => Some(format!("{name}: {}", in_words(inner).join(", "))),
        _ => None,
    };
    options.iter().filter_map(one).collect()
}

/// Formulas that hand on the value of their one input as it is.
const KEEP_VALUE: [&str; 3] = ["quantity.assume", "uncertainty.readings", "uncertainty.tested"];

impl Step for Call {
    fn name(&self) -> &'static str {
        self.card.name
    }

    fn does(&self) -> String {
        let mut words: Vec<String> = Vec::new();
        for arg in &self.args {
            match arg {
                Value::Quantity(value) => words.push(text::shown(value)),
                Value::Text(word) => words.push(word.to_string()),
                Value::Number(number) => words.push(number.to_string()),
                Value::Reaction(reaction) => words.push(reaction.text().to_owned()),
                Value::Substance(substance) => words.push(substance.text().to_owned()),
                Value::Options(options) => words.extend(in_words(options)),
                Value::Stream(stream) => words.push(stream.name.to_string()),
                Value::Molecule(molecule) => words.push(molecule.text().to_owned()),
                Value::Crystal(crystal) => words.push(crystal.text().to_owned()),
                Value::Grid(grid) => words.push(grid.words()),
                Value::Curve(curve) => words.push(curve.words()),
                Value::Table(table) => words.push(table.name.to_string()),
                Value::List(list) => words.push(format!("{} values", list.len())),
                Value::Flag(_) | Value::Answer(_) | Value::Other(_) | Value::Nothing => {}
            }
        }
        format!("{}({})", self.card.name, words.join(", "))
    }

    fn source(&self) -> &str {
        self.card.source
    }

    fn arguments(&self) -> Vec<Rc<Node>> {
        fn collect(value: &Value, nodes: &mut Vec<Rc<Node>>) {
            match value {
                Value::Quantity(value) => nodes.push(Rc::clone(value.node())),
                Value::List(list) => list.iter().for_each(|item| collect(item, nodes)),
                Value::Stream(stream) => nodes.extend(stream.nodes()),
                Value::Options(options) => options.values().for_each(|item| collect(item, nodes)),
                _ => {}
            }
        }
        let mut nodes = Vec::new();
        self.args.iter().for_each(|arg| collect(arg, &mut nodes));
        nodes
    }

    fn replay(&self, inputs: &[f64]) -> Option<f64> {
        if KEEP_VALUE.contains(&self.card.id) { inputs.first().copied() } else { None }
    }

    fn take_arguments(&mut self) -> Vec<Rc<Node>> {
        let arguments = self.arguments();
        self.args.clear();
        arguments
    }

    fn as_any(&self) -> &dyn Any {
        self
    }
}

/// The call a node was made by, if a formula made it.
pub fn call_of(node: &Node) -> Option<&Call> {
    node.step().and_then(|step| step.as_any().downcast_ref::<Call>())
}

impl fmt::Debug for Card {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.id)
    }
}

impl Card {
    /// Arguments besides the receiver that must be given, and that may be.
    pub fn arity(&self) -> (usize, usize) {
        (self.args.iter().filter(|arg| matches!(arg.default, Default::Required)).count(), self.args.len())
    }

    /// How it is written: `enthalpy(T, options)`.
    pub fn signature(&self) -> String {
        let args: Vec<&str> = self.args.iter().map(|arg| arg.name).collect();
        let receiver = match self.on {
            On::Nothing => "",
            On::Quantity => "value.",
            On::Reaction => "reaction.",
            On::Substance => "substance.",
            On::Molecule => "molecule.",
            On::Crystal => "crystal.",
            On::Curve => "curve.",
            On::Table => "table.",
        };
        format!("{receiver}{}({})", self.name, args.join(", "))
    }
}

/// Calls a formula. `given` holds the receiver first, where there is one.
///
/// # Errors
/// An argument does not suit, or the formula refuses.
pub fn call(cx: &Cx, card: &'static Card, given: Vec<Value>) -> Result<Value, Fault> {
    let receivers = usize::from(card.on != On::Nothing);
    let (least, most) = card.arity();
    let mut given = given.into_iter();
    let mut args: Vec<Value> = given.by_ref().take(receivers).collect();
    let rest: Vec<Value> = given.collect();
    if rest.len() < least || rest.len() > most {
        let usage = card.example.to_owned();
        return Err(ArgumentError::Count { function: card.name, given: rest.len(), least, most, usage }.into());
    }
    let mut rest = rest.into_iter();
    for arg in card.args {
        let value = match (rest.next(), arg.default) {
            (Some(value), _) => value,
            (None, Default::NoOptions) => Value::Options(Rc::default()),
            (None, Default::Number(number)) => Value::Number(number),
            (None, Default::Absent) => Value::Nothing,
            (None, Default::Required) => unreachable!("arguments were counted"),
        };
        args.push(checked(cx, card, arg, value)?);
    }
    let at_a_grid = card
        .args
        .iter()
        .zip(&args[receivers..])
        .any(|pair| matches!(pair, (Arg { takes: Takes::Temperatures, .. }, Value::Grid(_))));
    let call = Rc::new(Call { card, args });
    if at_a_grid {
        return Ok(Value::Curve(Rc::new(Curve::of_call(cx, call)?)));
    }
    let mut given = (card.run)(cx, &call)?;
    origin::remember(&mut given, &call);
    Ok(given)
}

/// "`a`, `b` and `c`".
pub fn listed<'a>(words: impl IntoIterator<Item = &'a str>) -> String {
    let words: Vec<String> = words.into_iter().map(|word| format!("`{word}`")).collect();
    match words.split_last() {
        None => "none".to_owned(),
        Some((last, [])) => last.clone(),
        Some((last, rest)) => format!("{} and {last}", rest.join(", ")),
    }
}
