//! Standard uncertainty by linear propagation, with correlation (JCGM 100:2008, clause 5.1 and 5.2).
//!
//! A reverse sweep gives the derivative of a value with respect to each input; inputs with equal keys are one, so
//! `x - x` is 0 ± 0 and two results that rest on one figure cancel as they should. The surprise: an input without a
//! stated u is *silent*, not exact, and the result says so.

use std::cmp::Ordering;
use std::collections::binary_heap::PeekMut;
use std::collections::{BTreeMap, BinaryHeap};
use std::rc::Rc;

use crate::record::correlation;
use crate::record::node::{Input, LeafKey, Node, Operator, Origin};

/// How a value depends on one input.
#[derive(Clone)]
pub struct Sensitivity {
    pub leaf: Rc<Node>,
    /// ∂(value)/∂(input), in SI units.
    pub derivative: f64,
    /// Whether the input was chosen as a condition of some formula on the way, and so is not silent without an uncertainty.
    pub chosen: bool,
}

impl Sensitivity {
    pub fn input(&self) -> Option<&Input> {
        self.leaf.input()
    }

    pub fn key(&self) -> Option<&LeafKey> {
        self.input().map(|input| &input.key)
    }

    /// Whether the input states no uncertainty, and was not chosen either.
    pub fn is_silent(&self) -> bool {
        self.part().is_none() && !self.chosen
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

/// The correlation coefficient of two values, from the inputs they share and those that are correlated; `None` where one
/// of them has no uncertainty.
pub fn correlation_of(a: &Rc<Node>, b: &Rc<Node>) -> Option<f64> {
    let (a, b) = (sensitivities(a), sensitivities(b));
    let size = (correlation::variance(&a) * correlation::variance(&b)).sqrt();
    // Rounding may take a full correlation past 1 by a bit.
    (size > 0.0).then(|| (correlation::covariance(&a, &b) / size).clamp(-1.0, 1.0))
}

/// Derivatives of `of` with respect to each input it rests on, in the order of the inputs' keys. Inputs that cancel are left
/// out, also where rounding leaves a residue of them: less than 16 roundings of the sum of the sizes that cancelled.
pub fn sensitivities(of: &Rc<Node>) -> Vec<Sensitivity> {
    let mut pending = BinaryHeap::from([Share { reached: Reached::itself(of), nth: 0 }]);
    let mut read: BTreeMap<u64, Reached<'_>> = BTreeMap::new();
    let mut count = 0;
    // The largest id first: all users of a node have larger ids, so all its shares are there when it is taken out.
    while let Some(Share { mut reached, .. }) = pending.pop() {
        let node = reached.node;
        while let Some(next) = pending.peek_mut().filter(|next| next.reached.node.id() == node.id()) {
            reached.add(&PeekMut::pop(next).reached);
        }
        if node.input().is_some() {
            read.entry(node.id()).or_insert_with(|| Reached::not_yet(node)).add(&reached);
        }
        let chosen = matches!(node.origin(), Origin::Operator(Operator::Condition));
        for (input, partial) in node.inputs() {
            let (adjoint, size) = (reached.adjoint * partial, reached.size * partial.abs());
            let share = Reached { node: input, adjoint, size, chosen };
            // Inputs wait in no queue: a sum of many terms would fill it with shares of one and the same.
            if input.input().is_some() {
                read.entry(input.id()).or_insert_with(|| Reached::not_yet(input)).add(&share);
            } else {
                count += 1;
                pending.push(Share { reached: share, nth: count });
            }
        }
    }
    let mut leaves: BTreeMap<&LeafKey, (Sensitivity, f64)> = BTreeMap::new();
    for reached in read.into_values().rev() {
        let Some(input) = reached.node.input() else { continue };
        let empty = || (Sensitivity { leaf: Rc::clone(reached.node), derivative: 0.0, chosen: false }, 0.0);
        let entry = leaves.entry(&input.key).or_insert_with(empty);
        entry.0.derivative += reached.adjoint;
        entry.1 += reached.size;
        entry.0.chosen |= reached.chosen;
    }
    let is_left = |(leaf, size): &(Sensitivity, f64)| leaf.derivative.abs() > 16.0 * f64::EPSILON * size;
    leaves.into_values().filter(is_left).map(|(leaf, _)| leaf).collect()
}

/// A node on the way back from a value: its adjoint, and the sum of the sizes of what was added up to it.
struct Reached<'a> {
    node: &'a Rc<Node>,
    adjoint: f64,
    size: f64,
    chosen: bool,
}

impl<'a> Reached<'a> {
    fn itself(node: &'a Rc<Node>) -> Self {
        Reached { node, adjoint: 1.0, size: 1.0, chosen: false }
    }

    fn not_yet(node: &'a Rc<Node>) -> Self {
        Reached { node, adjoint: 0.0, size: 0.0, chosen: false }
    }

    fn add(&mut self, share: &Reached<'_>) {
        self.adjoint += share.adjoint;
        self.size += share.size;
        self.chosen |= share.chosen;
    }
}

/// What one user of a node adds to it. The largest is the node with the largest id, and of its shares the first.
struct Share<'a> {
    reached: Reached<'a>,
    nth: u64,
}

impl Ord for Share<'_> {
    fn cmp(&self, other: &Self) -> Ordering {
        // A fixed order of the shares makes their sum the same to the last bit.
        self.reached.node.id().cmp(&other.reached.node.id()).then(other.nth.cmp(&self.nth))
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

/// Derivatives of `of` with respect to every node it rests on, by id: one sweep where many are asked for.
pub fn derivatives(of: &Rc<Node>) -> BTreeMap<u64, f64> {
    let mut all = BTreeMap::new();
    let mut pending: BTreeMap<u64, Reached<'_>> = BTreeMap::from([(of.id(), Reached::itself(of))]);
    while let Some((id, reached)) = pending.pop_last() {
        all.insert(id, reached.adjoint);
        for (input, partial) in reached.node.inputs() {
            let entry = pending.entry(input.id()).or_insert_with(|| Reached::not_yet(input));
            entry.adjoint += reached.adjoint * partial;
        }
    }
    all
}

/// The root of the variance, by way of parts no larger than 1, since squares of large equilibrium constants overflow.
fn deviation(inputs: &[Sensitivity]) -> f64 {
    let largest = inputs.iter().filter_map(Sensitivity::part).fold(0.0, |largest, part| f64::max(largest, part.abs()));
    if !(largest > 0.0 && largest.is_finite()) {
        return largest;
    }
    let scaled: Vec<Sensitivity> = (inputs.iter())
        .map(|one| Sensitivity { leaf: Rc::clone(&one.leaf), derivative: one.derivative / largest, chosen: one.chosen })
        .collect();
    largest * correlation::variance(&scaled).sqrt()
}

/// The spread of a value.
pub fn spread(of: &Rc<Node>) -> Spread {
    let inputs = sensitivities(of);
    let silent: Vec<LeafKey> =
        inputs.iter().filter(|one| one.is_silent()).filter_map(|one| one.key().cloned()).collect();
    let u = deviation(&inputs);
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
        let input = Input { u, ..Input::of(LeafKey::Own(name.into())) };
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
        let by_input: Vec<f64> = sensitivities(&c).iter().map(|one| one.derivative).collect();
        assert_eq!(by_input, [9.0, 4.5]);
        let by_node = derivatives(&c);
        assert_eq!((by_node[&a.id()], by_node[&x.id()]), (4.5, 9.0));
    }

    #[test]
    fn an_input_that_states_nothing_is_named_and_is_not_taken_for_exact() {
        let (x, y) = (leaf("x", 2.0, Some(0.3)), leaf("y", 1.0, None));
        let Spread::Partial { u, silent } = spread(&weighted(&x, 1.0, &y, 1.0)) else { panic!("y states no u") };
        assert_eq!((u, silent), (0.3, vec![LeafKey::Own("y".into())]));
        assert_eq!(spread(&y), Spread::NotStated { silent: vec![LeafKey::Own("y".into())] });
    }
}
