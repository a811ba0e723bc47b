//! Rows, lengths and arithmetic of curves in scripts.
//!
//! A curve answers `curve[i]` and `len()` as a list does, and stands in sums and products beside quantities, numbers and
//! other curves over the same grid.

use std::rc::Rc;

use rhai::{Engine, NativeCallContext};

use crate::model::curve::{Arithmetic, Curve, Function, Side};
use crate::model::grid::Grid;
use crate::quantity::Quantity;
use crate::script::bind::{Native, with_context};
use crate::script::state::{Shared, place_of};

type Shown = Rc<Curve>;

/// Registers what curves and grids answer beside their cards.
pub fn register(engine: &mut Engine, shared: &Shared) {
    engine.register_type_with_name::<Rc<Grid>>("grid");
    engine.register_type_with_name::<Shown>("curve");
    for name in ["to_string", "to_debug"] {
        engine.register_fn(name, |grid: &mut Rc<Grid>| grid.words());
        engine.register_fn(name, |curve: &mut Shown| curve.words());
    }
    // A whole number, as `0..curve.len()` wants.
    engine.register_fn("len", |grid: &mut Rc<Grid>| counted(grid.len()));
    engine.register_fn("len", |curve: &mut Shown| counted(curve.len()));
    let session = shared.clone();
    engine.register_indexer_get(
        move |context: NativeCallContext<'_>, curve: &mut Shown, row: i64| -> Native<Quantity> {
            with_context(&session, place_of(&context), |_| curve.nth(row))
        },
    );
    operators(engine, shared);
    functions(engine, shared);
}

fn counted(length: usize) -> i64 {
    i64::try_from(length).unwrap_or(i64::MAX)
}

fn operators(engine: &mut Engine, shared: &Shared) {
    let all =
        [("+", Arithmetic::Add), ("-", Arithmetic::Subtract), ("*", Arithmetic::Multiply), ("/", Arithmetic::Divide)];
    for (symbol, arithmetic) in all {
        let session = shared.clone();
        let run = move |context: &NativeCallContext<'_>, left: Side, right: Side| -> Native<Shown> {
            with_context(&session, place_of(context), |cx| Ok(Rc::new(Curve::pair(cx, arithmetic, left, right)?)))
        };
        // A macro, since the engine's bound on argument types has no public name that a generic function could state.
        macro_rules! with {
            ($other:ty, $side:expr) => {
                let (to_side, r): (fn($other) -> Side, _) = ($side, run.clone());
                engine.register_fn(symbol, move |c: NativeCallContext<'_>, a: Shown, b: $other| {
                    r(&c, Side::Curve(a), to_side(b))
                });
                let r = run.clone();
                engine.register_fn(symbol, move |c: NativeCallContext<'_>, a: $other, b: Shown| {
                    r(&c, to_side(a), Side::Curve(b))
                });
            };
        }
        with!(Quantity, Side::Quantity);
        with!(f64, Side::Number);
        with!(i64, |number| Side::Number(number as f64));
        engine.register_fn(symbol, move |c: NativeCallContext<'_>, a: Shown, b: Shown| {
            run(&c, Side::Curve(a), Side::Curve(b))
        });
    }
}

fn functions(engine: &mut Engine, shared: &Shared) {
    let all = [("-", Function::Negate), ("exp", Function::Exp), ("ln", Function::Ln), ("abs", Function::Absolute)];
    for (name, function) in all {
        let session = shared.clone();
        engine.register_fn(name, move |context: NativeCallContext<'_>, curve: Shown| -> Native<Shown> {
            with_context(&session, place_of(&context), |cx| Ok(Rc::new(Curve::single(cx, function, &curve)?)))
        });
    }
}
