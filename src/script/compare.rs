//! Comparisons and sums of unlike things in scripts.
//!
//! The engine compares numbers within a tolerance (`1.38e-23 == 0.0` is true), answers false without a word when a
//! number meets a text, and glues a number and a text together. [`register`] makes comparisons exact, and refuses
//! what cannot be compared or added. Surprise: a whole number and a number with a point compare by exact value, also
//! beyond 2**53.

use std::any::TypeId;
use std::cmp::Ordering;
use std::fmt;

use rhai::{Blob, Dynamic, Engine, EvalAltResult, ImmutableString};

use crate::fault::Explain;
use crate::script::fault::raise;
use crate::script::words;

/// Why two values are not compared or joined.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum CompareError {
    /// Two kinds that are never equal and have no order.
    UnlikeKinds { op: &'static str, left: String, right: String },
    /// Two values of one kind that has no such comparison.
    NoSuchComparison { op: &'static str, kind: String },
    /// Nothing has no order; only `==` and `!=` make sense with it.
    OrderOfNothing { op: &'static str },
    /// Something that is not a text, followed by `+` and a text.
    JoinedToText { left: String },
    /// A text minus a text would cut pieces out of the first.
    TextMinus,
}

impl fmt::Display for CompareError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            CompareError::UnlikeKinds { op, left, right } => write!(f, "{op} cannot compare {left} with {right}"),
            CompareError::NoSuchComparison { op, kind } => write!(f, "{op} cannot compare {kind} with another"),
            CompareError::OrderOfNothing { op } => write!(f, "{op} cannot order anything against (), which is nothing"),
            CompareError::JoinedToText { left } => write!(f, "+ cannot add {left} and a text"),
            CompareError::TextMinus => write!(f, "- cannot subtract a text from a text"),
        }
    }
}

impl Explain for CompareError {
    fn code(&self) -> &'static str {
        match self {
            CompareError::UnlikeKinds { .. } => "unlike-kinds",
            CompareError::NoSuchComparison { .. } => "no-such-comparison",
            CompareError::OrderOfNothing { .. } => "order-of-nothing",
            CompareError::JoinedToText { .. } => "joined-to-text",
            CompareError::TextMinus => "text-minus",
        }
    }

    fn hint(&self) -> String {
        match self {
            CompareError::UnlikeKinds { left, right, .. } if [left, right].iter().any(|kind| *kind == "a text") => {
                "read the number out of the text first: parse_float(text)"
            }
            CompareError::UnlikeKinds { .. } => "compare values of the same kind",
            CompareError::NoSuchComparison { .. } => "compare a number or text that belongs to each of them",
            CompareError::OrderOfNothing { .. } => "test for nothing first: x == ()",
            CompareError::JoinedToText { .. } => "begin with the text, or put the value into one: `${x} text`",
            CompareError::TextMinus => {
                "for numbers use parse_float(text); to drop a piece use text.replace(piece, \"\")"
            }
        }
        .to_owned()
    }
}

type Outcome<T> = Result<T, Box<EvalAltResult>>;

const OPERATORS: [&str; 6] = ["==", "!=", "<", "<=", ">", ">="];

/// Whether an ordering satisfies an operator; no ordering (NaN) satisfies only `!=`.
fn satisfies(op: &str, order: Option<Ordering>) -> bool {
    match op {
        "==" => order == Some(Ordering::Equal),
        "!=" => order != Some(Ordering::Equal),
        "<" => order == Some(Ordering::Less),
        "<=" => matches!(order, Some(Ordering::Less | Ordering::Equal)),
        ">" => order == Some(Ordering::Greater),
        ">=" => matches!(order, Some(Ordering::Greater | Ordering::Equal)),
        _ => unreachable!("operators are listed where they are registered"),
    }
}

/// Compares by value: converting the whole number would round it beyond 2**53.
#[allow(clippy::cast_possible_truncation, clippy::cast_precision_loss)]
fn whole_with_real(whole: i64, real: f64) -> Option<Ordering> {
    if real.is_nan() {
        return None;
    }
    if real >= 9_223_372_036_854_775_808.0 {
        return Some(Ordering::Less);
    }
    if real < -9_223_372_036_854_775_808.0 {
        return Some(Ordering::Greater);
    }
    // In range, so cutting off the decimals is exact; they decide when the rest is equal.
    let cut = real.trunc();
    Some(whole.cmp(&(cut as i64)).then(0.0.partial_cmp(&(real - cut))?))
}

/// Makes comparisons exact, and refuses what the engine would answer without a word.
pub fn register(engine: &mut Engine) {
    let any = TypeId::of::<Dynamic>();
    for op in OPERATORS {
        engine.register_fn(op, move |x: f64, y: f64| satisfies(op, x.partial_cmp(&y)));
        engine.register_fn(op, move |x: i64, y: i64| satisfies(op, Some(x.cmp(&y))));
        engine.register_fn(op, move |x: i64, y: f64| satisfies(op, whole_with_real(x, y)));
        engine.register_fn(op, move |x: f64, y: i64| satisfies(op, whole_with_real(y, x).map(Ordering::reverse)));
        engine.register_fn(op, move |x: bool, y: bool| satisfies(op, Some(x.cmp(&y))));
        engine.register_fn(op, move |x: char, y: char| satisfies(op, Some(x.cmp(&y))));
        engine.register_fn(op, move |x: &str, y: &str| satisfies(op, Some(x.cmp(y))));
        // Everything without a form of its own comes here, arrays and maps excepted for `==` and `!=`.
        engine.register_raw_fn(op, [any, any], move |_, arguments| compare(op, arguments[0], arguments[1]));
    }
    let text = TypeId::of::<ImmutableString>();
    engine.register_raw_fn("+", [any, text], |_, arguments| -> Outcome<Dynamic> {
        Err(raise(CompareError::JoinedToText { left: words::kind_of(arguments[0]) }))
    });
    engine.register_fn("+", |_: (), _: &str| -> Outcome<Dynamic> {
        Err(raise(CompareError::JoinedToText { left: words::kind("()") }))
    });
    for op in ["-", "-="] {
        for right in [text, TypeId::of::<char>()] {
            engine
                .register_raw_fn(op, [text, right], |_, _| -> Outcome<Dynamic> { Err(raise(CompareError::TextMinus)) });
        }
    }
}

fn compare(op: &'static str, left: &Dynamic, right: &Dynamic) -> Outcome<bool> {
    match (left.is_unit(), right.is_unit(), op) {
        (both, other, "==") if both || other => return Ok(both && other),
        (both, other, "!=") if both || other => return Ok(!(both && other)),
        (true, _, _) | (_, true, _) => return Err(raise(CompareError::OrderOfNothing { op })),
        _ => {}
    }
    let as_text = |value: &Dynamic| value.as_char().map(String::from).or_else(|_| value.clone().into_string()).ok();
    if let (Some(x), Some(y)) = (as_text(left), as_text(right)) {
        return Ok(satisfies(op, Some(x.cmp(&y))));
    }
    let equality = matches!(op, "==" | "!=");
    if let (true, Some(x), Some(y)) = (equality, left.read_lock::<Blob>(), right.read_lock::<Blob>()) {
        return Ok((*x == *y) == (op == "=="));
    }
    if left.type_id() == right.type_id() {
        return Err(raise(CompareError::NoSuchComparison { op, kind: words::kind_of(left) }));
    }
    Err(raise(CompareError::UnlikeKinds { op, left: words::kind_of(left), right: words::kind_of(right) }))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn whole_numbers_compare_by_value_beyond_2_to_the_53() {
        let big = 9_007_199_254_740_993; // 2**53 + 1, which no number with a point can be
        assert_eq!(whole_with_real(big, 9_007_199_254_740_992.0), Some(Ordering::Greater));
        assert_eq!(whole_with_real(i64::MAX, 9_223_372_036_854_775_808.0), Some(Ordering::Less));
        assert_eq!(whole_with_real(i64::MIN, -9_223_372_036_854_775_808.0), Some(Ordering::Equal));
        assert_eq!(whole_with_real(2, 2.5), Some(Ordering::Less));
        assert_eq!(whole_with_real(-2, -2.5), Some(Ordering::Greater));
        assert_eq!(whole_with_real(-2, -1.5), Some(Ordering::Less));
        assert_eq!(whole_with_real(0, -0.0), Some(Ordering::Equal));
        assert_eq!(whole_with_real(0, f64::NAN), None);
    }
}
