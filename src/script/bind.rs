//! Every formula card as a function of the script language, and `q`, which reads quantities.
//!
//! [`register`] loops over [`model::CARDS`](crate::model::CARDS): one native function for each receiver, name and number
//! of arguments. Argument types are not spelled out to the engine; the card checks them, so that a wrong one is refused
//! in the words of the card.

use std::any::TypeId;
use std::cell::Cell;
use std::collections::BTreeMap;
use std::rc::Rc;

use rhai::{Array, Dynamic, Engine, EvalAltResult, FuncRegistration, ImmutableString, Map, NativeCallContext};

use crate::fault::{Fault, Place};
use crate::model::CARDS;
use crate::model::answer::Answer;
use crate::model::card::{self, Card, Cx, On, Value};
use crate::model::curve::Curve;
use crate::model::grid::Grid;
use crate::model::molecule::Molecule;
use crate::model::plant::stream::Stream;
use crate::model::reaction::Reaction;
use crate::model::solid::Crystal;
use crate::model::substance::PureSubstance;
use crate::model::table::Table;
use crate::quantity::{Quantity, text};
use crate::script::fault::raise;
use crate::script::state::{Shared, place_of};
use crate::source::Citation;

/// A result of a function of the script.
pub type Native<T> = Result<T, Box<EvalAltResult>>;

/// Gives the engine the program's own types, literals and formulas.
pub fn register(engine: &mut Engine, shared: &Shared) {
    engine.register_type_with_name::<Quantity>("quantity");
    engine.register_type_with_name::<Rc<Reaction>>("reaction");
    engine.register_type_with_name::<Rc<PureSubstance>>("substance");
    engine.register_type_with_name::<Rc<Stream>>("stream");
    engine.register_type_with_name::<Rc<Molecule>>("molecule");
    engine.register_type_with_name::<Rc<Crystal>>("crystal");
    for name in ["to_string", "to_debug"] {
        engine.register_fn(name, |reaction: &mut Rc<Reaction>| reaction.text().to_owned());
        engine.register_fn(name, |substance: &mut Rc<PureSubstance>| substance.text().to_owned());
        engine.register_fn(name, |molecule: &mut Rc<Molecule>| molecule.text().to_owned());
        engine.register_fn(name, |crystal: &mut Rc<Crystal>| crystal.text().to_owned());
    }
    engine.register_type_with_name::<Answer>("answer");
    // Asked for every property that has no getter of its own.
    engine.register_indexer_get(
        |context: NativeCallContext<'_>, answer: &mut Answer, name: ImmutableString| -> Native<Dynamic> {
            let part = answer.part(&name).map(from_value);
            part.map_err(|error| raise(Fault::from(error).at(place_of(&context))))
        },
    );
    typed(engine, shared);
    for card in CARDS {
        bind(engine, card, shared);
    }
}

/// Runs `work` with what a formula needs of the session; `place` is where the script called from.
pub fn with_context<T>(shared: &Shared, place: Option<Place>, work: impl FnOnce(&Cx) -> Result<T, Fault>) -> Native<T> {
    let ordinal = Cell::new(shared.state_mut().next_ordinal());
    let halted = || shared.halted().map(Fault::from);
    let references = shared.references();
    let cx = Cx { references: &references, place: place.clone(), ordinal: &ordinal, halted: &halted };
    let done = work(&cx);
    shared.state_mut().skip_ordinals_to(ordinal.get());
    done.map_err(|fault| raise(fault.at(place)))
}

fn bind(engine: &mut Engine, card: &'static Card, shared: &Shared) {
    let (least, most) = card.arity();
    for given in least..=most {
        let mut types: Vec<TypeId> = receiver(card.on).into_iter().collect();
        types.resize(types.len() + given, TypeId::of::<Dynamic>());
        let shared = shared.clone();
        let run = move |context: NativeCallContext<'_>, args: &mut [&mut Dynamic]| -> Native<Dynamic> {
            let values = args.iter().map(|arg| to_value(arg)).collect();
            with_context(&shared, place_of(&context), |cx| card::call(cx, card, values)).map(from_value)
        };
        engine.register_raw_fn(card.name, &types, run);
    }
}

fn receiver(on: On) -> Option<TypeId> {
    match on {
        On::Nothing => None,
        On::Quantity => Some(TypeId::of::<Quantity>()),
        On::Reaction => Some(TypeId::of::<Rc<Reaction>>()),
        On::Substance => Some(TypeId::of::<Rc<PureSubstance>>()),
        On::Molecule => Some(TypeId::of::<Rc<Molecule>>()),
        On::Crystal => Some(TypeId::of::<Rc<Crystal>>()),
        On::Curve => Some(TypeId::of::<Rc<Curve>>()),
        On::Table => Some(TypeId::of::<Rc<Table>>()),
    }
}

/// A script's value as a formula takes it. What no formula takes becomes a text that names its type, and is refused.
pub fn to_value(value: &Dynamic) -> Value {
    if let Some(quantity) = value.read_lock::<Quantity>() {
        return Value::Quantity(quantity.clone());
    }
    if let Some(reaction) = value.read_lock::<Rc<Reaction>>() {
        return Value::Reaction(Rc::clone(&reaction));
    }
    if let Some(substance) = value.read_lock::<Rc<PureSubstance>>() {
        return Value::Substance(Rc::clone(&substance));
    }
    if let Some(stream) = value.read_lock::<Rc<Stream>>() {
        return Value::Stream(Rc::clone(&stream));
    }
    if let Some(molecule) = value.read_lock::<Rc<Molecule>>() {
        return Value::Molecule(Rc::clone(&molecule));
    }
    if let Some(crystal) = value.read_lock::<Rc<Crystal>>() {
        return Value::Crystal(Rc::clone(&crystal));
    }
    if let Some(grid) = value.read_lock::<Rc<Grid>>() {
        return Value::Grid(Rc::clone(&grid));
    }
    if let Some(curve) = value.read_lock::<Rc<Curve>>() {
        return Value::Curve(Rc::clone(&curve));
    }
    if let Some(table) = value.read_lock::<Rc<Table>>() {
        return Value::Table(Rc::clone(&table));
    }
    if let Some(answer) = value.read_lock::<Answer>() {
        return Value::Answer(answer.clone());
    }
    if let Some(text) = value.read_lock::<ImmutableString>() {
        return Value::Text(text.as_str().into());
    }
    if let Some(array) = value.read_lock::<Array>() {
        return Value::List(array.iter().map(to_value).collect());
    }
    if let Some(map) = value.read_lock::<Map>() {
        let options: BTreeMap<String, Value> =
            map.iter().map(|(name, value)| (name.to_string(), to_value(value))).collect();
        return Value::Options(Rc::new(options));
    }
    if let Ok(number) = value.as_float() {
        return Value::Number(number);
    }
    if let Ok(whole) = value.as_int() {
        return Value::Number(whole as f64);
    }
    if let Ok(flag) = value.as_bool() {
        return Value::Flag(flag);
    }
    if value.is_unit() { Value::Nothing } else { Value::Other(crate::script::words::kind_of(value).into()) }
}

pub fn from_value(value: Value) -> Dynamic {
    match value {
        Value::Quantity(quantity) => Dynamic::from(quantity),
        Value::Number(number) => Dynamic::from_float(number),
        Value::Flag(flag) => Dynamic::from_bool(flag),
        Value::Text(text) | Value::Other(text) => Dynamic::from(ImmutableString::from(&*text)),
        Value::List(list) => Dynamic::from_array(list.into_iter().map(from_value).collect()),
        Value::Options(options) => Dynamic::from_map(
            options.iter().map(|(name, value)| (name.as_str().into(), from_value(value.clone()))).collect(),
        ),
        Value::Reaction(reaction) => Dynamic::from(reaction),
        Value::Substance(substance) => Dynamic::from(substance),
        Value::Stream(stream) => Dynamic::from(stream),
        Value::Molecule(molecule) => Dynamic::from(molecule),
        Value::Crystal(crystal) => Dynamic::from(crystal),
        Value::Grid(grid) => Dynamic::from(grid),
        Value::Curve(curve) => Dynamic::from(curve),
        Value::Table(table) => Dynamic::from(table),
        Value::Answer(answer) => Dynamic::from(answer),
        Value::Nothing => Dynamic::UNIT,
    }
}

/// `q("-285.830(20) kJ/mol")`: the one form that keeps typed digits and their uncertainty; with a second text, the source of
/// the figure. `exact("2 mol[H2]/mol[O2]")`: a figure that is exact by definition or by counting.
fn typed(engine: &mut Engine, shared: &Shared) {
    let read = |shared: &Shared, context: &NativeCallContext<'_>, written: &str, more: More<'_>| -> Native<Quantity> {
        let place = place_of(context);
        let ordinal = shared.state_mut().next_ordinal();
        let made = text::parse(written, place.clone(), ordinal).map_err(Fault::from);
        let made = made.and_then(|value| match more {
            More::Nothing => Ok(value),
            More::Source(source) => Ok(value.with_input(|input| input.citation = Some(Citation::new(source, "")))),
            More::Exact if value.node().input().is_some_and(|input| input.u.is_some()) => Err(Fault::new(
                "exact-with-uncertainty",
                format!("`{written}` states an uncertainty, and an exact figure has none"),
                "write it without, or use `q`",
            )),
            More::Exact => Ok(value.with_input(|input| {
                input.u = Some(0.0);
                input.digit = None;
            })),
        });
        made.map_err(|fault| raise(fault.at(place)))
    };
    let session = shared.clone();
    FuncRegistration::new("q")
        .with_comments(["/// A quantity as written: number, uncertainty in brackets, unit."])
        .register_into_engine(engine, move |context: NativeCallContext<'_>, written: ImmutableString| {
            read(&session, &context, &written, More::Nothing)
        });
    let session = shared.clone();
    FuncRegistration::new("q")
        .with_comments(["/// A quantity as written, with the source of the figure."])
        .register_into_engine(
            engine,
            move |context: NativeCallContext<'_>, written: ImmutableString, source: ImmutableString| {
                read(&session, &context, &written, More::Source(&source))
            },
        );
    let session = shared.clone();
    FuncRegistration::new("exact")
        .with_comments(["/// A figure that is exact by definition or by counting, such as a ratio of moles."])
        .register_into_engine(engine, move |context: NativeCallContext<'_>, written: ImmutableString| {
            read(&session, &context, &written, More::Exact)
        });
    engine.register_fn("q", |written: Quantity| written);
}

/// What is said of a typed figure besides its text.
enum More<'a> {
    Nothing,
    Source(&'a str),
    Exact,
}
