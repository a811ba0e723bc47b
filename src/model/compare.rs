//! Two values beside each other: their difference, in units and in standard uncertainties of the difference itself.
//!
//! d = a - b,  k = |d| / u(d)
//!
//! | symbol | unit      | meaning                                                                     |
//! |--------|-----------|-----------------------------------------------------------------------------|
//! | a, b   | as given  | two values of one dimension and kind                                        |
//! | u(d)   | as a      | standard uncertainty of the difference; inputs that both rest on cancel in it |
//! | k      | 1         | how many standard uncertainties apart they are                              |
//!
//! Equilibrium constants are compared by their logarithms, where their uncertainty lives: d = ln(a/b).
//! Source: JCGM 100:2008, clause 5.2.

use std::collections::BTreeSet;
use std::rc::Rc;
use std::sync::Arc;

use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::answer::Answer;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::quantity::{Quantity, round};
use crate::record::spread::Spread;
use crate::units::{What, parse as unit_parse};

/// Two values and how far apart they are.
pub struct Comparison {
    pub a: Quantity,
    pub b: Quantity,
    /// a - b, or ln(a/b) of equilibrium constants.
    pub difference: Quantity,
    pub by_logarithm: bool,
    /// |difference| over its standard uncertainty, as far as that is known.
    pub k: Option<f64>,
    /// The k beyond which two values are said to differ.
    pub limit: f64,
    pub verdict: Verdict,
    /// How many inputs both values rest on.
    pub shared_inputs: usize,
}

/// What can be said of two values.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Verdict {
    /// Nothing is left of the difference, nor of its uncertainty.
    Same,
    Agree,
    Differ,
    /// They differ, and not by anything uncertain.
    DifferExactly,
    /// They seem to differ, but some inputs state no uncertainty, which could bridge it.
    DifferAsFarAsKnown,
    /// Nothing is stated about the uncertainty of the difference.
    Unknown,
}

/// Why two values cannot be compared.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum CompareError {
    #[error("{limit} standard uncertainties are no limit to tell agreement by")]
    Limit { limit: f64 },
    #[error("cannot compare {} with {}", left.word(), right.word())]
    Kinds { left: What, right: What },
    #[error("cannot compare {left} with {right} as equilibrium constants: both must be positive to have a ratio")]
    Constant { left: String, right: String },
}

impl Explain for CompareError {
    fn code(&self) -> &'static str {
        match self {
            CompareError::Limit { .. } => "comparison-limit-not-positive",
            CompareError::Kinds { .. } => "kinds-not-comparable",
            CompareError::Constant { .. } => "constant-not-positive",
        }
    }

    fn hint(&self) -> String {
        match self {
            CompareError::Limit { .. } => "give a positive number, such as 2, or leave it out".to_owned(),
            CompareError::Kinds { left, .. } => {
                format!("ask for both as {}; if their difference itself is wanted, write `a - b`", left.word())
            }
            CompareError::Constant { .. } => {
                "compare K with K; a logarithm of K is compared with a logarithm, as in `ln(K)`".to_owned()
            }
        }
    }
}

impl Comparison {
    /// Compares two values; `limit` is the k beyond which they differ.
    ///
    /// # Errors
    /// They cannot be subtracted, or are of kinds whose difference means something else.
    pub fn of(a: &Quantity, b: &Quantity, limit: f64) -> Result<Comparison, Fault> {
        if !(limit > 0.0 && limit.is_finite()) {
            return Err(CompareError::Limit { limit }.into());
        }
        let (difference, by_logarithm) = difference(a, b)?;
        let spread = difference.spread();
        let gap = difference.si().abs();
        let k = uncertainty(a, b, &difference, by_logarithm).map(|u| gap / u);
        let verdict = match (&spread, k) {
            (Spread::NotStated { .. }, _) | (Spread::Partial { .. }, None) => Verdict::Unknown,
            (Spread::Full(_), None) if gap == 0.0 => Verdict::Same,
            (Spread::Full(_), None) => Verdict::DifferExactly,
            (_, Some(k)) if k <= limit => Verdict::Agree,
            (Spread::Partial { .. }, Some(_)) => Verdict::DifferAsFarAsKnown,
            (Spread::Full(_), Some(_)) => Verdict::Differ,
        };
        let shared_inputs = shared_inputs(a, b);
        Ok(Comparison { a: a.clone(), b: b.clone(), difference, by_logarithm, k, limit, verdict, shared_inputs })
    }

    pub(super) fn parts(&self) -> Vec<(&'static str, Value)> {
        vec![
            ("difference", Value::Quantity(self.difference.clone())),
            ("k", self.k.map_or(Value::Nothing, Value::Number)),
            ("verdict", Value::Text(self.sentence().into())),
        ]
    }

    /// The verdict in a sentence.
    pub fn sentence(&self) -> String {
        let apart = |k: f64| format!("{k:.1} standard uncertainties of their difference apart");
        let limit = self.limit;
        match (self.verdict, self.k) {
            (Verdict::Same, _) => "the same: whatever is uncertain is common to both and cancels".to_owned(),
            (Verdict::Agree, Some(k)) => format!("they agree: {}, within {limit}", apart(k)),
            (Verdict::Differ, Some(k)) => format!("they differ: {}, more than {limit}", apart(k)),
            (Verdict::DifferAsFarAsKnown, Some(k)) => format!(
                "they differ as far as is known: {} at most, more than {limit}; what inputs without a stated u would add \
                 is not in it",
                apart(k)
            ),
            (Verdict::DifferExactly, _) => "they differ: nothing uncertain is left in their difference".to_owned(),
            _ => "whether they agree cannot be said: nothing is stated about the uncertainty of their difference"
                .to_owned(),
        }
    }
}

/// a - b, or ln(a/b) of equilibrium constants, and whether it is the latter.
///
/// # Errors
/// They cannot be subtracted, or are of kinds whose difference means something else.
pub fn difference(a: &Quantity, b: &Quantity) -> Result<(Quantity, bool), Fault> {
    let (left, right) = (a.kind().what, b.kind().what);
    // Whatever forbids a difference is said in the words of subtraction.
    let plain = a.minus(b, None)?;
    let temperatures = left.is_temperature() && right.is_temperature();
    let like = left == right || left == What::Plain || right == What::Plain || temperatures;
    if !like {
        return Err(CompareError::Kinds { left, right }.into());
    }
    if left != What::K && right != What::K {
        // A temperature in kelvin beside a point is a point here too, and their difference is none.
        let kelvin = if left.is_temperature() { Some(Arc::new(unit_parse::unit("K")?)) } else { None };
        let unit = kelvin.or_else(|| plain.written_unit().cloned());
        return Ok((plain.in_unit(unit), false));
    }
    if a.si() <= 0.0 || b.si() <= 0.0 {
        let [left, right] = [a, b].map(|value| round::significant(value.si(), 3));
        return Err(CompareError::Constant { left, right }.into());
    }
    Ok((a.over(b, None)?.ln(None)?, true))
}

/// Standard uncertainty of a difference; `None` where none is stated, and where all of it cancels but for rounding.
pub fn uncertainty(a: &Quantity, b: &Quantity, difference: &Quantity, by_logarithm: bool) -> Option<f64> {
    let own = |value: &Quantity| {
        let u = value.spread().u().unwrap_or(0.0);
        if by_logarithm { (u / value.si()).abs() } else { u }
    };
    let cancelled = CANCELLED * own(a).max(own(b));
    difference.spread().u().filter(|u| *u > cancelled)
}

/// What is left of two equal uncertainties by rounding, relative to them.
const CANCELLED: f64 = 1e-12;

fn shared_inputs(a: &Quantity, b: &Quantity) -> usize {
    let keys = |value: &Quantity| -> BTreeSet<_> {
        // A condition both were computed at is no figure that they share.
        value.sensitivities().iter().filter(|s| !s.chosen).filter_map(|s| s.key().cloned()).collect()
    };
    keys(a).intersection(&keys(b)).count()
}

pub static COMPARE: Card = Card {
    id: "quantity.compare",
    name: "compare",
    on: On::Nothing,
    args: &[
        Arg { name: "a", takes: Takes::AnyQuantity, default: Default::Required, doc: "a value" },
        Arg {
            name: "b",
            takes: Takes::AnyQuantity,
            default: Default::Required,
            doc: "another of the same dimension and kind",
        },
        Arg {
            name: "k",
            takes: Takes::Number,
            default: Default::Number(2.0),
            doc: "how many standard uncertainties apart two values may be and still agree",
        },
    ],
    gives: "the difference in units and in standard uncertainties, with a verdict, to be read; `.difference`, `.k` and \
            `.verdict` are its parts",
    doc: "Compares two values by the uncertainty of their difference: what both rest on cancels in it. Equilibrium \
          constants are compared by their logarithms.",
    source: "JCGM 100:2008, clause 5.2",
    example: "compare(\"-285.830(20) kJ/mol[H2O]\", \"-285.80(4) kJ/mol[H2O]\")",
    claims: &[],
    alternatives: &[],
    run,
    check_line: None,
    caution: None,
};

fn run(_: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let comparison = Comparison::of(call.quantity(0), call.quantity(1), call.number(2))?;
    Ok(Value::Answer(Answer::Comparison(Rc::new(comparison))))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::text::parse;

    fn q(text: &str, ordinal: u64) -> Quantity {
        parse(text, None, ordinal).unwrap()
    }

    fn compared(a: &Quantity, b: &Quantity) -> (Verdict, Option<f64>) {
        let comparison = Comparison::of(a, b, 2.0).unwrap();
        (comparison.verdict, comparison.k)
    }

    #[test]
    fn what_both_rest_on_cancels() {
        let (x, y) = (q("10.0(3) kJ", 1), q("1.0(4) kJ", 2));
        let sum = x.plus(&y, None).unwrap();
        // u of the difference is that of y alone.
        assert_eq!(compared(&sum, &x), (Verdict::Differ, Some(1.0 / 0.4)));
        assert_eq!(compared(&sum, &sum), (Verdict::Same, None));
        assert_eq!(Comparison::of(&sum, &x, 3.0).unwrap().verdict, Verdict::Agree);
        assert_eq!(Comparison::of(&sum, &x, 3.0).unwrap().shared_inputs, 1);
    }

    #[test]
    fn without_a_stated_uncertainty_no_verdict_is_given_and_with_part_of_one_it_says_so() {
        let (x, y) = (q("10.0(3) kJ", 1), q("1.0 kJ", 2));
        assert_eq!(compared(&q("1.0 kJ", 3), &y).0, Verdict::Unknown);
        assert_eq!(compared(&x, &y).0, Verdict::DifferAsFarAsKnown);
        assert_eq!(compared(&q("1.1(3) kJ", 4), &y).0, Verdict::Agree);
    }

    #[test]
    fn a_temperature_in_kelvin_is_compared_with_one_in_degrees() {
        let comparison = Comparison::of(&q("25.00(5) degC", 1), &q("298.10(5) K", 2), 2.0).unwrap();
        assert!((comparison.difference.si() - 0.05).abs() < 1e-12);
        assert_eq!(&*comparison.difference.unit().text, "K");
        assert_eq!(comparison.verdict, Verdict::Agree);
    }

    #[test]
    fn kinds_whose_difference_is_something_else_are_refused() {
        let limit = Comparison::of(&q("1.0(1) J", 1), &q("1.0(1) J", 2), 0.0);
        assert_eq!(limit.err().unwrap().code(), "comparison-limit-not-positive");
    }
}
