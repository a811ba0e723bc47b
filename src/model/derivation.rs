//! How a value came about: inputs with their values, and every step in the order of calculation.
//!
//! [`Derivation::of`] reads the graph behind a value; whatever a function of the analyst's did is in it through the
//! operators it used. A node that several steps use is one step. Long derivations are folded for readers by two rules:
//! - of more than [`LONGEST_RUN`] steps of arithmetic in a row, only the first and last [`ENDS_OF_RUN`] are shown;
//! - of more lines, and of more inputs, than asked for (60 if nothing is said), only the first and last are shown.
//!
//! What is left out is counted where it would stand, and keeps its numbers. The surprise: the graph itself has folded runs
//! of thousands of steps before anyone asks (`record/fold.rs`); such a run is one step here, with its own count.

use std::collections::{BTreeMap, BTreeSet};
use std::rc::Rc;

use thiserror::Error;

use crate::fault::{Explain, Place};
use crate::model::answer::Answer;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Sources, Takes, Value, call_of};
use crate::model::symbols::{self, Formula};
use crate::model::{caution, check_line};
use crate::quantity::Quantity;
use crate::record::fold::Folded;
use crate::record::node::{self, LeafKey, Node, Operator, Origin};
use crate::source::Citation;
use crate::units;

/// The longest run of arithmetic that is shown whole.
pub const LONGEST_RUN: usize = 12;
/// How much is shown of a longer one, at each end.
pub const ENDS_OF_RUN: usize = 4;

const LINES: f64 = 60.0;
/// Below this nothing is left to read, and above nobody reads it.
const LEAST: f64 = 2.0;
const MOST: f64 = 10_000.0;

/// Why a history is not shown.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum DerivationError {
    #[error("a derivation of at most {most} lines is not shown: from {LEAST} to {MOST} lines are")]
    Lines { most: f64 },
}

impl Explain for DerivationError {
    fn code(&self) -> &'static str {
        "derivation-lines"
    }

    fn hint(&self) -> String {
        format!("leave the number out for {LINES} lines; what is folded is counted")
    }
}

/// A value's history, for readers.
pub struct Derivation {
    pub value: Quantity,
    pub inputs: Vec<InputRow>,
    /// Inputs that are not shown.
    pub inputs_hidden: usize,
    pub lines: Vec<Line>,
    /// As a report of the same value numbers them, from 1.
    pub sources: Vec<Citation>,
    pub cautions: Vec<String>,
}

/// An input with its value.
pub struct InputRow {
    /// From 1, as `i1`.
    pub number: usize,
    pub name: String,
    /// With unit; empty where the name is the text as typed.
    pub value: String,
    pub place: Option<String>,
    pub source: Option<usize>,
}

pub enum Line {
    Step(Step),
    Hidden(Hidden),
}

/// Steps that are not shown.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Hidden {
    pub first: usize,
    pub last: usize,
    /// How many of them are calls of formulas.
    pub formulas: usize,
}

/// One step.
pub struct Step {
    pub number: usize,
    pub made: Made,
    /// The figures of the step, `2 × (-37.5) = -75`; empty for what has none.
    pub figures: String,
    /// With unit and uncertainty.
    pub value: String,
    pub place: Option<String>,
    /// What an open mole was taken for.
    pub taken_for: Option<String>,
}

pub enum Made {
    Formula(Box<Applied>),
    /// The operation on inputs and earlier steps, by their numbers.
    Arithmetic(String),
    Folded {
        folded: Folded,
        from: String,
    },
}

/// A formula with what it was applied to.
pub struct Applied {
    /// `enthalpy of CO(g) + H2O(g) -> CO2(g) + H2(g), T = i9`
    pub title: String,
    pub card: &'static Card,
    /// The equation, where the card has one.
    pub formula: Option<&'static Formula>,
    /// The step that shows the same formula's symbols, if an earlier one does.
    pub symbols_at: Option<usize>,
    /// Inputs and earlier steps that carry on into the value.
    pub from: String,
    /// Number of the formula's own source.
    pub source: usize,
}

/// Inputs and steps by their nodes.
struct Numbers {
    inputs: BTreeMap<LeafKey, usize>,
    steps: BTreeMap<u64, usize>,
}

impl Numbers {
    /// `i3` or `step 2`.
    fn name(&self, node: &Rc<Node>) -> String {
        let node = through_condition(node);
        match node.input() {
            Some(input) => {
                self.inputs.get(&input.key).map_or_else(|| "an input".to_owned(), |number| format!("i{number}"))
            }
            None => self.steps.get(&node.id()).map_or_else(|| "a step".to_owned(), |number| format!("step {number}")),
        }
    }

    /// `i1 to i8, step 2`: neighbours joined, in order.
    fn names<'a>(&self, nodes: impl Iterator<Item = &'a Rc<Node>>) -> String {
        let (mut inputs, mut steps) = (BTreeSet::new(), BTreeSet::new());
        for node in nodes.map(through_condition) {
            match node.input() {
                Some(input) => inputs.extend(self.inputs.get(&input.key).copied()),
                None => steps.extend(self.steps.get(&node.id()).copied()),
            }
        }
        let mut parts = ranges(&inputs, "i");
        parts.extend(ranges(&steps, "step "));
        parts.join(", ")
    }
}

/// A chosen temperature on its way into a formula is no step to be read about: it stands for the temperature itself.
fn is_condition(node: &Rc<Node>) -> bool {
    matches!(node.origin(), Origin::Operator(Operator::Condition))
}

fn through_condition(node: &Rc<Node>) -> &Rc<Node> {
    if is_condition(node) { &node.inputs()[0].0 } else { node }
}

fn ranges(numbers: &BTreeSet<usize>, before: &str) -> Vec<String> {
    let mut spans: Vec<(usize, usize)> = Vec::new();
    for &number in numbers {
        match spans.last_mut() {
            Some((_, last)) if *last + 1 == number => *last = number,
            _ => spans.push((number, number)),
        }
    }
    let words = |(first, last): (usize, usize)| match last - first {
        0 => format!("{before}{first}"),
        1 => format!("{before}{first}, {before}{last}"),
        _ => format!("{before}{first} to {before}{last}"),
    };
    spans.into_iter().map(words).collect()
}

impl Derivation {
    /// The history of a value, of which at most `most` lines and inputs are shown.
    pub fn of(cx: &Cx, value: &Quantity, most: usize) -> Derivation {
        let history = node::history(value.node());
        let mut sources = Sources::default();
        // In the order of a report, so that its numbers serve here too.
        check_line::check_line(cx, value, &mut sources);
        for citation in history.iter().filter_map(|node| node.input()?.citation.as_ref()) {
            sources.number(citation);
        }
        let is_step = |node: &&Rc<Node>| node.input().is_none() && !is_condition(node);
        let steps: Vec<&Rc<Node>> = history.iter().filter(is_step).collect();
        let leaves = leaves(&steps, value.node());
        let numbers = Numbers {
            inputs: (1..).zip(&leaves).filter_map(|(n, leaf)| Some((leaf.input()?.key.clone(), n))).collect(),
            steps: (1..).zip(&steps).map(|(n, step)| (step.id(), n)).collect(),
        };
        for step in steps.iter().filter_map(|node| node.step()) {
            sources.number(&Citation::new(step.source(), ""));
        }
        let shown = if leaves.len() > most { most.max(1) } else { leaves.len() };
        let inputs = (1..).zip(&leaves[..shown]).map(|(number, leaf)| input_row(number, leaf, &mut sources)).collect();
        let lines = lines(cx, &steps, most, &numbers, &mut sources);
        let inputs_hidden = leaves.len() - shown;
        let cautions = caution::texts(value);
        Derivation { value: value.clone(), inputs, inputs_hidden, lines, sources: sources.list().to_vec(), cautions }
    }

    pub(super) fn parts(&self) -> Vec<(&'static str, Value)> {
        let last = self.lines.iter().next_back().map_or(0, |line| match line {
            Line::Step(step) => step.number,
            Line::Hidden(hidden) => hidden.last,
        });
        vec![("steps", Value::Number(last as f64)), ("hidden", Value::Number(self.hidden() as f64))]
    }

    /// Steps that are not shown.
    pub fn hidden(&self) -> usize {
        let count = |line: &Line| if let Line::Hidden(hidden) = line { hidden.last + 1 - hidden.first } else { 0 };
        self.lines.iter().map(count).sum()
    }
}

/// Inputs in the order in which the calculation takes them, each once.
fn leaves(steps: &[&Rc<Node>], value: &Rc<Node>) -> Vec<Rc<Node>> {
    let (mut known, mut leaves) = (BTreeSet::new(), Vec::new());
    let mut enter = |node: &Rc<Node>| {
        if let Some(input) = node.input()
            && known.insert(input.key.clone())
        {
            leaves.push(Rc::clone(node));
        }
    };
    for step in steps {
        step.inputs().iter().for_each(|(input, _)| enter(through_condition(input)));
        if let Some(call) = step.step() {
            call.arguments().iter().for_each(&mut enter);
        }
    }
    enter(value);
    leaves
}

fn input_row(number: usize, leaf: &Rc<Node>, sources: &mut Sources) -> InputRow {
    let value = Quantity::of_node(Rc::clone(leaf));
    let source = leaf.input().and_then(|input| input.citation.as_ref()).map(|citation| sources.number(citation));
    let (name, typed) = match leaf.input() {
        Some(input) => (input.name(), matches!(input.key, LeafKey::Typed { .. } | LeafKey::Repeated { .. })),
        None => (String::new(), false),
    };
    let value = if typed { String::new() } else { shown(&value) };
    InputRow { number, name, value, place: leaf.place().map(place_words), source }
}

/// Number with uncertainty, and unit as readers see it.
fn shown(value: &Quantity) -> String {
    let shown = value.shown();
    let unit = units::reader_text(&shown.unit);
    if unit.is_empty() { shown.number } else { format!("{} {unit}", shown.number) }
}

/// A derivation points at lines; columns are for faults.
fn place_words(place: &Place) -> String {
    Place { column: 0, ..place.clone() }.to_string()
}

fn lines(cx: &Cx, steps: &[&Rc<Node>], most: usize, numbers: &Numbers, sources: &mut Sources) -> Vec<Line> {
    let mut lines: Vec<Line> = Vec::new();
    let mut symbols_at: BTreeMap<&'static str, usize> = BTreeMap::new();
    for (at, (node, visible)) in steps.iter().zip(visible(steps, most)).enumerate() {
        if visible {
            lines.push(Line::Step(step(cx, at + 1, node, numbers, sources, &mut symbols_at)));
            continue;
        }
        let formulas = usize::from(node.step().is_some());
        match lines.last_mut() {
            Some(Line::Hidden(hidden)) => {
                hidden.last = at + 1;
                hidden.formulas += formulas;
            }
            _ => lines.push(Line::Hidden(Hidden { first: at + 1, last: at + 1, formulas })),
        }
    }
    lines
}

/// Which steps are shown, by the two rules of this file.
fn visible(steps: &[&Rc<Node>], most: usize) -> Vec<bool> {
    let mut visible = vec![true; steps.len()];
    let is_arithmetic = |node: &Rc<Node>| matches!(node.origin(), Origin::Operator(_));
    let mut start = 0;
    while start < steps.len() {
        let run = steps[start..].iter().take_while(|node| is_arithmetic(node)).count();
        if run > LONGEST_RUN {
            visible[start + ENDS_OF_RUN..start + run - ENDS_OF_RUN].fill(false);
        }
        start += run.max(1);
    }
    let shown: Vec<usize> = (0..steps.len()).filter(|&at| visible[at]).collect();
    if shown.len() > most {
        // The last step is the value itself, and is always shown.
        let last = most.div_ceil(2).max(1);
        shown[most - last.min(most)..shown.len() - last].iter().for_each(|&at| visible[at] = false);
    }
    visible
}

fn step(
    cx: &Cx,
    number: usize,
    node: &Rc<Node>,
    numbers: &Numbers,
    sources: &mut Sources,
    symbols_at: &mut BTreeMap<&'static str, usize>,
) -> Step {
    let inputs = || node.inputs().iter().map(|(input, _)| input);
    let made_here = Quantity::of_node(Rc::clone(node));
    let (made, figures) = match node.origin() {
        Origin::Operator(operator) => {
            let names: Vec<String> = inputs().map(|input| numbers.name(input)).collect();
            (Made::Arithmetic(check_line::arithmetic(operator, &names)), check_line::step_line(&made_here))
        }
        Origin::Folded(folded) => (Made::Folded { folded: **folded, from: numbers.names(inputs()) }, String::new()),
        Origin::Input(_) | Origin::Step(_) => {
            let figures = check_line::own_line(cx, node, sources).unwrap_or_else(|| check_line::step_line(&made_here));
            (formula(number, node, numbers, sources, symbols_at), figures)
        }
    };
    Step {
        number,
        made,
        figures,
        value: shown(&made_here),
        place: node.place().map(place_words),
        taken_for: node.bound().map(|entity| entity.name().to_owned()),
    }
}

fn formula(
    number: usize,
    node: &Rc<Node>,
    numbers: &Numbers,
    sources: &mut Sources,
    symbols_at: &mut BTreeMap<&'static str, usize>,
) -> Made {
    let from = numbers.names(node.inputs().iter().map(|(input, _)| input));
    let Some(call) = call_of(node) else {
        let words = node.step().map(|step| step.does()).unwrap_or_default();
        return Made::Arithmetic(words);
    };
    let card = call.card;
    let shown_at = *symbols_at.entry(card.id).or_insert(number);
    let source = sources.number(&Citation::new(card.source, ""));
    Made::Formula(Box::new(Applied {
        title: title(call, numbers),
        card,
        formula: symbols::of(card),
        symbols_at: (shown_at != number).then_some(shown_at),
        from,
        source,
    }))
}

/// The formula's name with its receiver and arguments: `per of step 1, species: CH4`.
fn title(call: &Call, numbers: &Numbers) -> String {
    let receivers = usize::from(call.card.on != On::Nothing);
    let mut words = call.card.name.replace('_', " ");
    for (at, value) in call.args.iter().enumerate() {
        let written = written(value, numbers);
        if written.is_empty() {
            continue;
        }
        match at.checked_sub(receivers).and_then(|at| call.card.args.get(at)) {
            None => words.push_str(&format!(" of {written}")),
            Some(Arg { takes: Takes::Options(_), .. }) => words.push_str(&format!(", {written}")),
            Some(arg) => words.push_str(&format!(", {} = {written}", arg.name)),
        }
    }
    words
}

fn written(value: &Value, numbers: &Numbers) -> String {
    match value {
        Value::Quantity(value) => format!("{} ({})", numbers.name(value.node()), shown(value)),
        Value::Number(number) => number.to_string(),
        Value::Flag(flag) => flag.to_string(),
        Value::Text(text) => text.to_string(),
        Value::Reaction(reaction) => reaction.text().to_owned(),
        Value::Substance(substance) => substance.text().to_owned(),
        Value::Stream(stream) => stream.name.to_string(),
        Value::Molecule(molecule) => molecule.text().to_owned(),
        Value::Crystal(crystal) => crystal.text().to_owned(),
        Value::Grid(grid) => grid.words(),
        Value::Curve(curve) => curve.words(),
        Value::Table(table) => table.name.to_string(),
        Value::List(list) => list.iter().map(|item| written(item, numbers)).collect::<Vec<_>>().join(", "),
        Value::Options(options) => {
            let option = |(name, value): (&String, &Value)| format!("{name}: {}", written(value, numbers));
            options.iter().map(option).collect::<Vec<_>>().join(", ")
        }
        Value::Answer(_) | Value::Other(_) | Value::Nothing => String::new(),
    }
}

pub static DERIVATION: Card = Card {
    id: "quantity.derivation",
    name: "derivation",
    on: On::Quantity,
    args: &[Arg {
        name: "most",
        takes: Takes::Number,
        default: Default::Number(LINES),
        doc: "how many steps and inputs are shown at most; longer derivations are folded in the middle",
    }],
    gives: "inputs and steps of the calculation, to be read",
    doc: "Shows how a value came about: each input with value, place and source, and each step in the order of calculation \
          with its formula, symbols, figures and place. Functions of your own are traced through the arithmetic they do. \
          Long runs are folded, and what is left out is counted.",
    source: "the value's own history",
    example: "reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\").enthalpy(\"450 degC\").derivation()",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let most = call.number(1);
        if !(LEAST..=MOST).contains(&most) {
            return Err(DerivationError::Lines { most }.into());
        }
        let derivation = Derivation::of(cx, call.quantity(0), most as usize);
        Ok(Value::Answer(Answer::Derivation(Rc::new(derivation))))
    },
    check_line: None,
    caution: None,
};
