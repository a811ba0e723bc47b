//! An amount, or a flow of it, as a linear form over the nodes it was computed from.
//!
//! What leaves a reactor is what was fed plus ν ξ, so that one input stands in many amounts. Kept as a form and not as a
//! node for each amount, it reaches the result as one input with one derivative.

use std::collections::BTreeMap;
use std::rc::Rc;

use crate::quantity::Quantity;
use crate::record::node::Node;

/// Moles, or moles per second, with derivatives.
#[derive(Clone, Default)]
pub struct Amount {
    pub si: f64,
    pub of: Weights,
}

impl Amount {
    /// A value times a bare factor.
    pub fn scaled_value(value: &Quantity, factor: f64) -> Amount {
        let mut of = Weights::default();
        of.add(value.node(), factor);
        Amount { si: factor * value.si(), of }
    }

    /// The product, or with `over` the quotient, of two values.
    pub fn product(a: &Quantity, b: &Quantity, over: bool) -> Amount {
        let mut of = Weights::default();
        let (x, y) = (a.si(), b.si());
        if over {
            of.add(a.node(), 1.0 / y);
            of.add(b.node(), -x / (y * y));
        } else {
            of.add(a.node(), y);
            of.add(b.node(), x);
        }
        Amount { si: if over { x / y } else { x * y }, of }
    }

    pub fn add(&mut self, other: &Amount, times: f64) {
        self.si += times * other.si;
        self.of.add_all(&other.of, times);
    }

    #[must_use]
    pub fn times(&self, factor: f64) -> Amount {
        let mut made = Amount::default();
        made.add(self, factor);
        made
    }

    /// Times a value that is uncertain itself.
    #[must_use]
    pub fn times_value(&self, value: &Quantity) -> Amount {
        let mut made = self.times(value.si());
        made.of.add(value.node(), self.si);
        made
    }
}

/// Derivatives by node, each node once.
#[derive(Clone, Default)]
pub struct Weights {
    by_node: BTreeMap<u64, (Rc<Node>, f64)>,
}

impl Weights {
    pub fn add(&mut self, node: &Rc<Node>, weight: f64) {
        self.by_node.entry(node.id()).or_insert_with(|| (Rc::clone(node), 0.0)).1 += weight;
    }

    pub fn add_all(&mut self, other: &Weights, times: f64) {
        for (node, weight) in other.by_node.values() {
            self.add(node, times * weight);
        }
    }

    pub fn iter(&self) -> impl Iterator<Item = (&Rc<Node>, f64)> {
        self.by_node.values().map(|(node, weight)| (node, *weight))
    }

    pub fn nodes(&self) -> impl Iterator<Item = &Rc<Node>> {
        self.by_node.values().map(|(node, _)| node)
    }
}
