//! Arithmetic and elementary functions of scripts, on plain numbers.
//!
//! The engine's own would divide whole numbers to 0, wrap `2^3` to 1, let NaN and infinity through, and take the
//! elementary functions from the standard library, whose bits vary by machine. [`register`] replaces them all: `/`
//! and `**` give a number with a point, what has no finite value is a fault, elementary functions come from
//! [`crate::num::math`].

use std::any::TypeId;
use std::fmt;

use rhai::{Dynamic, Engine, EvalAltResult};

use crate::fault::Explain;
use crate::num::math;
use crate::script::fault::raise;
use crate::script::show;

/// Why a calculation on plain numbers has no result.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum NumberError {
    DivisionByZero {
        calculation: String,
    },
    /// No real number is the answer: `ln(-1)`.
    NotReal {
        calculation: String,
    },
    /// The answer lies beyond the largest number.
    TooLarge {
        calculation: String,
    },
    /// The answer has no size: `ln(0)`.
    Infinite {
        calculation: String,
    },
    /// Whole numbers are exact and end at 2**63.
    WholeNumberOverflow {
        calculation: String,
    },
    /// `^` between numbers, which the engine takes bit by bit.
    CaretIsNotPower,
    /// A text that does not read as a number.
    NotANumber {
        text: String,
    },
}

impl fmt::Display for NumberError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            NumberError::DivisionByZero { calculation } => write!(f, "{calculation} divides by zero"),
            NumberError::NotReal { calculation } => write!(f, "{calculation} is not a real number"),
            NumberError::TooLarge { calculation } => write!(f, "{calculation} is beyond the largest number, 1.8e308"),
            NumberError::Infinite { calculation } => write!(f, "{calculation} is infinite"),
            NumberError::WholeNumberOverflow { calculation } => {
                write!(f, "{calculation} is beyond the largest whole number, 9.2e18")
            }
            NumberError::CaretIsNotPower => write!(f, "^ does not raise to a power here"),
            NumberError::NotANumber { text } => write!(f, "{text} does not read as a number"),
        }
    }
}

impl Explain for NumberError {
    fn code(&self) -> &'static str {
        match self {
            NumberError::DivisionByZero { .. } => "division-by-zero",
            NumberError::NotReal { .. } => "not-a-real-number",
            NumberError::TooLarge { .. } => "number-too-large",
            NumberError::Infinite { .. } => "infinite-number",
            NumberError::WholeNumberOverflow { .. } => "whole-number-overflow",
            NumberError::CaretIsNotPower => "caret-is-not-power",
            NumberError::NotANumber { .. } => "not-a-number",
        }
    }

    fn hint(&self) -> String {
        match self {
            NumberError::DivisionByZero { .. } => "test the divisor first, or find out why it is zero",
            NumberError::NotReal { .. } | NumberError::Infinite { .. } => {
                "check the sign and the range of what goes in"
            }
            NumberError::TooLarge { .. } => "work with the logarithm, or in a unit that keeps the number near 1",
            NumberError::WholeNumberOverflow { .. } => "write one of the numbers with a point, as in 2.0",
            NumberError::CaretIsNotPower => "write ** for a power: x**2",
            NumberError::NotANumber { .. } => "write digits with a point for the decimals: 8.314 or 1.5e-3",
        }
        .to_owned()
    }
}

type Outcome<T> = Result<T, Box<EvalAltResult>>;

/// Lets a finite result through and says what is wrong with another one.
fn finite(value: f64, calculation: impl FnOnce() -> String) -> Outcome<f64> {
    if value.is_finite() {
        Ok(value)
    } else if value.is_nan() {
        Err(raise(NumberError::NotReal { calculation: calculation() }))
    } else {
        Err(raise(NumberError::TooLarge { calculation: calculation() }))
    }
}

/// A number as it stands in a message about a calculation.
trait Operand: Copy {
    fn text(self) -> String;
    fn real(self) -> f64;
}

impl Operand for f64 {
    fn text(self) -> String {
        show::number(self)
    }

    fn real(self) -> f64 {
        self
    }
}

impl Operand for i64 {
    fn text(self) -> String {
        self.to_string()
    }

    /// A whole number meets a number with a point: beyond 2**53 it is rounded, as in every language.
    #[allow(clippy::cast_precision_loss)]
    fn real(self) -> f64 {
        self as f64
    }
}

/// A negative number in brackets, as it must be written beside an operator.
fn bracketed(text: String) -> String {
    if text.starts_with('-') { format!("({text})") } else { text }
}

/// `x op y` where at least one side is a number with a point, or where `op` always gives one.
fn calculate<X: Operand, Y: Operand>(op: &str, x: X, y: Y) -> Outcome<f64> {
    let (a, b) = (x.real(), y.real());
    let calculation = || format!("{} {op} {}", bracketed(x.text()), bracketed(y.text()));
    let divides = matches!(op, "/" | "%") || (op == "**" && b < 0.0);
    if divides && (if op == "**" { a } else { b }) == 0.0 {
        return Err(raise(NumberError::DivisionByZero { calculation: calculation() }));
    }
    let value = match op {
        "+" => a + b,
        "-" => a - b,
        "*" => a * b,
        "/" => a / b,
        "%" => a % b,
        "**" => math::pow(a, b),
        _ => unreachable!("operators are listed where they are registered"),
    };
    finite(value, calculation)
}

/// `x op y` on whole numbers, for the operators that stay exact.
fn calculate_whole(op: &str, x: i64, y: i64) -> Outcome<i64> {
    let calculation = || format!("{} {op} {}", bracketed(x.text()), bracketed(y.text()));
    let value = match op {
        "+" => x.checked_add(y),
        "-" => x.checked_sub(y),
        "*" => x.checked_mul(y),
        "%" if y == 0 => return Err(raise(NumberError::DivisionByZero { calculation: calculation() })),
        // Only MIN % -1 overflows, and its remainder is 0.
        "%" => Some(x.checked_rem(y).unwrap_or(0)),
        _ => unreachable!("operators are listed where they are registered"),
    };
    value.ok_or_else(|| raise(NumberError::WholeNumberOverflow { calculation: calculation() }))
}

type OfOne = fn(f64) -> f64;
type OfTwo = fn(f64, f64) -> f64;

/// Elementary functions of one number, all from `num::math`.
const ELEMENTARY: [(&str, OfOne); 16] = [
    ("sin", math::sin),
    ("cos", math::cos),
    ("tan", math::tan),
    ("asin", math::asin),
    ("acos", math::acos),
    ("atan", math::atan),
    ("sinh", math::sinh),
    ("cosh", math::cosh),
    ("tanh", math::tanh),
    ("asinh", math::asinh),
    ("acosh", math::acosh),
    ("atanh", math::atanh),
    ("exp", math::exp),
    ("ln", math::ln),
    ("log", math::log10),
    ("sqrt", math::sqrt),
];

/// Elementary functions of two numbers.
const ELEMENTARY_OF_TWO: [(&str, OfTwo); 3] = [("atan", math::atan2), ("hypot", math::hypot), ("log", math::log)];

/// Elementary functions that grow out of range; the others are infinite where they are not finite.
const GROWING: [&str; 4] = ["exp", "sinh", "cosh", "hypot"];

fn elementary(name: &str, value: f64, calculation: impl FnOnce() -> String) -> Outcome<f64> {
    if value.is_infinite() && !GROWING.contains(&name) {
        return Err(raise(NumberError::Infinite { calculation: calculation() }));
    }
    finite(value, calculation)
}

/// Functions that change how a number is written and not its size; on whole numbers they give it back.
const ROUNDING: [&str; 4] = ["floor", "ceiling", "round", "int"];

/// Replaces the engine's arithmetic and elementary functions.
pub fn register(engine: &mut Engine) {
    register_operators(engine);
    register_assignments(engine);
    for (name, function) in ELEMENTARY {
        let call = move |x: f64, text: String| elementary(name, function(x), || format!("{name}({text})"));
        engine.register_fn(name, move |x: f64| call(x, x.text()));
        engine.register_fn(name, move |x: i64| call(x.real(), x.text()));
    }
    for (name, function) in ELEMENTARY_OF_TWO {
        let call = move |x: f64, y: f64, text: [String; 2]| {
            elementary(name, function(x, y), || format!("{name}({}, {})", text[0], text[1]))
        };
        engine.register_fn(name, move |x: f64, y: f64| call(x, y, [x.text(), y.text()]));
        engine.register_fn(name, move |x: f64, y: i64| call(x, y.real(), [x.text(), y.text()]));
        engine.register_fn(name, move |x: i64, y: f64| call(x.real(), y, [x.text(), y.text()]));
        engine.register_fn(name, move |x: i64, y: i64| call(x.real(), y.real(), [x.text(), y.text()]));
    }
    for name in ROUNDING {
        engine.register_fn(name, |x: i64| x);
    }
    register_conversions(engine);
}

fn register_operators(engine: &mut Engine) {
    for op in ["+", "-", "*", "/", "%", "**"] {
        engine.register_fn(op, move |x: f64, y: f64| calculate(op, x, y));
        engine.register_fn(op, move |x: f64, y: i64| calculate(op, x, y));
        engine.register_fn(op, move |x: i64, y: f64| calculate(op, x, y));
    }
    for op in ["+", "-", "*", "%"] {
        engine.register_fn(op, move |x: i64, y: i64| calculate_whole(op, x, y));
    }
    for op in ["/", "**"] {
        engine.register_fn(op, move |x: i64, y: i64| calculate(op, x, y));
    }
    for op in ["^", "^="] {
        let any = TypeId::of::<Dynamic>();
        engine.register_raw_fn(op, [any, any], |_, _| -> Outcome<Dynamic> { Err(raise(NumberError::CaretIsNotPower)) });
    }
    let overflow = |calculation: String| move || raise(NumberError::WholeNumberOverflow { calculation });
    engine.register_fn("-", move |x: i64| x.checked_neg().ok_or_else(overflow(format!("-({x})"))));
    engine.register_fn("abs", move |x: i64| x.checked_abs().ok_or_else(overflow(format!("abs({x})"))));
}

/// `x op= y` has roads of its own in the engine, past the operators above.
fn register_assignments(engine: &mut Engine) {
    for (assignment, op) in [("+=", "+"), ("-=", "-"), ("*=", "*"), ("/=", "/"), ("%=", "%"), ("**=", "**")] {
        engine.register_fn(assignment, move |x: &mut f64, y: f64| calculate(op, *x, y).map(|value| *x = value));
        engine.register_fn(assignment, move |x: &mut f64, y: i64| calculate(op, *x, y).map(|value| *x = value));
    }
    for (assignment, op) in [("+=", "+"), ("-=", "-"), ("*=", "*"), ("%=", "%")] {
        engine.register_fn(assignment, move |x: &mut i64, y: i64| calculate_whole(op, *x, y).map(|value| *x = value));
    }
    // The result has a point where the variable had none, so the variable's value is replaced, kind and all.
    let whole = TypeId::of::<i64>();
    for (assignment, op) in [("/=", "/"), ("**=", "**")] {
        engine.register_raw_fn(assignment, [whole, whole], move |_, arguments| {
            let (x, y) = (arguments[0].as_int()?, arguments[1].as_int()?);
            *arguments[0] = Dynamic::from_float(calculate(op, x, y)?);
            Ok(())
        });
    }
}

fn register_conversions(engine: &mut Engine) {
    engine.register_fn("to_int", |x: f64| {
        let cut = x.trunc();
        // 2**63 is a number and the first that a whole number cannot be.
        if (-9_223_372_036_854_775_808.0..9_223_372_036_854_775_808.0).contains(&cut) {
            #[allow(clippy::cast_possible_truncation)]
            Ok(cut as i64)
        } else {
            Err(raise(NumberError::WholeNumberOverflow { calculation: format!("to_int({})", x.text()) }))
        }
    });
    let not_a_number = |text: &str| raise(NumberError::NotANumber { text: format!("\"{text}\"") });
    engine.register_fn("parse_float", move |text: &str| {
        let value: Option<f64> = text.trim().parse().ok();
        value.filter(|value| value.is_finite()).ok_or_else(|| not_a_number(text))
    });
    engine.register_fn("parse_int", move |text: &str| text.trim().parse::<i64>().map_err(|_| not_a_number(text)));
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use super::*;
    use crate::script::engine::fix_hashing;

    /// Functions of the engine that turn numbers into a number without leaving IEEE 754's exactly rounded operations,
    /// as read in its sources; everything else it ships on numbers must be registered again.
    const EXACT: [&str; 13] = [
        "+",
        "-",
        "abs",
        "ceiling",
        "floor",
        "fraction",
        "int",
        "max",
        "min",
        "round",
        "to_degrees",
        "to_float",
        "to_radians",
    ];

    /// Name and number of arguments of the functions that take nothing but numbers and give one.
    fn on_numbers(engine: &Engine, include_engine: bool) -> BTreeSet<(String, usize)> {
        engine
            .gen_fn_signatures(include_engine)
            .into_iter()
            .filter_map(|signature| {
                let (name, rest) = signature.split_once('(')?;
                let (arguments, result) = rest.split_once(')')?;
                let takes: Vec<&str> = arguments.split(", ").filter(|argument| !argument.is_empty()).collect();
                let numbers = takes.iter().all(|argument| argument.ends_with(": f64"));
                let gives = result.trim_start_matches(" -> ");
                let number = gives == "f64" || gives.contains("Result<f64,");
                (numbers && number && !takes.is_empty() && !name.contains('$')).then(|| (name.to_owned(), takes.len()))
            })
            .collect()
    }

    #[test]
    fn every_elementary_function_of_the_engine_is_replaced() {
        fix_hashing();
        let theirs = on_numbers(&Engine::new(), true);
        let mut engine = Engine::new();
        register(&mut engine);
        let ours = on_numbers(&engine, false);
        let missed: Vec<_> = theirs
            .iter()
            .filter(|(name, count)| !EXACT.contains(&name.as_str()) && !ours.contains(&(name.clone(), *count)))
            .collect();
        assert!(missed.is_empty(), "the engine's own would be called: {missed:?}");
        // The walk itself must find something, or it proves nothing.
        for known in [("exp", 1), ("hypot", 2), ("log", 2), ("atan", 2)] {
            assert!(theirs.contains(&(known.0.to_owned(), known.1)), "{known:?} not found in {theirs:?}");
        }
    }

    #[test]
    fn powers_and_functions_have_the_bits_of_num_math() {
        fix_hashing();
        let mut engine = Engine::new();
        engine.set_fast_operators(false);
        register(&mut engine);
        for n in 1..200 {
            let x = f64::from(n) * 0.37;
            let mut scope = rhai::Scope::new();
            scope.push("x", x);
            let bits =
                |code: &str, scope: &mut rhai::Scope<'_>| engine.eval_with_scope::<f64>(scope, code).unwrap().to_bits();
            assert_eq!(bits("x ** 1.7", &mut scope), math::pow(x, 1.7).to_bits());
            assert_eq!(bits("x ** -3", &mut scope), math::pow(x, -3.0).to_bits());
            assert_eq!(bits("let y = x; y **= 1.7; y", &mut scope), math::pow(x, 1.7).to_bits());
            for (name, function) in ELEMENTARY {
                let expected = function(x);
                if expected.is_finite() {
                    assert_eq!(bits(&format!("{name}(x)"), &mut scope), expected.to_bits(), "{name}({x})");
                }
            }
            assert_eq!(bits("log(x, 3)", &mut scope), math::log(x, 3.0).to_bits());
        }
    }
}
