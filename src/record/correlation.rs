//! Inputs that were determined together, and the covariance of what is computed from them (JCGM 100:2008, clause 5.2).
//!
//! A [`Correlation`] is shared by its inputs and names them by key, so there is no table of pairs beside the graph, and an
//! independent input carries none. Inputs of two groups, and inputs without one, are independent.

use thiserror::Error;

use crate::num::cholesky;
use crate::record::node::LeafKey;
use crate::record::spread::Sensitivity;

/// The correlation coefficients of a group of inputs.
#[derive(Debug, PartialEq)]
pub struct Correlation {
    keys: Vec<LeafKey>,
    /// Row by row. Invariant: symmetric, 1 on the diagonal, no negative eigenvalue.
    r: Vec<f64>,
}

/// Why numbers are no correlation coefficients of a group.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum CorrelationError {
    #[error("{count} inputs need {count} × {count} coefficients, not {given}")]
    Count { count: usize, given: usize },
    #[error("the coefficient of inputs {row} and {column} is {r} one way and {back} the other")]
    Asymmetric { row: usize, column: usize, r: f64, back: f64 },
    #[error(
        "the coefficient of inputs {row} and {column} is {r}, which is not from -1 to 1, or not 1 for one input with itself"
    )]
    Range { row: usize, column: usize, r: f64 },
    #[error(
        "no quantities can have these coefficients together: some of their combinations would have a negative variance"
    )]
    Impossible,
}

impl Correlation {
    /// `r` row by row, in the order of `keys`.
    ///
    /// # Errors
    /// The numbers cannot be correlation coefficients of these inputs.
    pub fn new(keys: Vec<LeafKey>, r: Vec<f64>) -> Result<Correlation, CorrelationError> {
        let n = keys.len();
        if r.len() != n * n {
            return Err(CorrelationError::Count { count: n, given: r.len() });
        }
        for (at, &one) in r.iter().enumerate() {
            let (row, column) = (at / n, at % n);
            let back = r[column * n + row];
            if one != back {
                return Err(CorrelationError::Asymmetric { row: row + 1, column: column + 1, r: one, back });
            }
            if !(-1.0..=1.0).contains(&one) || (row == column && one != 1.0) {
                return Err(CorrelationError::Range { row: row + 1, column: column + 1, r: one });
            }
        }
        cholesky::factor(&r, n).ok_or(CorrelationError::Impossible)?;
        Ok(Correlation { keys, r })
    }

    /// Inputs of the group.
    pub fn keys(&self) -> &[LeafKey] {
        &self.keys
    }

    /// The coefficient of two inputs; `None` unless both belong to the group.
    pub fn between(&self, a: &LeafKey, b: &LeafKey) -> Option<f64> {
        let at = |key: &LeafKey| self.keys.iter().position(|known| known == key);
        Some(self.r[at(a)? * self.keys.len() + at(b)?])
    }
}

/// A correlated pair of inputs in a value: positions among its sensitivities, the first smaller, and the coefficient.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pair {
    pub a: usize,
    pub b: usize,
    pub r: f64,
}

/// The pairs of inputs that state an uncertainty and are correlated, in the order of the inputs.
pub fn pairs(inputs: &[Sensitivity]) -> Vec<Pair> {
    let grouped: Vec<usize> = (0..inputs.len()).filter(|&at| group(&inputs[at]).is_some()).collect();
    let mut pairs = Vec::new();
    for (nth, &a) in grouped.iter().enumerate() {
        for &b in &grouped[nth + 1..] {
            let r = coefficient(&inputs[a], &inputs[b]);
            if r != 0.0 {
                pairs.push(Pair { a, b, r });
            }
        }
    }
    pairs
}

fn group(input: &Sensitivity) -> Option<&Correlation> {
    input.part()?;
    input.input()?.evaluation().correlation.as_deref()
}

/// The coefficient of two different inputs.
fn coefficient(a: &Sensitivity, b: &Sensitivity) -> f64 {
    let (Some(group), Some(key), Some(other)) = (group(a), a.key(), b.key()) else { return 0.0 };
    group.between(key, other).unwrap_or(0.0)
}

/// The variance of a value, from how it depends on its inputs; inputs that state no uncertainty add nothing.
pub fn variance(inputs: &[Sensitivity]) -> f64 {
    let part = |at: usize| inputs[at].part().unwrap_or(0.0);
    // Not `sum`, which is -0 for nothing.
    let independent = (0..inputs.len()).fold(0.0, |sum, at| sum + part(at) * part(at));
    let pairs = pairs(inputs);
    if pairs.is_empty() {
        return independent;
    }
    let (mut sum, mut size) = (independent, independent);
    for Pair { a, b, r } in pairs {
        let term = 2.0 * r * part(a) * part(b);
        sum += term;
        size += term.abs();
    }
    // What cancels leaves rounding behind, of which the root would look like an uncertainty.
    if sum <= 8.0 * f64::EPSILON * size { 0.0 } else { sum }
}

/// The covariance of two values, from how each depends on its inputs; both lists in the order of their keys.
pub fn covariance(left: &[Sensitivity], right: &[Sensitivity]) -> f64 {
    let mut sum = 0.0;
    for a in left {
        let (Some(part), Some(key)) = (a.part(), a.key()) else { continue };
        if let Ok(same) = right.binary_search_by(|b| b.key().cmp(&Some(key))) {
            sum += part * right[same].part().unwrap_or(0.0);
        }
        if group(a).is_some() {
            let others = right.iter().filter(|b| b.key() != Some(key));
            sum += others.map(|b| coefficient(a, b) * part * b.part().unwrap_or(0.0)).sum::<f64>();
        }
    }
    sum
}

#[cfg(test)]
mod tests {
    use std::rc::Rc;
    use std::sync::Arc;

    use smallvec::SmallVec;

    use super::*;
    use crate::record::evaluation::Evaluation;
    use crate::record::node::{Input, Node, Origin};
    use crate::units::{Dimension, Kind};

    fn key(name: &str) -> LeafKey {
        LeafKey::Own(name.into())
    }

    fn depends(group: &Arc<Correlation>, name: &str, derivative: f64, u: f64) -> Sensitivity {
        let evaluation = Evaluation { correlation: Some(Arc::clone(group)), ..Evaluation::UNSTATED };
        let input = Input { u: Some(u), evaluated: evaluation.kept(), ..Input::of(key(name)) };
        let leaf =
            Node::new(1.0, Dimension::none(), Kind::PLAIN, SmallVec::new(), Origin::Input(Box::new(input)), None);
        Sensitivity { leaf: Rc::new(leaf), derivative, chosen: false }
    }

    fn pair(r: f64) -> Arc<Correlation> {
        Arc::new(Correlation::new(vec![key("x"), key("y")], vec![1.0, r, r, 1.0]).unwrap())
    }

    #[test]
    fn full_correlation_adds_or_cancels_and_half_lies_between() {
        let variance_of =
            |r: f64, sign: f64| variance(&[depends(&pair(r), "x", 1.0, 0.3), depends(&pair(r), "y", sign, 0.4)]);
        assert!((variance_of(1.0, 1.0) - 0.49).abs() < 1e-15);
        assert!((variance_of(1.0, -1.0) - 0.01).abs() < 1e-15);
        // (0.3 − 0.4)² written as 0.09 + 0.16 − 2·0.5·0.12
        assert!((variance_of(0.5, -1.0) - 0.13).abs() < 1e-15);
        let equal = |sign: f64| variance(&[depends(&pair(1.0), "x", 1.0, 0.3), depends(&pair(1.0), "y", sign, 0.3)]);
        assert_eq!(equal(-1.0), 0.0);
    }

    #[test]
    fn the_covariance_of_a_value_with_itself_is_its_variance() {
        let group = pair(-0.36);
        let value = [depends(&group, "x", 2.0, 0.3), depends(&group, "y", -5.0, 0.4)];
        assert!((covariance(&value, &value) - variance(&value)).abs() < 1e-14);
        // One value is x, the other y: r u u.
        assert!((covariance(&value[..1], &value[1..]) - -0.36 * 0.6 * -2.0).abs() < 1e-15);
    }

    #[test]
    fn numbers_that_are_no_coefficients_are_refused() {
        let refused = |n: usize, r: &[f64]| {
            let keys = (0..n).map(|nth| key(&nth.to_string())).collect();
            Correlation::new(keys, r.to_vec()).unwrap_err()
        };
        assert_eq!(refused(2, &[1.0]), CorrelationError::Count { count: 2, given: 1 });
        assert!(matches!(refused(2, &[1.0, 0.1, 0.2, 1.0]), CorrelationError::Asymmetric { .. }));
        assert!(matches!(refused(2, &[1.0, 1.1, 1.1, 1.0]), CorrelationError::Range { .. }));
        assert!(matches!(refused(1, &[0.9]), CorrelationError::Range { .. }));
        assert!(matches!(refused(2, &[1.0, f64::NAN, f64::NAN, 1.0]), CorrelationError::Asymmetric { .. }));
        let opposed = [1.0, 0.9, -0.9, 0.9, 1.0, 0.9, -0.9, 0.9, 1.0];
        assert_eq!(refused(3, &opposed), CorrelationError::Impossible);
    }
}
