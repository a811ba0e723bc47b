//! Faults into and out of the engine, and the engine's own errors in the words of this program.
//!
//! [`raise`] sends a fault through the engine, [`translate`] turns whatever came out into a [`Fault`] with its place
//! and call chain. The surprise: an engine error that a script catches reaches it as text, so [`register`]'s function
//! reads the engine's wording back; that wording is pinned with the engine's version and tested.

use rhai::{Dynamic, Engine, EvalAltResult, FnPtr, Map, NativeCallContext, ParseError, Position, Scope};

use crate::fault::{Fault, Place};
use crate::model::CARDS;
use crate::script::modules;
use crate::script::prepare::CAUGHT;
use crate::script::script_error::{ScriptError, count};
use crate::script::show;
use crate::script::state::Shared;
use crate::script::syntax::SyntaxError;
use crate::script::words;

/// Calls shown of a long chain: this many at its inner and at its outer end.
const CALLS_SHOWN: usize = 4;

/// Sends a fault through the engine. Scripts may catch it; the session gets it back whole.
pub fn raise(fault: impl Into<Fault>) -> Box<EvalAltResult> {
    Box::new(EvalAltResult::ErrorRuntime(Dynamic::from(fault.into()), Position::NONE))
}

/// What is known around an error.
#[derive(Clone, Copy)]
pub struct Site<'a> {
    /// Source whose positions the outermost error carries.
    pub cell: &'a str,
    pub shared: &'a Shared,
    /// Variables of the session and of the cell so far, where they are known.
    pub scope: Option<&'a Scope<'a>>,
}

impl Site<'_> {
    fn holds_function(&self, name: &str) -> bool {
        let value = self.scope.and_then(|scope| scope.get(name));
        value.is_some_and(|value| value.read_lock::<FnPtr>().is_some())
    }
}

/// A text that does not parse as a fault. `code` is what the user wrote.
pub fn translate_syntax(error: &ParseError, code: &str, cell: &str, shared: &Shared) -> Fault {
    let place = shared.place(cell, error.position());
    let spot = place.as_ref().map(|place| (place.line as usize, place.column as usize));
    Fault::from(SyntaxError::new(error.err_type(), code, spot)).at(place)
}

/// The engine's error as a fault, with place and call chain.
pub fn translate(error: EvalAltResult, site: Site<'_>) -> Fault {
    let mut calls: Vec<(String, Option<Place>)> = Vec::new();
    let mut source = site.cell.to_owned();
    let mut error = error;
    let mut in_function = false;
    let mut in_module = None;
    loop {
        match error {
            EvalAltResult::ErrorInFunctionCall(name, inner_source, inner, position) => {
                calls.push((words::function_name(&name).to_owned(), site.shared.place(&source, position)));
                in_function |= site.shared.defined(&name).is_some();
                in_module = site.shared.module_of(&inner_source);
                // A native function that calls back names no source: what it calls names its own.
                if !inner_source.is_empty() {
                    source = inner_source;
                }
                error = *inner;
            }
            EvalAltResult::ErrorInModule(_, inner, _) => error = *inner,
            _ => break,
        }
    }
    let place = site.shared.place(&source, error.position());
    let place = place.or_else(|| calls.last().and_then(|(_, place)| place.clone()));
    let within = Within { function: in_function, module: in_module };
    let fault = reword(error, site, &within).at(place);
    calls.reverse();
    let hidden = if calls.len() > 2 * CALLS_SHOWN + 1 { CALLS_SHOWN..calls.len() - CALLS_SHOWN } else { 0..0 };
    calls.into_iter().enumerate().fold(fault, |fault, (index, (name, place))| {
        if !hidden.contains(&index) {
            fault.within(name, place)
        } else if index == hidden.start {
            fault.within(format!("{} more calls", hidden.len()), None)
        } else {
            fault
        }
    })
}

/// Inside what an error came up.
#[derive(Default)]
struct Within {
    /// A function of a cell.
    function: bool,
    /// The module whose function it was.
    module: Option<String>,
}

/// The innermost error, without place and calls.
fn reword(error: EvalAltResult, site: Site<'_>, within: &Within) -> Fault {
    use EvalAltResult as E;
    let reworded = match error {
        E::ErrorRuntime(value, _) | E::ErrorTerminated(value, _) => return thrown(value),
        E::ErrorParsing(error, _) => return SyntaxError::new(&error, "", None).into(),
        E::ErrorFunctionNotFound(call, _) => function_not_found(&call, site),
        E::ErrorVariableNotFound(name, _) => variable_not_found(name, site, within),
        E::ErrorModuleNotFound(name, _) => ScriptError::UnknownModule { name, near: None },
        E::ErrorPropertyNotFound(name, _) => ScriptError::MissingEntry { name },
        E::ErrorIndexNotFound(index, _) => ScriptError::MissingEntry { name: show::plain(&index) },
        E::ErrorDotExpr(text, _) => property_error(&text),
        E::ErrorIndexingType(text, _) => {
            let of = text.split(" [").next().unwrap_or("");
            ScriptError::NotIndexable { what: words::kind(of) }
        }
        E::ErrorArrayBounds(length, index, _) => ScriptError::OutOfRange { of: "array", index, length },
        E::ErrorStringBounds(length, index, _) => ScriptError::OutOfRange { of: "text", index, length },
        E::ErrorBitFieldBounds(length, index, _) => ScriptError::OutOfRange { of: "whole number", index, length },
        E::ErrorMismatchDataType(wanted, given, _) | E::ErrorMismatchOutputType(wanted, given, _) => {
            ScriptError::WrongKind { wanted: words::kind(&wanted), given: words::kind(&given) }
        }
        E::ErrorFor(_) => ScriptError::NotIterable,
        E::ErrorAssignmentToConstant(name, _) => ScriptError::Constant { name },
        E::ErrorNonPureMethodCallOnConstant(..) => ScriptError::Constant { name: String::new() },
        E::ErrorDataRace(..) => ScriptError::InUse,
        E::ErrorUnboundThis(_) => ScriptError::NoThis,
        E::ErrorStackOverflow(_) => ScriptError::TooDeep,
        E::ErrorArithmetic(text, _) => ScriptError::Other { text },
        mut other => ScriptError::Other { text: other.clear_position().to_string() },
    };
    reworded.into()
}

/// What a script threw, or what a function of ours raised.
fn thrown(value: Dynamic) -> Fault {
    if let Some(fault) = value.read_lock::<Fault>() {
        return fault.clone();
    }
    if let Some(map) = value.read_lock::<Map>() {
        let entry = |name: &str| map.get(name).map(show::plain);
        let message = match (entry("code"), entry("message")) {
            (Some(code), Some(message)) => format!("{code}: {message}"),
            (Some(one), None) | (None, Some(one)) => one,
            (None, None) => show::inline(&value),
        };
        return ScriptError::Thrown { message, hint: entry("hint") }.into();
    }
    let message = if value.is_unit() { "the script stopped itself with throw".to_owned() } else { show::plain(&value) };
    ScriptError::Thrown { message, hint: None }.into()
}

fn function_not_found(call: &str, site: Site<'_>) -> ScriptError {
    // The engine reports what it cannot sort in the place of a function's name.
    if call.starts_with("elements of different types") {
        return ScriptError::Unsortable { unlike: true };
    }
    if call.starts_with("elements of ") {
        return ScriptError::Unsortable { unlike: false };
    }
    let (name, types) = words::split_call(call);
    let given: Vec<String> = types.iter().map(|name| words::kind(name)).collect();
    if words::is_closure(name) {
        return ScriptError::ClosureArguments { given: given.len() };
    }
    if let Some((module, function)) = name.rsplit_once("::") {
        return modules::not_in_module(site.shared, module, function, Some(given.len()));
    }
    let name = name.to_owned();
    if !name.starts_with(|c: char| c.is_alphabetic() || c == '_') {
        return ScriptError::Operator { op: name, operands: given };
    }
    if site.holds_function(&name) {
        return ScriptError::CalledVariable { name };
    }
    if let Some(counts) = site.shared.defined(&name) {
        let takes = counts.into_iter().map(|number| count(number, "argument")).collect();
        return ScriptError::ArgumentCount { name, given: given.len(), takes };
    }
    let library = site.shared.library();
    if library.holds(&name) {
        let fitting = library.forms(&name, Some(given.len()));
        let written: Vec<String> = CARDS.iter().filter(|card| card.name == name).map(|card| card.signature()).collect();
        return if fitting.is_empty() && !written.is_empty() {
            ScriptError::FormulaArguments { name, written }
        } else if fitting.is_empty() {
            ScriptError::ArgumentCount { given: given.len(), takes: library.forms(&name, None), name }
        } else {
            ScriptError::WrongArguments { name, given, takes: fitting }
        };
    }
    let defined = site.shared.defined_names();
    let near = words::nearest(&name, library.names().chain(defined.iter().map(String::as_str)));
    ScriptError::UnknownFunction { near: near.map(str::to_owned), name }
}

fn variable_not_found(name: String, site: Site<'_>, within: &Within) -> ScriptError {
    if let Some(constant) = name.strip_prefix("global::") {
        return ScriptError::OutsideFunction { name: constant.to_owned() };
    }
    if let Some((module, constant)) = name.rsplit_once("::") {
        return modules::not_in_module(site.shared, module, constant, None);
    }
    if let Some(module) = &within.module {
        let own = site.shared.state().modules.get(module).is_some_and(|module| module.has_constant(&name));
        return if own { ScriptError::OwnConstant { name } } else { ScriptError::UnknownVariable { name, near: None } };
    }
    let Some(scope) = site.scope else {
        return ScriptError::UnknownVariable { name, near: None };
    };
    if within.function && scope.contains(&name) {
        return ScriptError::OutsideFunction { name };
    }
    let defined = site.shared.defined_names();
    let known = scope.iter_raw().map(|(name, _, _)| name).chain(defined.iter().map(String::as_str));
    let near = words::nearest(&name, known).map(str::to_owned);
    ScriptError::UnknownVariable { name, near }
}

/// The engine keeps property and type inside a sentence, each in quotes.
fn property_error(text: &str) -> ScriptError {
    let quoted: Vec<&str> = text.split('\'').skip(1).step_by(2).collect();
    match quoted.as_slice() {
        [name, of] if text.starts_with("Unknown property") => {
            ScriptError::UnknownProperty { name: (*name).to_owned(), of: words::kind(of) }
        }
        [name, of, ..] if text.starts_with("No writable property") => {
            ScriptError::ReadOnlyProperty { name: (*name).to_owned(), of: words::kind(of) }
        }
        _ => ScriptError::Other { text: text.to_owned() },
    }
}

/// Makes faults values of scripts, and the function that completes `catch (e)`.
pub fn register(engine: &mut Engine) {
    engine.register_type_with_name::<Fault>("fault");
    engine.register_get("code", |fault: &mut Fault| fault.code().to_owned());
    engine.register_get("message", |fault: &mut Fault| fault.message().to_owned());
    engine.register_get("hint", |fault: &mut Fault| fault.hint().to_owned());
    engine.register_get("place", |fault: &mut Fault| fault.place().map(ToString::to_string).unwrap_or_default());
    for name in ["print", "debug", "to_string", "to_debug"] {
        engine.register_fn(name, |fault: &mut Fault| fault.message().to_owned());
    }
    engine.register_fn(CAUGHT, |context: NativeCallContext<'_>, value: Dynamic| {
        let engine_error = value.read_lock::<Map>().and_then(|map| read_back(&map));
        let shared = Shared::of(&context);
        let (Some(read), Some(shared)) = (engine_error, shared) else { return value };
        let cell = read.source.unwrap_or_else(|| context.call_source().unwrap_or("").to_owned());
        let site = Site { cell: &cell, shared: &shared, scope: None };
        let place = shared.place(&cell, read.position);
        Dynamic::from(reword(read.error, site, &Within::default()).at(place))
    });
}

/// An engine error as it was before a `catch` turned it into text.
struct ReadBack {
    error: EvalAltResult,
    source: Option<String>,
    position: Position,
}

/// Reads the map that the engine makes of an error of its own; `None` for a map that a script threw.
fn read_back(map: &Map) -> Option<ReadBack> {
    let text = |name: &str| map.get(name).and_then(|value| value.clone().into_string().ok());
    let whole = |value: &Dynamic| value.as_int().ok().and_then(|number| u16::try_from(number).ok());
    if !text("error")?.starts_with("Error") {
        return None;
    }
    let message = text("message")?;
    // Inside a call the first line is the innermost error, with its source and position behind it.
    let first = message.lines().next().unwrap_or("");
    let (first, inner_position) = match first.rsplit_once(" (line ") {
        Some((before, numbers)) => (before, position_of(numbers)),
        None => (first, None),
    };
    let (sentence, source) = match first.rsplit_once(" @ '") {
        Some((before, source)) => (before, Some(source.trim_end_matches('\'').to_owned())),
        None => (first, None),
    };
    let line = map.get("line").and_then(whole);
    let column = map.get("position").and_then(whole);
    let outer_position = line.map(|line| Position::new(line, column.unwrap_or(0)));
    let position = inner_position.or(outer_position).unwrap_or(Position::NONE);
    Some(ReadBack { error: error_of(sentence), source, position })
}

/// `3, position 7)` as the engine ends a message.
fn position_of(numbers: &str) -> Option<Position> {
    let (line, column) = numbers.strip_suffix(')')?.split_once(", position ")?;
    Some(Position::new(line.parse().ok()?, column.parse().ok()?))
}

/// The error behind a sentence of the engine, without its position.
fn error_of(sentence: &str) -> EvalAltResult {
    use EvalAltResult as E;
    let none = Position::NONE;
    let rest = |prefix: &str| sentence.strip_prefix(prefix).map(str::to_owned);
    let number = |text: &str| text.split(' ').find_map(|word| word.parse::<i64>().ok());
    if let Some(call) = rest("Function not found: ") {
        E::ErrorFunctionNotFound(call, none)
    } else if let Some(name) = rest("Variable not found: ") {
        E::ErrorVariableNotFound(name, none)
    } else if let Some(name) = rest("Property not found: ") {
        E::ErrorPropertyNotFound(name, none)
    } else if let Some(name) = rest("Module not found: ") {
        E::ErrorModuleNotFound(name, none)
    } else if let Some(index) = rest("Invalid index: ") {
        E::ErrorIndexNotFound(index.into(), none)
    } else if let Some(kind) = rest("Indexer unavailable: ") {
        E::ErrorIndexingType(kind, none)
    } else if let Some((index, length)) = sentence.split_once(" out of bounds: ") {
        let length = number(length).and_then(|length| usize::try_from(length).ok()).unwrap_or(0);
        let at = number(index).unwrap_or(0);
        match index.split(' ').next() {
            Some("Array") => E::ErrorArrayBounds(length, at, none),
            Some("String") => E::ErrorStringBounds(length, at, none),
            _ => E::ErrorBitFieldBounds(length, at, none),
        }
    } else if let Some(kinds) = rest("Data type incorrect: ").or_else(|| rest("Output type incorrect: ")) {
        let (given, wanted) = kinds.split_once(" (expecting ").unwrap_or((&kinds, ""));
        E::ErrorMismatchDataType(wanted.trim_end_matches(')').to_owned(), given.to_owned(), none)
    } else if let Some(name) = rest("Cannot modify constant ") {
        E::ErrorAssignmentToConstant(name, none)
    } else if sentence.starts_with("Data race detected") {
        E::ErrorDataRace(String::new(), none)
    } else if sentence.starts_with("Non-pure ") || sentence.ends_with(" of constant") {
        E::ErrorNonPureMethodCallOnConstant(String::new(), none)
    } else if sentence == "'this' not bound" {
        E::ErrorUnboundThis(none)
    } else if sentence == "For loop expects iterable type" {
        E::ErrorFor(none)
    } else if sentence.starts_with("Unknown property '") || sentence.starts_with("No writable property '") {
        E::ErrorDotExpr(sentence.to_owned(), none)
    } else {
        E::ErrorArithmetic(sentence.to_owned(), none)
    }
}
