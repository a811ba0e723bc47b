//! Effective degrees of freedom of a combined standard uncertainty (JCGM 100:2008, clause G.4.1).
//!
//! ν_eff = u⁴ / Σ (cᵢ uᵢ)⁴/νᵢ (Welch-Satterthwaite). The formula is derived for independent inputs; where two inputs are
//! correlated and state degrees of freedom, it says nothing, and neither does this.

use std::rc::Rc;

use crate::record::correlation;
use crate::record::node::Node;
use crate::record::spread;

/// How many degrees of freedom a combined uncertainty has.
#[derive(Clone, Debug, PartialEq)]
pub enum Freedom {
    /// No input that matters states any: infinitely many.
    Unlimited,
    Effective(f64),
    /// Two correlated inputs, by name, of which one states degrees of freedom: the formula does not apply.
    Correlated {
        a: String,
        b: String,
        r: f64,
    },
}

/// The effective degrees of freedom of a value.
pub fn of(value: &Rc<Node>) -> Freedom {
    let inputs = spread::sensitivities(value);
    let limits = |at: usize| inputs[at].input().is_some_and(|input| input.evaluation().dof.is_some());
    let name = |at: usize| inputs[at].input().map_or_else(String::new, |input| input.name());
    let matters = |at: usize| inputs[at].part().is_some_and(|part| part != 0.0);
    for pair in correlation::pairs(&inputs) {
        if matters(pair.a) && matters(pair.b) && (limits(pair.a) || limits(pair.b)) {
            return Freedom::Correlated { a: name(pair.a), b: name(pair.b), r: pair.r };
        }
    }
    let variance = correlation::variance(&inputs);
    let weighted = inputs.iter().filter_map(|one| {
        let (part, dof) = (one.part()?, one.input()?.evaluation().dof?);
        Some(part * part * (part * part) / dof)
    });
    let sum: f64 = weighted.sum();
    if sum > 0.0 { Freedom::Effective(variance * variance / sum) } else { Freedom::Unlimited }
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use smallvec::SmallVec;

    use super::*;
    use crate::record::correlation::Correlation;
    use crate::record::evaluation::Evaluation;
    use crate::record::node::{Input, LeafKey, Operator, Origin};
    use crate::units::{Dimension, Kind};

    fn key(name: &str) -> LeafKey {
        LeafKey::Own(name.into())
    }

    fn leaf(name: &str, u: f64, dof: Option<f64>, correlation: Option<&Arc<Correlation>>) -> Rc<Node> {
        let evaluation = Evaluation { dof, correlation: correlation.cloned(), ..Evaluation::UNSTATED };
        let input = Input { u: Some(u), evaluated: evaluation.kept(), ..Input::of(key(name)) };
        Rc::new(Node::new(0.0, Dimension::none(), Kind::PLAIN, SmallVec::new(), Origin::Input(Box::new(input)), None))
    }

    fn sum(leaves: &[Rc<Node>]) -> Rc<Node> {
        let inputs = leaves.iter().map(|leaf| (Rc::clone(leaf), 1.0)).collect();
        Rc::new(Node::new(0.0, Dimension::none(), Kind::PLAIN, inputs, Origin::Operator(Operator::Mean), None))
    }

    #[test]
    fn equal_parts_add_their_degrees_of_freedom_and_one_part_keeps_its_own() {
        // From the formula: n equal parts of ν each give n ν.
        let equal: Vec<_> = ["a", "b", "c"].iter().map(|name| leaf(name, 0.2, Some(4.0), None)).collect();
        let Freedom::Effective(dof) = of(&sum(&equal)) else { panic!("they are independent") };
        assert!((dof - 12.0).abs() < 1e-12);
        let one = [leaf("a", 0.2, Some(4.0), None), leaf("b", 0.0, Some(1.0), None)];
        let Freedom::Effective(dof) = of(&sum(&one)) else { panic!("they are independent") };
        assert!((dof - 4.0).abs() < 1e-12);
        assert_eq!(of(&sum(&[leaf("a", 0.2, None, None)])), Freedom::Unlimited);
    }

    #[test]
    fn correlated_inputs_with_degrees_of_freedom_are_named() {
        let group = Arc::new(Correlation::new(vec![key("a"), key("b")], vec![1.0, 0.5, 0.5, 1.0]).unwrap());
        let with = |dof| sum(&[leaf("a", 0.2, dof, Some(&group)), leaf("b", 0.1, None, Some(&group))]);
        assert_eq!(of(&with(Some(4.0))), Freedom::Correlated { a: "a".into(), b: "b".into(), r: 0.5 });
        assert_eq!(of(&with(None)), Freedom::Unlimited);
    }
}
