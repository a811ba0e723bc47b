//! The graph behind a value as a list of steps that can be run again with other inputs: what a Monte Carlo run needs.
//!
//! [`Tape::of`] keeps only what depends on an input with an uncertainty. Arithmetic is recomputed; a formula that cannot be
//! is taken by its recorded derivatives, an equilibrium constant by those of its logarithm, and [`Tape::by_derivatives`]
//! names them. The surprise: inputs of one group are drawn together as a normal distribution, whatever their degrees of
//! freedom, since that is what their covariances alone say (JCGM 101:2008, clause 6.4.8).

use std::collections::BTreeMap;
use std::collections::btree_map::Entry;
use std::rc::Rc;

use smallvec::SmallVec;

use crate::num::random::Generator;
use crate::num::{cholesky, math};
use crate::record::correlation::Correlation;
use crate::record::evaluation::Shape;
use crate::record::node::{Input, LeafKey, Node, Operator, Origin, Step};
use crate::record::spread;
use crate::units::What;

/// An input that is drawn.
pub struct Leaf {
    pub input: Input,
    u: f64,
    /// ∂(value)/∂(input)
    derivative: f64,
}

/// Correlated inputs: positions among the leaves, and the factor of their coefficients.
struct Group {
    members: Vec<usize>,
    factor: Vec<f64>,
}

/// One number of a step: it stays as it is, or is the result of an earlier step.
#[derive(Clone, Copy)]
enum Argument {
    Fixed(f64),
    Slot(usize),
}

type Arguments = SmallVec<[Argument; 2]>;

enum Slot {
    Leaf {
        leaf: usize,
        si: f64,
    },
    Operator {
        operator: Operator,
        arguments: Arguments,
    },
    Step {
        step: Rc<dyn Step>,
        arguments: Arguments,
    },
    /// si + Σ partial · (argument − its value): the slot, its partial, its value.
    Linear {
        si: f64,
        terms: Vec<(usize, f64, f64)>,
    },
    /// The same in the logarithm.
    Exponential {
        si: f64,
        terms: Vec<(usize, f64, f64)>,
    },
}

/// The steps of one value, in order.
pub struct Tape {
    leaves: Vec<Leaf>,
    groups: Vec<Group>,
    /// Leaves that belong to no group.
    alone: Vec<usize>,
    slots: Vec<Slot>,
    si: f64,
    by_derivatives: Vec<String>,
}

impl Tape {
    /// The steps of a value; `None` where no input with an uncertainty reaches it.
    pub fn of(value: &Rc<Node>) -> Option<Tape> {
        let derivatives: BTreeMap<LeafKey, f64> =
            spread::sensitivities(value).iter().filter_map(|one| Some((one.key()?.clone(), one.derivative))).collect();
        let mut tape = Tape {
            leaves: Vec::new(),
            groups: Vec::new(),
            alone: Vec::new(),
            slots: Vec::new(),
            si: value.si(),
            by_derivatives: Vec::new(),
        };
        let mut leaf_at: BTreeMap<LeafKey, usize> = BTreeMap::new();
        let mut slot_at: BTreeMap<u64, usize> = BTreeMap::new();
        for node in inputs_of(value) {
            let slot = match node.input() {
                Some(input) => {
                    let Some(u) = input.u.filter(|u| *u > 0.0) else { continue };
                    let leaf = *leaf_at.entry(input.key.clone()).or_insert_with(|| {
                        let derivative = derivatives.get(&input.key).copied().unwrap_or(0.0);
                        tape.leaves.push(Leaf { input: input.clone(), u, derivative });
                        tape.leaves.len() - 1
                    });
                    Slot::Leaf { leaf, si: node.si() }
                }
                None if node.inputs().iter().any(|(input, _)| slot_at.contains_key(&input.id())) => {
                    tape.step(&node, &slot_at)
                }
                None => continue,
            };
            slot_at.insert(node.id(), tape.slots.len());
            tape.slots.push(slot);
        }
        tape.group();
        slot_at.contains_key(&value.id()).then_some(tape)
    }

    fn step(&mut self, node: &Node, slot_at: &BTreeMap<u64, usize>) -> Slot {
        let arguments: Arguments = (node.inputs().iter())
            .map(|(input, _)| {
                slot_at.get(&input.id()).map_or(Argument::Fixed(input.si()), |slot| Argument::Slot(*slot))
            })
            .collect();
        let now: SmallVec<[f64; 4]> = node.inputs().iter().map(|(input, _)| input.si()).collect();
        match node.origin() {
            Origin::Operator(operator) => return Slot::Operator { operator: *operator, arguments },
            Origin::Step(step) if step.replay(&now).is_some() => {
                return Slot::Step { step: Rc::clone(step), arguments };
            }
            Origin::Step(step) => {
                let does = step.does();
                if !self.by_derivatives.contains(&does) {
                    self.by_derivatives.push(does);
                }
            }
            // A run of sums and bare factors is its own linear form.
            Origin::Folded(folded) if !folded.linear => {
                let run = "long runs of arithmetic".to_owned();
                if !self.by_derivatives.contains(&run) {
                    self.by_derivatives.push(run);
                }
            }
            _ => {}
        }
        let moving = node
            .inputs()
            .iter()
            .filter_map(|(input, partial)| slot_at.get(&input.id()).map(|slot| (*slot, *partial, input.si())));
        let si = node.si();
        if node.kind().what == What::K && si > 0.0 {
            return Slot::Exponential {
                si,
                terms: moving.map(|(slot, partial, at)| (slot, partial / si, at)).collect(),
            };
        }
        Slot::Linear { si, terms: moving.collect() }
    }

    /// Sorts the leaves into groups of correlated ones and those that stand alone.
    fn group(&mut self) {
        let correlation = |leaf: &Leaf| leaf.input.evaluation().correlation.clone();
        let mut known: Vec<(std::sync::Arc<Correlation>, Vec<usize>)> = Vec::new();
        for (at, leaf) in self.leaves.iter().enumerate() {
            match correlation(leaf) {
                None => self.alone.push(at),
                Some(group) => match known.iter_mut().find(|(other, _)| other.keys() == group.keys()) {
                    Some((_, members)) => members.push(at),
                    None => known.push((group, vec![at])),
                },
            }
        }
        for (group, members) in known {
            let n = members.len();
            let key = |at: usize| &self.leaves[members[at]].input.key;
            let r: Vec<f64> = (0..n * n).map(|at| group.between(key(at / n), key(at % n)).unwrap_or(0.0)).collect();
            let factor = cholesky::factor(&r, n)
                .unwrap_or_else(|| unreachable!("a part of a correlation matrix has no negative eigenvalue"));
            self.groups.push(Group { members, factor });
        }
    }

    /// The inputs that are drawn.
    pub fn leaves(&self) -> &[Leaf] {
        &self.leaves
    }

    /// Whether some of them are correlated.
    pub fn has_groups(&self) -> bool {
        !self.groups.is_empty()
    }

    /// How many numbers one run computes.
    pub fn len(&self) -> usize {
        self.slots.len()
    }

    pub fn is_empty(&self) -> bool {
        self.slots.is_empty()
    }

    /// Steps that are taken by their derivatives, in words.
    pub fn by_derivatives(&self) -> &[String] {
        &self.by_derivatives
    }

    /// Draws how far each input lies from its value.
    pub fn draw(&self, generator: &mut Generator, offsets: &mut Vec<f64>) {
        offsets.clear();
        offsets.resize(self.leaves.len(), 0.0);
        for &at in &self.alone {
            let leaf = &self.leaves[at];
            let evaluation = leaf.input.evaluation();
            let deviate = match (evaluation.shape, evaluation.dof) {
                (Shape::Normal, None) => generator.normal(),
                (Shape::Normal, Some(dof)) => generator.student(dof),
                (Shape::Rectangular, _) => generator.rectangular(),
                (Shape::Triangular, _) => generator.triangular(),
            };
            offsets[at] = leaf.u * deviate;
        }
        for Group { members, factor } in &self.groups {
            let n = members.len();
            let normal: SmallVec<[f64; 8]> = (0..n).map(|_| generator.normal()).collect();
            for (row, &at) in members.iter().enumerate() {
                let deviate: f64 = (0..=row).map(|column| factor[row * n + column] * normal[column]).sum();
                offsets[at] = self.leaves[at].u * deviate;
            }
        }
    }

    /// The value for inputs that lie off by `offsets`. `results` is room for the steps.
    pub fn run(&self, offsets: &[f64], results: &mut Vec<f64>) -> f64 {
        results.clear();
        for slot in &self.slots {
            let numbers = |arguments: &Arguments| -> SmallVec<[f64; 4]> {
                let number = |argument: &Argument| match *argument {
                    Argument::Fixed(si) => si,
                    Argument::Slot(slot) => results[slot],
                };
                arguments.iter().map(number).collect()
            };
            let moved = |terms: &[(usize, f64, f64)]| {
                terms.iter().map(|&(slot, partial, at)| partial * (results[slot] - at)).sum::<f64>()
            };
            let result = match slot {
                Slot::Leaf { leaf, si } => si + offsets[*leaf],
                Slot::Operator { operator, arguments } => operator.value(&numbers(arguments)),
                Slot::Step { step, arguments } => step.replay(&numbers(arguments)).unwrap_or(f64::NAN),
                Slot::Linear { si, terms } => si + moved(terms),
                Slot::Exponential { si, terms } => si * math::exp(moved(terms)),
            };
            results.push(result);
        }
        results.last().copied().unwrap_or(self.si)
    }

    /// The value for the same inputs by first derivatives.
    pub fn linear(&self, offsets: &[f64]) -> f64 {
        self.si + self.leaves.iter().zip(offsets).map(|(leaf, offset)| leaf.derivative * offset).sum::<f64>()
    }
}

/// Every node the value is computed from, itself last, inputs before their users.
fn inputs_of(value: &Rc<Node>) -> impl Iterator<Item = Rc<Node>> {
    let mut seen: BTreeMap<u64, Rc<Node>> = BTreeMap::new();
    let mut pending = vec![Rc::clone(value)];
    while let Some(node) = pending.pop() {
        if let Entry::Vacant(place) = seen.entry(node.id()) {
            pending.extend(node.inputs().iter().map(|(input, _)| Rc::clone(input)));
            place.insert(node);
        }
    }
    seen.into_values()
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use smallvec::smallvec;

    use super::*;
    use crate::record::evaluation::Evaluation;
    use crate::units::{Dimension, Kind};

    fn key(name: &str) -> LeafKey {
        LeafKey::Own(name.into())
    }

    fn leaf(name: &str, si: f64, u: Option<f64>, correlation: Option<Arc<Correlation>>) -> Rc<Node> {
        let input =
            Input { u, evaluated: Evaluation { correlation, ..Evaluation::UNSTATED }.kept(), ..Input::of(key(name)) };
        Rc::new(Node::new(si, Dimension::none(), Kind::PLAIN, SmallVec::new(), Origin::Input(Box::new(input)), None))
    }

    fn product(x: &Rc<Node>, y: &Rc<Node>) -> Rc<Node> {
        let inputs = smallvec![(Rc::clone(x), y.si()), (Rc::clone(y), x.si())];
        let si = x.si() * y.si();
        Rc::new(Node::new(si, Dimension::none(), Kind::PLAIN, inputs, Origin::Operator(Operator::Multiply), None))
    }

    #[test]
    fn arithmetic_runs_again_with_other_inputs_and_one_key_is_one_input() {
        let (x, x_again, y) =
            (leaf("x", 3.0, Some(0.1), None), leaf("x", 3.0, Some(0.1), None), leaf("y", 2.0, None, None));
        let value = product(&product(&x, &x_again), &y);
        let tape = Tape::of(&value).unwrap();
        assert_eq!(tape.leaves().len(), 1);
        let mut results = Vec::new();
        assert_eq!(tape.run(&[0.0], &mut results), 18.0);
        assert_eq!(tape.run(&[1.0], &mut results), 32.0);
        assert_eq!(tape.linear(&[1.0]), 30.0);
        assert!(Tape::of(&y).is_none());
    }

    #[test]
    fn inputs_of_one_group_are_drawn_with_their_coefficient() {
        let r = -0.8;
        let group = Arc::new(Correlation::new(vec![key("x"), key("y")], vec![1.0, r, r, 1.0]).unwrap());
        let (x, y) = (leaf("x", 3.0, Some(0.5), Some(Arc::clone(&group))), leaf("y", 2.0, Some(0.2), Some(group)));
        let tape = Tape::of(&product(&x, &y)).unwrap();
        let (mut generator, mut offsets, n) = (Generator::new(1), Vec::new(), 20_000);
        let (mut xx, mut yy, mut xy) = (0.0, 0.0, 0.0);
        for _ in 0..n {
            tape.draw(&mut generator, &mut offsets);
            let (x, y) = (offsets[0] / 0.5, offsets[1] / 0.2);
            (xx, yy, xy) = (xx + x * x, yy + y * y, xy + x * y);
        }
        // Four standard deviations of a sample coefficient, (1 − r²)/√n.
        let drawn = xy / f64::sqrt(xx * yy);
        assert!((drawn - r).abs() < 4.0 * (1.0 - r * r) / f64::from(n).sqrt(), "{drawn}");
    }

    #[test]
    fn an_equilibrium_constant_without_a_way_to_compute_it_again_stays_positive() {
        struct Sealed;
        impl Step for Sealed {
            fn name(&self) -> &'static str {
                "sealed"
            }

            fn take_arguments(&mut self) -> Vec<Rc<Node>> {
                Vec::new()
            }

            fn does(&self) -> String {
                "K(ln K)".to_owned()
            }
            fn source(&self) -> &str {
                "invented for this test"
            }
            fn arguments(&self) -> Vec<Rc<Node>> {
                Vec::new()
            }
            fn as_any(&self) -> &dyn std::any::Any {
                self
            }
        }
        let x = leaf("ln K", 2.0, Some(0.5), None);
        let k = math::exp(2.0);
        let inputs = smallvec![(Rc::clone(&x), k)];
        let step: Rc<dyn Step> = Rc::new(Sealed);
        let value = Rc::new(Node::new(k, Dimension::none(), Kind::of(What::K), inputs, Origin::Step(step), None));
        let tape = Tape::of(&value).unwrap();
        let moved = tape.run(&[-3.0], &mut Vec::new());
        assert!((moved / math::exp(-1.0) - 1.0).abs() < 1e-14, "{moved}");
        assert_eq!(tape.by_derivatives(), ["K(ln K)"]);
    }
}
