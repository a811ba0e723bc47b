//! Standard uncertainty by linear propagation, with correlation (JCGM 100:2008, clause 5.1 and 5.2).
//!
//! A reverse sweep gives the derivative of a value with respect to each input; inputs with equal keys are one, so
//! `x - x` is 0 ± 0 and two results that rest on one figure cancel as they should. The surprise: an input without a
//! stated u is *silent*, not exact, and the result says so.

use std::cmp::Ordering;
use std::collections::binary_heap::PeekMut;
use std::collections::{BTreeMap, BinaryHeap};
use std::rc::Rc;

use crate::record::node::{Input, LeafKey, Node};

/// How a value depends on one input.
#[derive(Clone)]
pub struct Sensitivity {
    pub leaf: Rc<Node>,
    /// ∂(value)/∂(input), in SI units.
    pub derivative: f64,
}

impl Sensitivity {
    pub fn input(&self) -> Option<&Input> {
        self.leaf.input()
    }

    /// The share of the standard uncertainty that this input brings, signed: derivative times u.
    pub fn part(&self) -> Option<f64> {
        self.input().and_then(|input| input.u).map(|u| self.derivative * u)
    }
}

/// The standard uncertainty of a value, in SI units, and whether it covers all inputs.
#[derive(Clone, Debug, PartialEq)]
pub enum Spread {
    /// Every input states its uncertainty (or is exact).
    Full(f64),
    /// Some inputs state none; `u` is what the others give.
    Partial { u: f64, silent: Vec<LeafKey> },
    /// No input that matters states one.
    NotStated { silent: Vec<LeafKey> },
}

impl Spread {
    /// The standard uncertainty as far as it is known.
    pub fn u(&self) -> Option<f64> {
        match self {
            Spread::Full(u) | Spread::Partial { u, .. } => Some(*u),
            Spread::NotStated { .. } => None,
        }
    }

    pub fn silent(&self) -> &[LeafKey] {
        match self {
            Spread::Full(_) => &[],
            Spread::Partial { silent, .. } | Spread::NotStated { silent } => silent,
        }
    }
}

/// One user's share in the adjoint of a node. The largest is the node with the largest id, and of its shares the first.
struct Share<'a> {
    node: &'a Rc<Node>,
    nth: u64,
    adjoint: f64,
}

impl Ord for Share<'_> {
    fn cmp(&self, other: &Self) -> Ordering {
        // A fixed order of the shares makes their sum the same to the last bit.
        self.node.id().cmp(&other.node.id()).then(other.nth.cmp(&self.nth))
    }
}

impl PartialOrd for Share<'_> {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl PartialEq for Share<'_> {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other).is_eq()
    }
}

impl Eq for Share<'_> {}

/// Derivatives of `of` with respect to each input it rests on, in the order of the inputs' keys. Inputs that cancel
/// exactly are left out.
pub fn sensitivities(of: &Rc<Node>) -> Vec<Sensitivity> {
    let mut read: BTreeMap<u64, (&Rc<Node>, f64)> = BTreeMap::new();
    let mut pending = BinaryHeap::from([Share { node: of, nth: 0, adjoint: 1.0 }]);
    let mut count = 0;
    // The largest id first: all users of a node have larger ids, so every share of its adjoint is there when it comes.
    while let Some(Share { node, mut adjoint, .. }) = pending.pop() {
        while let Some(next) = pending.peek_mut().filter(|next| next.node.id() == node.id()) {
            adjoint += PeekMut::pop(next).adjoint;
        }
        if node.input().is_some() {
            read.entry(node.id()).or_insert((node, 0.0)).1 += adjoint;
        }
        for (input, partial) in node.inputs() {
            let share = adjoint * partial;
            // Inputs wait in no queue: a sum of many terms would fill it with shares of one and the same.
            if input.input().is_some() {
                read.entry(input.id()).or_insert((input, 0.0)).1 += share;
            } else {
                count += 1;
                pending.push(Share { node: input, nth: count, adjoint: share });
            }
        }
    }
    let mut leaves: BTreeMap<&LeafKey, Sensitivity> = BTreeMap::new();
    for (node, adjoint) in read.into_values().rev() {
        let Some(input) = node.input() else { continue };
        let leaf = leaves.entry(&input.key);
        leaf.or_insert_with(|| Sensitivity { leaf: Rc::clone(node), derivative: 0.0 }).derivative += adjoint;
    }
    leaves.into_values().filter(|leaf| leaf.derivative != 0.0).collect()
}

/// The derivative of `of` with respect to one node it rests on; 0 where it does not.
pub fn derivative(of: &Rc<Node>, with_respect_to: u64) -> f64 {
    let mut adjoints: BTreeMap<u64, (Rc<Node>, f64)> = BTreeMap::from([(of.id(), (Rc::clone(of), 1.0))]);
    while let Some((id, (node, adjoint))) = adjoints.pop_last() {
        if id <= with_respect_to {
            return if id == with_respect_to { adjoint } else { 0.0 };
        }
        for (input, partial) in node.inputs() {
            adjoints.entry(input.id()).or_insert_with(|| (Rc::clone(input), 0.0)).1 += adjoint * partial;
        }
    }
    0.0
}

/// The spread of a value.
pub fn spread(of: &Rc<Node>) -> Spread {
    let mut variance = 0.0;
    let mut silent = Vec::new();
    for leaf in sensitivities(of) {
        match leaf.part() {
            Some(part) => variance += part * part,
            None => silent.extend(leaf.input().map(|input| input.key.clone())),
        }
    }
    let u = f64::sqrt(variance);
    match silent.is_empty() {
        true => Spread::Full(u),
        false if u > 0.0 => Spread::Partial { u, silent },
        false => Spread::NotStated { silent },
    }
}

#[cfg(test)]
mod tests {
    use smallvec::{SmallVec, smallvec};

    use super::*;
    use crate::record::node::{Operator, Origin};
    use crate::units::{Dimension, Kind};

    fn leaf(name: &str, si: f64, u: Option<f64>) -> Rc<Node> {
        let input = Input { key: LeafKey::Own(name.into()), u, digit: None, label: None, citation: None };
        Rc::new(Node::new(si, Dimension::none(), Kind::PLAIN, SmallVec::new(), Origin::Input(Box::new(input)), None))
    }

    fn weighted(a: &Rc<Node>, by_a: f64, b: &Rc<Node>, by_b: f64) -> Rc<Node> {
        let inputs = smallvec![(Rc::clone(a), by_a), (Rc::clone(b), by_b)];
        let si = by_a * a.si() + by_b * b.si();
        Rc::new(Node::new(si, Dimension::none(), Kind::PLAIN, inputs, Origin::Operator(Operator::Add), None))
    }

    #[test]
    fn one_figure_read_twice_cancels_and_two_figures_add_in_quadrature() {
        let (x, x_again, y) = (leaf("x", 2.0, Some(0.3)), leaf("x", 2.0, Some(0.3)), leaf("y", 1.0, Some(0.4)));
        assert_eq!(spread(&weighted(&x, 1.0, &x_again, -1.0)), Spread::Full(0.0));
        assert_eq!(spread(&weighted(&x, 1.0, &y, 1.0)), Spread::Full(0.5));
    }

    #[test]
    fn shares_of_one_node_meet_before_they_go_on() {
        let (x, y) = (leaf("x", 2.0, Some(0.1)), leaf("y", 5.0, Some(0.2)));
        let a = weighted(&x, 2.0, &y, 1.0);
        let b = weighted(&a, 1.0, &a, 3.0);
        let c = weighted(&b, 1.0, &a, 0.5);
        let derivatives: Vec<f64> = sensitivities(&c).iter().map(|one| one.derivative).collect();
        assert_eq!(derivatives, [9.0, 4.5]);
        assert_eq!((derivative(&c, a.id()), derivative(&c, x.id())), (4.5, 9.0));
    }

    #[test]
    fn an_input_that_states_nothing_is_named_and_is_not_taken_for_exact() {
        let (x, y) = (leaf("x", 2.0, Some(0.3)), leaf("y", 1.0, None));
        let Spread::Partial { u, silent } = spread(&weighted(&x, 1.0, &y, 1.0)) else { panic!("y states no u") };
        assert_eq!((u, silent), (0.3, vec![LeafKey::Own("y".into())]));
        assert_eq!(spread(&y), Spread::NotStated { silent: vec![LeafKey::Own("y".into())] });
    }
}
