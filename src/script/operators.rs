//! Arithmetic and comparison of quantities in scripts.
//!
//! The engine answers some senseless comparisons with `false` and glues a quantity to a text without a word; each such
//! road is closed here with a fault. There is no `==` on measured values.

use std::cell::Cell;

use rhai::{Dynamic, Engine, ImmutableString, NativeCallContext};

use crate::fault::{Explain, Fault, Place};
use crate::model::card::Cx;
use crate::model::refusal;
use crate::quantity::{Mismatch, Quantity};
use crate::render;
use crate::script::bind::Native;
use crate::script::fault::raise;
use crate::script::state::{Shared, place_of};

/// A use of an operator that has no meaning for quantities.
#[derive(Clone, Debug, thiserror::Error)]
enum Misuse {
    #[error("`{operator}` between quantities asks whether two measured values are the same to the last bit")]
    Equality { operator: &'static str },
    #[error("cannot use `{operator}` between a quantity and a text")]
    WithText { operator: &'static str },
    #[error("cannot use `{operator}` between a quantity and {other}")]
    WithOther { operator: &'static str, other: String },
    #[error("cannot add a bare number and a value in {unit}")]
    NumberAndUnit { unit: String },
}

impl Explain for Misuse {
    fn code(&self) -> &'static str {
        match self {
            Misuse::Equality { .. } => "equality-of-measured-values",
            Misuse::WithText { .. } => "quantity-and-text",
            Misuse::WithOther { .. } => "quantity-and-other",
            Misuse::NumberAndUnit { .. } => "number-and-unit",
        }
    }

    fn hint(&self) -> String {
        match self {
            Misuse::Equality { .. } => {
                "ask `agrees(a, b, 2)`, or compare bare numbers with `a.value(\"kJ/mol\")`".to_owned()
            }
            Misuse::WithText { .. } => "make the text a quantity first: `q(\"1.5 kJ/mol\")`".to_owned(),
            Misuse::WithOther { .. } => "compute with quantities and numbers only".to_owned(),
            Misuse::NumberAndUnit { unit } => format!("give the number its unit: `q(\"1.5 {unit}\")`"),
        }
    }
}

/// Runs a step of arithmetic; a refusal gets the place it was called from.
fn done(
    context: &NativeCallContext<'_>,
    step: impl FnOnce(Option<Place>) -> Result<Quantity, Mismatch>,
) -> Native<Quantity> {
    step(place_of(context)).map_err(|mismatch| raise(Fault::from(mismatch).at(place_of(context))))
}

fn refuse<T>(context: &NativeCallContext<'_>, misuse: Misuse) -> Native<T> {
    Err(raise(Fault::from(misuse).at(place_of(context))))
}

/// Adds a bare number: fine for pure numbers, else refused with the unit the number should have.
fn shifted(context: &NativeCallContext<'_>, value: &Quantity, by: f64) -> Native<Quantity> {
    if value.dim().is_none() {
        done(context, |place| value.shifted(by, place))
    } else {
        refuse(context, Misuse::NumberAndUnit { unit: value.unit().text.to_string() })
    }
}

/// Arithmetic between a quantity and one kind of bare number. A macro, since the engine's bound on argument types has no
/// public name that a generic function could state.
macro_rules! with_numbers {
    ($engine:expr, $number:ty, $real:expr) => {
        let real: fn($number) -> f64 = $real;

        $engine.register_fn("*", move |c: NativeCallContext<'_>, a: Quantity, b: $number| {
            done(&c, |place| a.scaled(real(b), place))
        });
        $engine.register_fn("*", move |c: NativeCallContext<'_>, a: $number, b: Quantity| {
            done(&c, |place| b.scaled(real(a), place))
        });
        $engine.register_fn("/", move |c: NativeCallContext<'_>, a: Quantity, b: $number| {
            done(&c, |place| a.divided(real(b), place))
        });
        $engine.register_fn("/", move |c: NativeCallContext<'_>, a: $number, b: Quantity| {
            done(&c, |place| b.reciprocal(real(a), place))
        });
        $engine.register_fn("**", move |c: NativeCallContext<'_>, a: Quantity, b: $number| {
            done(&c, |place| a.power(real(b), place))
        });
        $engine.register_fn("+", move |c: NativeCallContext<'_>, a: Quantity, b: $number| shifted(&c, &a, real(b)));
        $engine.register_fn("+", move |c: NativeCallContext<'_>, a: $number, b: Quantity| shifted(&c, &b, real(a)));
        $engine.register_fn("-", move |c: NativeCallContext<'_>, a: Quantity, b: $number| shifted(&c, &a, -real(b)));
        $engine.register_fn("-", move |c: NativeCallContext<'_>, a: $number, b: Quantity| -> Native<Quantity> {
            let negative = done(&c, |place| b.negated(place))?;
            shifted(&c, &negative, real(a))
        });
    };
}

/// Registers operators and functions of quantities.
pub fn register(engine: &mut Engine, shared: &Shared) {
    pairs(engine, shared);
    with_numbers!(engine, f64, |number| number);
    with_numbers!(engine, i64, |number| number as f64);
    functions(engine);
    comparisons(engine);
    closed_roads(engine);
    engine.register_fn("to_string", |value: &mut Quantity| render::text::value(value));
    engine.register_fn("to_debug", |value: &mut Quantity| render::text::value(value));
}

fn pairs(engine: &mut Engine, shared: &Shared) {
    type Binary = fn(&Quantity, &Quantity, Option<Place>) -> Result<Quantity, Mismatch>;
    let operators: [(&str, Binary); 4] =
        [("+", Quantity::plus), ("-", Quantity::minus), ("*", Quantity::times), ("/", Quantity::over)];
    for (symbol, run) in operators {
        let session = shared.clone();
        engine.register_fn(
            symbol,
            move |context: NativeCallContext<'_>, a: Quantity, b: Quantity| -> Native<Quantity> {
                run(&a, &b, place_of(&context)).map_err(|mismatch| {
                    let ordinal = Cell::new(0); // A refusal reads nothing as typed.
                    let references = session.references();
                    let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
                    let figure = refusal::figure(&cx, &a, &b, &mismatch);
                    let fault = Fault::from(mismatch).at(place_of(&context));
                    raise(figure.map_or(fault.clone(), |figure| fault.adding(&figure)))
                })
            },
        );
    }
    engine.register_fn("-", |context: NativeCallContext<'_>, a: Quantity| done(&context, |place| a.negated(place)));
    engine.register_fn("+", |a: Quantity| a);
    engine.register_fn("**", |context: NativeCallContext<'_>, a: Quantity, b: Quantity| {
        done(&context, |place| a.power_of(&b, place))
    });
}

fn functions(engine: &mut Engine) {
    type Unary = fn(&Quantity, Option<Place>) -> Result<Quantity, Mismatch>;
    let root: Unary = |value, place| value.power(0.5, place);
    let functions: [(&str, Unary); 7] = [
        ("abs", Quantity::absolute),
        ("exp", Quantity::exp),
        ("ln", Quantity::ln),
        ("sin", Quantity::sin),
        ("cos", Quantity::cos),
        ("tan", Quantity::tan),
        ("sqrt", root),
    ];
    for (name, run) in functions {
        engine.register_fn(name, move |context: NativeCallContext<'_>, a: Quantity| {
            done(&context, |place| run(&a, place))
        });
    }
    for (name, wanted) in [("min", std::cmp::Ordering::Less), ("max", std::cmp::Ordering::Greater)] {
        engine.register_fn(name, move |context: NativeCallContext<'_>, a: Quantity, b: Quantity| -> Native<Quantity> {
            let order = a.compared(&b).map_err(|mismatch| raise(Fault::from(mismatch).at(place_of(&context))))?;
            Ok(if order == wanted { a } else { b })
        });
    }
}

fn comparisons(engine: &mut Engine) {
    use std::cmp::Ordering;
    type Holds = fn(Ordering) -> bool;
    let order: [(&str, Holds); 4] =
        [("<", Ordering::is_lt), ("<=", Ordering::is_le), (">", Ordering::is_gt), (">=", Ordering::is_ge)];
    for (symbol, holds) in order {
        engine.register_fn(symbol, move |context: NativeCallContext<'_>, a: Quantity, b: Quantity| -> Native<bool> {
            let order = a.compared(&b).map_err(|mismatch| raise(Fault::from(mismatch).at(place_of(&context))))?;
            Ok(holds(order))
        });
    }
    for symbol in ["==", "!="] {
        engine.register_fn(symbol, move |context: NativeCallContext<'_>, _: Quantity, _: Quantity| -> Native<bool> {
            refuse(&context, Misuse::Equality { operator: symbol })
        });
    }
}

fn closed_roads(engine: &mut Engine) {
    let other = |value: &Dynamic| crate::script::words::kind_of(value);
    for symbol in ["==", "!=", "<", "<=", ">", ">="] {
        engine.register_fn(symbol, move |context: NativeCallContext<'_>, _: Quantity, b: Dynamic| -> Native<bool> {
            refuse(&context, Misuse::WithOther { operator: symbol, other: other(&b) })
        });
        engine.register_fn(symbol, move |context: NativeCallContext<'_>, a: Dynamic, _: Quantity| -> Native<bool> {
            refuse(&context, Misuse::WithOther { operator: symbol, other: other(&a) })
        });
    }
    for symbol in ["+", "-", "*", "/", "+=", "-="] {
        engine.register_fn(
            symbol,
            move |context: NativeCallContext<'_>, _: Quantity, _: ImmutableString| -> Native<Quantity> {
                refuse(&context, Misuse::WithText { operator: symbol })
            },
        );
    }
    for symbol in ["-", "*", "/"] {
        engine.register_fn(
            symbol,
            move |context: NativeCallContext<'_>, _: ImmutableString, _: Quantity| -> Native<Quantity> {
                refuse(&context, Misuse::WithText { operator: symbol })
            },
        );
    }
    engine.register_fn("+", |text: ImmutableString, value: Quantity| format!("{text}{}", render::text::value(&value)));
}
