//! Arguments of a formula as its card wants them: texts read as quantities, words and options checked, defaults filled in.
//!
//! [`checked`] is asked once for each argument of a call. The surprise: a map of options is checked by the same code, since
//! an option is an argument with a name.

use std::collections::BTreeMap;
use std::rc::Rc;

use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Card, Cx, Default, Takes, Value, listed};
use crate::quantity::{Mismatch, Quantity, text};
use crate::units::{self, What, parse as unit_parse};

/// An argument that does not suit its formula.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum ArgumentError {
    #[error("`{function}` wants {wanted} for `{argument}`, not {given}")]
    Sort { function: &'static str, argument: &'static str, wanted: String, given: String },
    #[error("`{function}` was given {given} arguments and takes {}", counts(*least, *most))]
    Count { function: &'static str, given: usize, least: usize, most: usize, usage: String },
    #[error("`{function}` knows no option `{option}`")]
    Option { function: &'static str, option: String, known: String },
    #[error("`{function}` was not given `{option}`")]
    OptionMissing { function: &'static str, option: &'static str, doc: &'static str },
    #[error("`{word}` is no choice for `{argument}` of `{function}`")]
    Word { function: &'static str, argument: &'static str, word: String, choices: String },
    #[error("a difference of {difference_k} K was given to `{function}` where a temperature is wanted")]
    Difference { function: &'static str, difference_k: f64 },
    #[error("{t_k} K is not a temperature above absolute zero, as `{function}` wants")]
    NotPositive { function: &'static str, t_k: f64 },
}

fn counts(least: usize, most: usize) -> String {
    if least == most { least.to_string() } else { format!("{least} to {most}") }
}

impl Explain for ArgumentError {
    fn code(&self) -> &'static str {
        match self {
            ArgumentError::Sort { .. } => "argument-sort",
            ArgumentError::Count { .. } => "formula-argument-count",
            ArgumentError::Option { .. } => "option-unknown",
            ArgumentError::OptionMissing { .. } => "option-missing",
            ArgumentError::Word { .. } => "word-unknown",
            ArgumentError::Difference { .. } => "difference-for-point",
            ArgumentError::NotPositive { .. } => "temperature-not-positive",
        }
    }

    fn hint(&self) -> String {
        match self {
            ArgumentError::Sort { wanted, .. } => format!("give {wanted}"),
            ArgumentError::Count { usage, .. } => format!("use it as in `{usage}`"),
            ArgumentError::Option { known, .. } => format!("its options are {known}"),
            ArgumentError::OptionMissing { option, doc, .. } => format!("add `{option}:`, {doc}"),
            ArgumentError::Word { choices, .. } => format!("choose one of {choices}"),
            ArgumentError::Difference { .. } => "give the temperature itself, as in `q(\"450 degC\")`".to_owned(),
            ArgumentError::NotPositive { .. } => "check the sign and the scale of the temperature".to_owned(),
        }
    }
}

pub(super) fn checked(cx: &Cx, card: &'static Card, arg: &'static Arg, value: Value) -> Result<Value, Fault> {
    let refused = |wanted: &str, value: &Value| {
        let given = value.sort().to_owned();
        Fault::from(ArgumentError::Sort { function: card.name, argument: arg.name, wanted: wanted.to_owned(), given })
    };
    Ok(match (&arg.takes, value) {
        (_, Value::Nothing) if matches!(arg.default, Default::Absent) => Value::Nothing,
        (Takes::Any, value) => value,
        (Takes::Quantity { unit }, value) => {
            let wanted = unit_parse::unit(unit)?;
            let quantity = as_quantity(cx, value, |v| refused("a quantity", v))?;
            let fits = quantity.dim() == &wanted.dim || wanted.dim.bindings_to(quantity.dim()).len() == 1;
            if !fits {
                return Err(Mismatch::unit(quantity.dim(), &wanted).into());
            }
            Value::Quantity(quantity)
        }
        (Takes::AnyQuantity, value) => Value::Quantity(as_quantity(cx, value, |v| refused("a quantity", v))?),
        (Takes::Temperatures, Value::Grid(grid)) => Value::Grid(grid),
        (Takes::Temperature | Takes::Temperatures, value) => {
            let wanted = "a temperature, as in `q(\"450 degC\")`";
            let quantity = as_quantity(cx, value, |v| refused(wanted, v))?;
            Value::Quantity(as_point(card, arg, quantity)?)
        }
        (Takes::Number, Value::Number(number)) => Value::Number(number),
        (Takes::Number, Value::Quantity(value)) if value.dim().is_none() => Value::Number(value.si()),
        (Takes::Fraction, Value::Number(number)) => Value::Number(number),
        (Takes::Fraction, value) => Value::Quantity(as_quantity(cx, value, |v| refused("a fraction", v))?),
        (Takes::Reaction, Value::Reaction(reaction)) => Value::Reaction(reaction),
        (Takes::Text, Value::Text(text)) => Value::Text(text),
        (Takes::Word(words), Value::Text(word)) => {
            if !words.contains(&&*word) {
                let choices = listed(words.iter().copied());
                return Err(ArgumentError::Word {
                    function: card.name,
                    argument: arg.name,
                    word: word.to_string(),
                    choices,
                }
                .into());
            }
            Value::Text(word)
        }
        (Takes::Quantities, Value::List(list)) => {
            let mut quantities = Vec::with_capacity(list.len());
            for item in list {
                let quantity = as_quantity(cx, item, |v| refused("a list of quantities", v))?;
                quantities.push(Value::Quantity(quantity));
            }
            Value::List(quantities)
        }
        (Takes::Streams, Value::Stream(stream)) => Value::List(vec![Value::Stream(stream)]),
        (Takes::Streams, Value::List(list)) if list.iter().all(|item| matches!(item, Value::Stream(_))) => {
            Value::List(list)
        }
        (Takes::Maps(known), Value::List(list)) => {
            let one = |item: Value| match item {
                Value::Options(map) => checked_map(cx, card, known, &map),
                other => Err(refused("a list of maps", &other)),
            };
            Value::List(list.into_iter().map(one).collect::<Result<_, Fault>>()?)
        }
        (Takes::Options(known), Value::Options(options)) => checked_map(cx, card, known, &options)?,
        (Takes::Named { unit }, Value::Options(given)) => {
            let wanted = unit_parse::unit(unit)?;
            let mut named = BTreeMap::new();
            for (name, value) in given.iter() {
                let quantity = as_quantity(cx, value.clone(), |v| refused("quantities by name", v))?;
                if quantity.dim() != &wanted.dim && wanted.dim.bindings_to(quantity.dim()).len() != 1 {
                    return Err(Mismatch::unit(quantity.dim(), &wanted).into());
                }
                named.insert(name.clone(), Value::Quantity(quantity));
            }
            Value::Options(Rc::new(named))
        }
        (Takes::NamedMaps, Value::Options(given)) => {
            let mut named = BTreeMap::new();
            for (name, inner) in given.iter() {
                let Value::Options(inner) = inner else { return Err(refused("maps of quantities by name", inner)) };
                let quantity = |(name, value): (&String, &Value)| {
                    let value = as_quantity(cx, value.clone(), |v| refused("maps of quantities by name", v))?;
                    Ok::<_, Fault>((name.clone(), Value::Quantity(value)))
                };
                let inner: BTreeMap<String, Value> = inner.iter().map(quantity).collect::<Result<_, _>>()?;
                named.insert(name.clone(), Value::Options(Rc::new(inner)));
            }
            Value::Options(Rc::new(named))
        }
        (takes, value) => {
            let wanted = match takes {
                Takes::Number => "a number",
                Takes::Text => "a text",
                Takes::Reaction => "a reaction, as in `reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\")`",
                Takes::Word(words) => {
                    return Err(refused(&format!("one of {}", listed(words.iter().copied())), &value));
                }
                Takes::Quantities => "a list of quantities",
                Takes::Named { .. } => "quantities by name, as in `#{ \"CO(g)\": \"2 bar\" }`",
                Takes::NamedMaps => {
                    "maps of quantities by name, as in `#{ \"methanol(g)\": #{ B: \"-900 cm3/mol\" } }`"
                }
                Takes::Options(_) => "a map of options, as in `#{ heat_capacity: \"constant\" }`",
                Takes::Streams => "a list of streams, as in `[stream(\"feed\", T, amounts)]`",
                Takes::Maps(_) => "a list of maps",
                _ => "a quantity",
            };
            return Err(refused(wanted, &value));
        }
    })
}

/// A map with its entries checked: each known, and those that are required there.
fn checked_map(
    cx: &Cx,
    card: &'static Card,
    known: &'static [Arg],
    given: &BTreeMap<String, Value>,
) -> Result<Value, Fault> {
    let mut checked_options = BTreeMap::new();
    for (name, value) in given {
        let Some(option) = known.iter().find(|option| option.name == name) else {
            let known = listed(known.iter().map(|option| option.name));
            return Err(ArgumentError::Option { function: card.name, option: name.clone(), known }.into());
        };
        checked_options.insert(name.clone(), checked(cx, card, option, value.clone())?);
    }
    let required = known.iter().filter(|option| matches!(option.default, Default::Required));
    if let Some(missing) = required.into_iter().find(|option| !given.contains_key(option.name)) {
        let (function, doc) = (card.name, missing.doc);
        return Err(ArgumentError::OptionMissing { function, option: missing.name, doc }.into());
    }
    Ok(Value::Options(Rc::new(checked_options)))
}

/// A quantity, or text that reads as one.
fn as_quantity(cx: &Cx, value: Value, refused: impl Fn(&Value) -> Fault) -> Result<Quantity, Fault> {
    match value {
        Value::Quantity(value) => Ok(value),
        Value::Text(written) => Ok(text::parse(&written, cx.place.clone(), cx.next_ordinal())?),
        other => Err(refused(&other)),
    }
}

pub(super) fn as_point(card: &'static Card, arg: &'static Arg, value: Quantity) -> Result<Quantity, Fault> {
    if !value.kind().what.is_temperature() {
        let given = match value.dim().is_none() {
            true => "a pure number".to_owned(),
            false => format!("a value in {}", units::unit_for(value.dim()).text),
        };
        let wanted = "a temperature, as in `q(\"450 degC\")`".to_owned();
        return Err(ArgumentError::Sort { function: card.name, argument: arg.name, wanted, given }.into());
    }
    if value.kind().what == What::TemperatureDifference {
        return Err(ArgumentError::Difference { function: card.name, difference_k: value.si() }.into());
    }
    if value.si() <= 0.0 {
        return Err(ArgumentError::NotPositive { function: card.name, t_k: value.si() }.into());
    }
    Ok(value)
}
