//! One value with its history: inputs with partial derivatives, and how it was made.
//!
//! Uncertainty, correlation, provenance and audit are four readings of this one graph. Leaves are told apart by
//! [`LeafKey`], never by pointer, so a figure read twice is one input. Two traps: ids grow, so the largest id is always
//! safe to process first in a reverse sweep; and dropping a long chain recursively would overflow the stack, so `Drop`
//! is a loop. Long runs of arithmetic are folded as they grow: see `fold.rs`.

use std::any::Any;
use std::cell::{Cell, OnceCell};
use std::collections::BTreeMap;
use std::rc::Rc;
use std::sync::Arc;

use smallvec::SmallVec;

use crate::fault::Place;
use crate::num::math;
use crate::record::evaluation::Evaluation;
use crate::record::fold::{self, Folded, Run};
use crate::source::Citation;
use crate::units::{Dimension, Entity, Kind, Unit};

/// Which input a leaf is. Equal keys are one input, wherever they were read.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum LeafKey {
    /// A figure of a published table. A function's value belongs to its temperature: `t_bits` holds the bits of T in
    /// kelvin, 0 for what does not depend on it. `way` says in words how it was taken from the function, where there are
    /// several ways: two ways are two figures, which must not cancel. Empty for what the record itself gives.
    Datum { dataset: Arc<str>, record: Arc<str>, field: &'static str, t_bits: u64, way: &'static str },
    /// A constant of the set of that year.
    Constant { year: u16, name: &'static str },
    /// Typed in a notebook: where, and which evaluation of that cell.
    Typed { place: Option<Place>, ordinal: u64 },
    /// The same text typed at the same place `count` times, as in a loop, without a stated uncertainty: taken together
    /// when the steps that used them were folded. `first` is the ordinal of the first.
    Repeated { place: Option<Place>, first: u64, count: u64 },
    /// Something an analyst's own step brings in, such as an assumption dealt with by widening.
    Own(Arc<str>),
}

/// An input: a figure that was not computed here.
#[derive(Clone, Debug)]
pub struct Input {
    pub key: LeafKey,
    /// Standard uncertainty in SI units; `None` where none is stated, which is not zero.
    pub u: Option<f64>,
    /// How u was evaluated, where more than u is stated; read it by [`Input::evaluation`].
    pub evaluated: Option<Box<Evaluation>>,
    /// SI value of one unit in the last digit printed or typed; `None` for what is exact or computed.
    pub digit: Option<f64>,
    /// The text as typed, or the analyst's name for it. A datum and a constant are named by their key.
    pub label: Option<Arc<str>>,
    /// The unit it was written in, for budgets; `None` for the trade's usual one.
    pub unit: Option<Arc<Unit>>,
    pub citation: Option<Citation>,
}

impl Input {
    /// An input of which nothing is known but which it is.
    pub fn of(key: LeafKey) -> Input {
        Input { key, u: None, evaluated: None, digit: None, label: None, unit: None, citation: None }
    }

    /// How u was evaluated, and what the input is correlated with.
    pub fn evaluation(&self) -> &Evaluation {
        Evaluation::of(self.evaluated.as_deref())
    }

    /// What the figure is, for budgets: `formation enthalpy of CO2(g)`.
    pub fn name(&self) -> String {
        match (&self.label, &self.key) {
            (Some(label), LeafKey::Repeated { count, .. }) => format!("{label}, typed {count} times"),
            (Some(label), _) => label.to_string(),
            (None, LeafKey::Datum { record, field, t_bits, way, .. }) => {
                // To a nanokelvin or so: the last bits of a mean of two temperatures are nobody's words.
                let t = (*t_bits != 0).then(|| (f64::from_bits(*t_bits) * 1e9).round() / 1e9);
                let t = t.map_or_else(String::new, |t_k| format!(" at {t_k} K"));
                let way = if way.is_empty() { String::new() } else { format!(", {way}") };
                format!("{field} of {record}{t}{way}")
            }
            (None, LeafKey::Constant { year, name }) => format!("{name} (CODATA {year})"),
            (None, LeafKey::Own(name)) => name.to_string(),
            (None, LeafKey::Typed { .. } | LeafKey::Repeated { .. }) => "a typed value".to_owned(),
        }
    }
}

/// A step of arithmetic.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Operator {
    Add,
    Subtract,
    Multiply,
    Divide,
    Negate,
    /// Times a bare number.
    Scale(f64),
    /// Plus a bare number (of dimension 1).
    Shift(f64),
    /// Divided by a bare number.
    DivideBy(f64),
    /// A bare number divided by the value.
    Reciprocal(f64),
    Power(f64),
    /// A pure number to the power of another.
    PowerOf,
    Exp,
    Ln,
    /// Of an angle in radian.
    Sin,
    Cos,
    Tan,
    Absolute,
    /// A temperature that was chosen, on its way into a formula: its value is what was meant, not what was measured.
    Condition,
    /// The weighted sum of all inputs, each with the same weight.
    Mean,
}

impl Operator {
    /// The value this step gives for these inputs.
    pub fn value(self, inputs: &[f64]) -> f64 {
        match (self, inputs) {
            (Operator::Add, [a, b]) => a + b,
            (Operator::Subtract, [a, b]) => a - b,
            (Operator::Multiply, [a, b]) => a * b,
            (Operator::Divide, [a, b]) => a / b,
            (Operator::Negate, [a]) => -a,
            (Operator::Scale(factor), [a]) => factor * a,
            (Operator::Shift(by), [a]) => a + by,
            (Operator::DivideBy(divisor), [a]) => a / divisor,
            (Operator::Reciprocal(numerator), [a]) => numerator / a,
            (Operator::Power(exponent), [a]) => math::pow(*a, exponent),
            (Operator::PowerOf, [a, b]) => math::pow(*a, *b),
            (Operator::Exp, [a]) => math::exp(*a),
            (Operator::Ln, [a]) => math::ln(*a),
            (Operator::Sin, [a]) => math::sin(*a),
            (Operator::Cos, [a]) => math::cos(*a),
            (Operator::Tan, [a]) => math::tan(*a),
            (Operator::Absolute, [a]) => a.abs(),
            (Operator::Condition, [a]) => *a,
            (Operator::Mean, all) => all.iter().sum::<f64>() / all.len() as f64,
            _ => unreachable!("an operator node is built with the inputs its operator takes"),
        }
    }
}

/// A call of a formula, as a node keeps it: enough to explain the step later and to test what it assumed.
pub trait Step: Any {
    /// The formula's name in scripts.
    fn name(&self) -> &'static str;
    /// What was done, in words: `ΔrH° of CO(g) + H2O(g) -> CO2(g) + H2(g)`.
    fn does(&self) -> String;
    /// Publication or definition the formula rests on.
    fn source(&self) -> &str;
    /// Values that went in as arguments. Those that carry uncertainty are inputs of the node as well.
    fn arguments(&self) -> Vec<Rc<Node>>;
    /// The value had the node's inputs been these instead; `None` where only its derivatives are known.
    fn replay(&self, _inputs: &[f64]) -> Option<f64> {
        None
    }
    /// Takes the arguments out, so that dropping a long chain of steps is a loop and no recursion.
    fn take_arguments(&mut self) -> Vec<Rc<Node>>;
    fn as_any(&self) -> &dyn Any;
}

/// How a node came to be.
#[derive(Clone)]
pub enum Origin {
    /// Boxed, since arithmetic makes many nodes and an input would double the size of each.
    Input(Box<Input>),
    Operator(Operator),
    Step(Rc<dyn Step>),
    /// A long run of arithmetic, as its linear form over what the run rested on. Boxed for the same reason.
    Folded(Box<Folded>),
}

/// A value in SI units with its history.
pub struct Node {
    id: u64,
    si: f64,
    dim: Dimension,
    kind: Kind,
    inputs: SmallVec<[(Rc<Node>, f64); 2]>,
    origin: Origin,
    place: Option<Place>,
    /// The entity that an open mole was taken for here, if one was.
    bound: Option<Entity>,
    run: Cell<Run>,
    /// How many times other nodes have this one as an input. Further handles on it are values that someone holds.
    users: Cell<u32>,
    /// This node with its run folded, once a later step wanted that.
    short: OnceCell<Rc<Node>>,
}

thread_local! {
    static NEXT_ID: Cell<u64> = const { Cell::new(0) };
}

fn next_id() -> u64 {
    NEXT_ID.with(|next| {
        let id = next.get();
        next.set(id + 1);
        id
    })
}

impl Node {
    /// `inputs` come with the partial derivative of the value in SI units with respect to each.
    // A node is large and is moved at every call on its way to its place, so these few are inlined.
    #[inline]
    pub fn new(
        si: f64,
        dim: Dimension,
        kind: Kind,
        mut inputs: SmallVec<[(Rc<Node>, f64); 2]>,
        origin: Origin,
        place: Option<Place>,
    ) -> Self {
        let id = next_id();
        let run = match origin {
            Origin::Operator(_) => fold::shorten(&mut inputs, id),
            _ => Run::NONE,
        };
        Node::with_id(id, si, dim, kind, inputs, origin, place, run)
    }

    /// The same value by another origin and other inputs. It keeps its id, so it is the same node to every reader.
    pub(super) fn remade(&self, origin: Origin, inputs: SmallVec<[(Rc<Node>, f64); 2]>, run: Run) -> Self {
        let (dim, kind, place) = (self.dim.clone(), self.kind.clone(), self.place.clone());
        Node::with_id(self.id, self.si, dim, kind, inputs, origin, place, run)
    }

    #[inline]
    #[expect(clippy::too_many_arguments, reason = "one private constructor, so that users are counted in one place")]
    fn with_id(
        id: u64,
        si: f64,
        dim: Dimension,
        kind: Kind,
        inputs: SmallVec<[(Rc<Node>, f64); 2]>,
        origin: Origin,
        place: Option<Place>,
        run: Run,
    ) -> Self {
        inputs.iter().for_each(|(input, _)| input.users.set(input.users.get() + 1));
        let (run, users, short) = (Cell::new(run), Cell::new(0), OnceCell::new());
        Node { id, si, dim, kind, inputs, origin, place, bound: None, run, users, short }
    }

    #[must_use]
    #[inline]
    pub fn with_bound(mut self, entity: Option<Entity>) -> Self {
        self.bound = entity;
        self
    }

    /// Grows with every node made on this thread, so an input's id is always smaller than its user's.
    pub fn id(&self) -> u64 {
        self.id
    }

    pub fn si(&self) -> f64 {
        self.si
    }

    pub fn dim(&self) -> &Dimension {
        &self.dim
    }

    pub fn kind(&self) -> &Kind {
        &self.kind
    }

    pub fn inputs(&self) -> &[(Rc<Node>, f64)] {
        &self.inputs
    }

    pub fn origin(&self) -> &Origin {
        &self.origin
    }

    pub fn place(&self) -> Option<&Place> {
        self.place.as_ref()
    }

    pub fn bound(&self) -> Option<Entity> {
        self.bound
    }

    pub(super) fn run(&self) -> &Cell<Run> {
        &self.run
    }

    pub(super) fn users(&self) -> u32 {
        self.users.get()
    }

    pub(super) fn short(&self) -> &OnceCell<Rc<Node>> {
        &self.short
    }

    pub fn input(&self) -> Option<&Input> {
        match &self.origin {
            Origin::Input(input) => Some(input),
            _ => None,
        }
    }

    pub fn step(&self) -> Option<&Rc<dyn Step>> {
        match &self.origin {
            Origin::Step(step) => Some(step),
            _ => None,
        }
    }
}

impl Node {
    /// Hands over every node that this one alone may hold, and lets go of the others.
    fn give_up(&mut self, to: &mut SmallVec<[Rc<Node>; 4]>) {
        while let Some((input, _)) = self.inputs.pop() {
            input.users.set(input.users.get() - 1);
            if Rc::strong_count(&input) == 1 {
                to.push(input);
            }
        }
        to.extend(self.short.take());
        if let Origin::Step(step) = &mut self.origin
            && let Some(step) = Rc::get_mut(step)
        {
            to.extend(step.take_arguments());
        }
    }
}

impl Drop for Node {
    fn drop(&mut self) {
        // In a chain of sums two wait here at a time, so that dropping it takes no memory.
        let mut pending = SmallVec::new();
        self.give_up(&mut pending);
        while let Some(mut node) = pending.pop() {
            // A node held both as input and as argument: the first goes without effect, the second ends it.
            if let Some(last_use) = Rc::get_mut(&mut node) {
                last_use.give_up(&mut pending);
            }
        }
    }
}

/// Every node the value rests on, itself last, each once, inputs before their users.
pub fn history(of: &Rc<Node>) -> Vec<Rc<Node>> {
    let mut seen = BTreeMap::new();
    let mut pending = vec![Rc::clone(of)];
    while let Some(node) = pending.pop() {
        if seen.contains_key(&node.id) {
            continue;
        }
        pending.extend(node.inputs.iter().map(|(input, _)| Rc::clone(input)));
        if let Origin::Step(step) = &node.origin {
            pending.extend(step.arguments());
        }
        seen.insert(node.id, node);
    }
    seen.into_values().collect()
}

/// The value of the last node of a history had some of its nodes been these instead, by id in SI units: recomputed where
/// every step between can be, else `None`, and the caller falls back on first derivatives.
pub fn replayed(history: &[Rc<Node>], changed: &BTreeMap<u64, f64>) -> Option<f64> {
    let mut values = changed.clone();
    for node in history {
        if values.contains_key(&node.id) || !node.inputs.iter().any(|(input, _)| values.contains_key(&input.id)) {
            continue;
        }
        let inputs: SmallVec<[f64; 4]> =
            node.inputs.iter().map(|(input, _)| values.get(&input.id).copied().unwrap_or(input.si)).collect();
        let value = match &node.origin {
            Origin::Operator(operator) => operator.value(&inputs),
            Origin::Step(step) => step.replay(&inputs)?,
            // A run of sums and bare factors is its own linear form, so nothing is lost.
            Origin::Folded(folded) if folded.linear => {
                let moved = inputs.iter().zip(&node.inputs).map(|(now, (input, partial))| partial * (now - input.si));
                node.si + moved.sum::<f64>()
            }
            Origin::Folded(_) => return None,
            Origin::Input(_) => unreachable!("an input has no inputs of its own"),
        };
        values.insert(node.id, value);
    }
    let last = history.last()?;
    Some(values.get(&last.id).copied().unwrap_or(last.si))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn leaf(si: f64) -> Rc<Node> {
        let input = Input { u: Some(0.1), ..Input::of(LeafKey::Own(format!("{si}").into())) };
        Rc::new(Node::new(si, Dimension::none(), Kind::PLAIN, SmallVec::new(), Origin::Input(Box::new(input)), None))
    }

    fn combine(operator: Operator, inputs: &[(&Rc<Node>, f64)]) -> Rc<Node> {
        let values: Vec<f64> = inputs.iter().map(|(node, _)| node.si()).collect();
        let inputs = inputs.iter().map(|(node, partial)| (Rc::clone(node), *partial)).collect();
        let si = operator.value(&values);
        Rc::new(Node::new(si, Dimension::none(), Kind::PLAIN, inputs, Origin::Operator(operator), None))
    }

    #[test]
    fn a_long_chain_drops_without_recursion() {
        // 2 MB of stack, as test threads have; recursive drop dies before 1e5 links (measured).
        let mut node = leaf(1.0);
        for _ in 0..300_000 {
            node = combine(Operator::Scale(1.0), &[(&node, 1.0)]);
        }
        drop(node);
    }

    #[test]
    fn replay_recomputes_through_arithmetic_where_the_derivative_would_not_do() {
        let x = leaf(3.0);
        let square = combine(Operator::Multiply, &[(&x, 3.0), (&x, 3.0)]);
        let y = combine(Operator::Shift(1.0), &[(&square, 1.0)]);
        let replay = |of: &Rc<Node>, id, si| replayed(&history(of), &BTreeMap::from([(id, si)]));
        assert_eq!(replay(&y, x.id(), 5.0), Some(26.0));
        assert_eq!(replay(&y, y.id(), 7.0), Some(7.0));
        assert_eq!(replay(&x, y.id(), 7.0), Some(3.0), "what is not rested on changes nothing");
    }
}
