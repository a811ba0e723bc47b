//! Functions of the engine that a notebook must not have as they are.
//!
//! Some are refused (they read a clock, or show the engine's insides), some take any amount of memory in one step
//! and ask for room first, some swallow an error and now pass it on. [`register`] puts ours in their place. A
//! function that grows its argument only a little at a time needs no guard: the engine looks between steps.

use std::any::TypeId;
use std::fmt;

use rhai::{Array, Blob, Dynamic, Engine, EvalAltResult, FnPtr, ImmutableString, Map, NativeCallContext};

use crate::fault::Explain;
use crate::script::fault::raise;
use crate::script::state::Shared;
use crate::script::words;

/// Why a function of the engine is not to be had, or not for this value.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum GuardError {
    /// The result would depend on when the notebook is run.
    ReadsTheClock { function: &'static str },
    /// It shows the engine's own bookkeeping.
    ShowsTheEngine { function: &'static str },
    /// The engine's JSON has names of Rust types for values of ours, and takes memory that nobody counts.
    WritesJson,
    /// A `switch` on something that no case can be equal to.
    NotSwitchable { kind: String },
    /// `dedup` without a rule, on values that have no `==`.
    NoEquality { kind: String },
    /// A text that is no JSON.
    NotJson { why: String },
    /// The rule of a `sort` answered with something that says nothing about order.
    NotAnOrder { kind: String },
}

impl fmt::Display for GuardError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            GuardError::ReadsTheClock { function } => {
                write!(f, "{function} is refused: the result would depend on when the notebook is run")
            }
            GuardError::ShowsTheEngine { function } => write!(f, "{function} is not offered in notebooks"),
            GuardError::WritesJson => write!(f, "values are not turned into JSON in notebooks"),
            GuardError::NotSwitchable { kind } => {
                write!(f, "switch looks for identical values, and {kind} is identical to no case")
            }
            GuardError::NoEquality { kind } => write!(f, "dedup() cannot tell whether {kind} equals another"),
            GuardError::NotJson { why } => write!(f, "the text is not JSON: {why}"),
            GuardError::NotAnOrder { kind } => write!(f, "the rule of this sort answered with {kind}"),
        }
    }
}

impl Explain for GuardError {
    fn code(&self) -> &'static str {
        match self {
            GuardError::ReadsTheClock { .. } => "reads-the-clock",
            GuardError::ShowsTheEngine { .. } => "shows-the-engine",
            GuardError::WritesJson => "writes-json",
            GuardError::NotSwitchable { .. } => "not-switchable",
            GuardError::NoEquality { .. } => "no-equality",
            GuardError::NotJson { .. } => "not-json",
            GuardError::NotAnOrder { .. } => "not-an-order",
        }
    }

    fn hint(&self) -> String {
        match self {
            GuardError::ReadsTheClock { .. } => "leave it out; a date belongs in the text of the notebook",
            GuardError::ShowsTheEngine { .. } => "complete or inspect names in the notebook's own front end",
            GuardError::WritesJson => "print what is wanted; `hessbook run --format json` gives every report",
            GuardError::NotSwitchable { .. } => "use if … else if …, or make it a whole number with to_int()",
            GuardError::NoEquality { .. } => "give the rule: dedup(|a, b| …), true where b is to be dropped",
            GuardError::NotJson { .. } => {
                "names and texts stand in double quotes, and nothing stands behind a last comma"
            }
            GuardError::NotAnOrder { .. } => "answer with a number, below zero where a comes first: sort(|a, b| a - b)",
        }
        .to_owned()
    }
}

type Outcome<T> = Result<T, Box<EvalAltResult>>;

/// Bytes that one value of an array takes, whatever it is; texts and arrays take more elsewhere.
const VALUE: usize = size_of::<Dynamic>();

/// Refuses, replaces and guards.
pub fn register(engine: &mut Engine, shared: &Shared) {
    refuse(engine);
    register_switch(engine);
    register_dedup(engine);
    register_sort(engine);
    let guard = Guard(shared.clone());
    register_bytes(engine, &guard);
    register_text(engine, &guard);
    register_arrays(engine, &guard);
}

fn refuse(engine: &mut Engine) {
    let clock = |function| move || -> Outcome<Dynamic> { Err(raise(GuardError::ReadsTheClock { function })) };
    engine.register_fn("timestamp", clock("timestamp()"));
    let json = || -> Outcome<Dynamic> { Err(raise(GuardError::WritesJson)) };
    engine.register_fn("to_json", move |_: &mut Map| json());
    let pause = clock("sleep()");
    engine.register_fn("sleep", move |_: i64| pause());
    engine.register_fn("sleep", move |_: f64| pause());
    let insides =
        || -> Outcome<Dynamic> { Err(raise(GuardError::ShowsTheEngine { function: "get_fn_metadata_list()" })) };
    engine.register_fn("get_fn_metadata_list", insides);
    engine.register_fn("get_fn_metadata_list", move |_: &str| insides());
    engine.register_fn("get_fn_metadata_list", move |_: &str, _: i64| insides());
}

/// The value of a `switch` passes through here. The engine compares bits: 3.0 is not its case 3, and a value of ours
/// is no case at all, so that the default would be taken without a word.
fn register_switch(engine: &mut Engine) {
    engine.register_raw_fn(super::prepare::SWITCHABLE, [TypeId::of::<Dynamic>()], |_, arguments| {
        let value = arguments[0].flatten_clone();
        if switchable(&value) {
            Ok(value)
        } else {
            Err(raise(GuardError::NotSwitchable { kind: words::kind_of(&value) }))
        }
    });
}

fn switchable(value: &Dynamic) -> bool {
    let plain = value.is_unit() || value.is_bool() || value.is_int() || value.is_char() || value.is_string();
    plain || value.read_lock::<Array>().is_some_and(|array| array.iter().all(switchable))
}

/// The engine's own takes an error in the comparison for "not equal".
fn register_dedup(engine: &mut Engine) {
    let array = TypeId::of::<Array>();
    engine.register_raw_fn("dedup", [array], |context, arguments| {
        let items = arguments[0].as_array_ref()?.clone();
        let odd = items.iter().find(|item| item.is_variant() || item.is_fnptr());
        if let Some(odd) = odd {
            return Err(raise(GuardError::NoEquality { kind: words::kind_of(odd) }));
        }
        let kept = without_repeats(items, |before, item| {
            let same = context.call_native_fn_raw("==", true, &mut [&mut before.clone(), &mut item.clone()])?;
            Ok(same.as_bool()?)
        })?;
        *arguments[0].as_array_mut()? = kept;
        Ok(())
    });
    engine.register_raw_fn("dedup", [array, TypeId::of::<FnPtr>()], |context, arguments| {
        let rule = arguments[1].flatten_clone().cast::<FnPtr>();
        let items = arguments[0].as_array_ref()?.clone();
        let kept = without_repeats(items, |before, item| {
            rule.call_within_context::<bool>(&context, (before.clone(), item.clone()))
        })?;
        *arguments[0].as_array_mut()? = kept;
        Ok(())
    });
}

/// The items that do not repeat the one kept before them.
fn without_repeats(items: Array, mut same: impl FnMut(&Dynamic, &Dynamic) -> Outcome<bool>) -> Outcome<Array> {
    let mut kept = Array::new();
    for item in items {
        let repeats = match kept.last() {
            Some(before) => same(before, &item)?,
            None => false,
        };
        if !repeats {
            kept.push(item);
        }
    }
    Ok(kept)
}

/// The engine's own goes on with any order when the rule fails or answers with a number that has a point, and also
/// when the cell was interrupted.
fn register_sort(engine: &mut Engine) {
    let kinds = [TypeId::of::<Array>(), TypeId::of::<FnPtr>()];
    for name in ["sort", "sort_by"] {
        engine.register_raw_fn(name, kinds, |context, arguments| {
            let sorted = sorted(&context, arguments)?;
            *arguments[0].as_array_mut()? = sorted;
            Ok(())
        });
    }
    for name in ["order", "order_by"] {
        engine.register_raw_fn(name, kinds, |context, arguments| sorted(&context, arguments));
    }
}

fn sorted(context: &NativeCallContext<'_>, arguments: &[&mut Dynamic]) -> Outcome<Array> {
    let rule = arguments[1].flatten_clone().cast::<FnPtr>();
    let items = arguments[0].as_array_ref()?.clone();
    merge_sort(items, &mut |left, right| {
        let answer: Dynamic = rule.call_within_context(context, (left.clone(), right.clone()))?;
        // What the engine documents: a number below, at or above zero, or true where the left one comes first.
        let first = answer.as_int().map(|sign| sign <= 0).or_else(|_| answer.as_float().map(|sign| sign <= 0.0));
        first.or_else(|_| answer.as_bool()).map_err(|_| raise(GuardError::NotAnOrder { kind: words::kind_of(&answer) }))
    })
}

/// Stable. Written out because the standard library's sorts take no rule that can fail, and panic on a rule that
/// contradicts itself.
fn merge_sort(mut items: Array, first: &mut impl FnMut(&Dynamic, &Dynamic) -> Outcome<bool>) -> Outcome<Array> {
    if items.len() < 2 {
        return Ok(items);
    }
    let right = items.split_off(items.len() / 2);
    let mut left = merge_sort(items, first)?.into_iter().peekable();
    let mut right = merge_sort(right, first)?.into_iter().peekable();
    let mut merged = Array::with_capacity(left.len() + right.len());
    while let (Some(a), Some(b)) = (left.peek(), right.peek()) {
        let take_left = first(a, b)?;
        merged.extend(if take_left { left.next() } else { right.next() });
    }
    merged.extend(left);
    merged.extend(right);
    Ok(merged)
}

/// Asks for room before memory is taken.
#[derive(Clone)]
struct Guard(Shared);

impl Guard {
    fn room(&self, count: usize, bytes_each: usize) -> Outcome<()> {
        self.0.room_for(count.saturating_mul(bytes_each)).map_err(raise)
    }

    /// A length from a script, zero for negative ones.
    fn length(length: i64) -> usize {
        usize::try_from(length).unwrap_or(0)
    }
}

#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)]
const fn byte(value: i64) -> u8 {
    // The engine's own rule: the lowest eight bits.
    (value & 0xFF) as u8
}

fn register_bytes(engine: &mut Engine, guard: &Guard) {
    let ask = guard.clone();
    engine.register_fn("blob", move |length: i64| {
        ask.room(Guard::length(length), 1).map(|()| vec![0_u8; Guard::length(length)])
    });
    let ask = guard.clone();
    engine.register_fn("blob", move |length: i64, value: i64| {
        ask.room(Guard::length(length), 1).map(|()| vec![byte(value); Guard::length(length)])
    });
    let ask = guard.clone();
    engine.register_fn("pad", move |bytes: &mut Blob, length: i64, value: i64| {
        let length = Guard::length(length).max(bytes.len());
        ask.room(length, 1).map(|()| bytes.resize(length, byte(value)))
    });
    let ask = guard.clone();
    engine.register_raw_fn("to_array", [TypeId::of::<Blob>()], move |_, arguments| {
        let bytes = arguments[0].as_blob_ref()?;
        ask.room(bytes.len(), VALUE)?;
        Ok(bytes.iter().map(|byte| Dynamic::from_int(i64::from(*byte))).collect::<Array>())
    });
}

fn register_text(engine: &mut Engine, guard: &Guard) {
    let ask = guard.clone();
    engine.register_fn("+", move |left: &str, right: &str| {
        ask.room(left.len() + right.len(), 1).map(|()| ImmutableString::from([left, right].concat()))
    });
    let ask = guard.clone();
    engine.register_fn("+=", move |left: &mut ImmutableString, right: &str| {
        ask.room(left.len() + right.len(), 1).map(|()| *left += right)
    });
    let ask = guard.clone();
    engine.register_fn("pad", move |text: &mut ImmutableString, length: i64, character: char| {
        pad(&ask, text, length, &character.to_string())
    });
    let ask = guard.clone();
    engine.register_fn("pad", move |text: &mut ImmutableString, length: i64, filling: &str| {
        pad(&ask, text, length, filling)
    });
    let ask = guard.clone();
    engine.register_fn("to_chars", move |text: &str| {
        ask.room(text.len(), VALUE)?;
        Ok::<_, Box<EvalAltResult>>(text.chars().map(Dynamic::from).collect::<Array>())
    });
    let ask = guard.clone();
    engine.register_fn("parse_json", move |text: &str| {
        // The densest JSON, `[1,1,…]`, makes a value of two bytes.
        ask.room(text.len() / 2, VALUE)?;
        serde_json::from_str::<Dynamic>(text).map_err(|error| raise(GuardError::NotJson { why: error.to_string() }))
    });
    register_replace(engine, guard);
    register_split(engine, guard);
}

/// Lengthens a text to a number of characters.
fn pad(guard: &Guard, text: &mut ImmutableString, length: i64, filling: &str) -> Outcome<()> {
    let missing = Guard::length(length).saturating_sub(text.chars().count());
    if missing == 0 || filling.is_empty() {
        return Ok(());
    }
    // Four bytes are the most a character takes.
    guard.room(missing, 4)?;
    let padded: String = text.chars().chain(filling.chars().cycle().take(missing)).collect();
    *text = padded.into();
    Ok(())
}

fn register_replace(engine: &mut Engine, guard: &Guard) {
    let ask = guard.clone();
    let replace = move |text: &mut ImmutableString, piece: &str, with: &str| {
        ask.room(text.matches(piece).count(), with.len())?;
        *text = text.replace(piece, with).into();
        Ok::<_, Box<EvalAltResult>>(())
    };
    let by = replace.clone();
    engine.register_fn("replace", move |text: &mut ImmutableString, piece: &str, with: &str| by(text, piece, with));
    let by = replace.clone();
    engine.register_fn("replace", move |text: &mut ImmutableString, piece: &str, with: char| {
        by(text, piece, with.encode_utf8(&mut [0; 4]))
    });
    let by = replace.clone();
    engine.register_fn("replace", move |text: &mut ImmutableString, piece: char, with: &str| {
        by(text, piece.encode_utf8(&mut [0; 4]), with)
    });
    engine.register_fn("replace", move |text: &mut ImmutableString, piece: char, with: char| {
        replace(text, piece.encode_utf8(&mut [0; 4]), with.encode_utf8(&mut [0; 4]))
    });
}

fn register_split(engine: &mut Engine, guard: &Guard) {
    let ask = guard.clone();
    engine.register_fn("split", move |text: &str| {
        let count = text.split_whitespace().count();
        pieces(&ask, text, count, text.split_whitespace())
    });
    for (name, reversed) in [("split", false), ("split_rev", true)] {
        let ask = guard.clone();
        let split = move |text: &str, mark: &str| {
            let count = text.matches(mark).count() + 1;
            if reversed {
                pieces(&ask, text, count, text.rsplit(mark))
            } else {
                pieces(&ask, text, count, text.split(mark))
            }
        };
        let by = split.clone();
        engine.register_fn(name, move |text: &str, mark: &str| by(text, mark));
        engine.register_fn(name, move |text: &str, mark: char| split(text, mark.encode_utf8(&mut [0; 4])));
    }
}

fn pieces<'a>(guard: &Guard, text: &str, count: usize, pieces: impl Iterator<Item = &'a str>) -> Outcome<Array> {
    // Each piece is a value and a text of its own, counters included; together they hold the text's bytes again.
    guard.room(count.saturating_mul(VALUE + 2 * size_of::<ImmutableString>() + size_of::<String>()), 1)?;
    guard.room(text.len(), 1)?;
    Ok(pieces.map(|piece| Dynamic::from(piece.to_owned())).collect())
}

fn register_arrays(engine: &mut Engine, guard: &Guard) {
    let array = TypeId::of::<Array>();
    let ask = guard.clone();
    engine.register_raw_fn("pad", [array, TypeId::of::<i64>(), TypeId::of::<Dynamic>()], move |_, arguments| {
        let length = Guard::length(arguments[1].as_int()?);
        let filling = arguments[2].flatten_clone();
        let mut array = arguments[0].as_array_mut()?;
        let missing = length.saturating_sub(array.len());
        ask.room(missing, VALUE + depth_in_bytes(&filling))?;
        array.extend(std::iter::repeat_n(filling, missing));
        Ok(())
    });
    let ask = guard.clone();
    engine.register_fn("+", move |mut left: Array, right: Array| {
        ask.room(left.len() + right.len(), VALUE)?;
        left.extend(right);
        Ok::<_, Box<EvalAltResult>>(left)
    });
    for name in ["+=", "append"] {
        let ask = guard.clone();
        engine.register_fn(name, move |left: &mut Array, right: Array| {
            ask.room(left.len() + right.len(), VALUE).map(|()| left.extend(right))
        });
    }
}

/// Bytes a value holds elsewhere, which each of its copies takes again.
fn depth_in_bytes(value: &Dynamic) -> usize {
    if let Some(array) = value.read_lock::<Array>() {
        array.iter().map(|item| VALUE + depth_in_bytes(item)).sum()
    } else if let Some(map) = value.read_lock::<rhai::Map>() {
        map.iter().map(|(key, item)| key.len() + 2 * VALUE + depth_in_bytes(item)).sum()
    } else if let Some(bytes) = value.read_lock::<Blob>() {
        bytes.len()
    } else {
        0
    }
}
