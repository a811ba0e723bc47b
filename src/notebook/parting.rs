//! Where the derivation of a value parts from the sealed one: the first step with the same inputs and another outcome.

use std::collections::BTreeSet;

use crate::notebook::seal::{Argument, InputOf, Made, Seal, SealedInput, SealedStep, SealedValue};
use crate::notebook::skeleton::Skeleton;
use crate::quantity::Quantity;
use crate::quantity::round::shortest;
use crate::units;

/// Two derivations, walked side by side.
struct Walk<'a> {
    then: &'a [SealedStep],
    now: &'a [SealedStep],
    seen: BTreeSet<(usize, usize)>,
}

/// The first step at which the value's derivation parts from the sealed one, in words; none where it does not, or where the
/// seal's own steps cannot be followed.
pub fn parting(seal: &Seal, sealed: &SealedValue, now: &Quantity) -> Option<String> {
    let mut skeleton = Skeleton::default();
    let ending = skeleton.enter(now);
    let (then, now) = parts_at(&seal.steps, &skeleton.steps, sealed.step.parse().ok()?, ending.step)?;
    Some(words(&seal.steps[then], &skeleton.steps[now]))
}

/// The same as the positions of the two steps, for two derivations that end at these positions.
pub fn parts_at(then: &[SealedStep], now: &[SealedStep], last_then: usize, last_now: usize) -> Option<(usize, usize)> {
    Walk { then, now, seen: BTreeSet::new() }.at(last_then, last_now)
}

impl Walk<'_> {
    fn at(&mut self, then: usize, now: usize) -> Option<(usize, usize)> {
        // The order of visits, inputs before the step itself, is kept by hand, since derivations are long.
        enum Visit {
            Into(usize, usize),
            Judge(usize, usize),
        }
        let mut pending = vec![Visit::Into(then, now)];
        while let Some(visit) = pending.pop() {
            match visit {
                Visit::Into(then, now) => {
                    let (Some(a), Some(b)) = (self.then.get(then), self.now.get(now)) else { continue };
                    if !self.seen.insert((then, now)) || (a.si == b.si && alike(&a.made, &b.made)) {
                        continue;
                    }
                    pending.push(Visit::Judge(then, now));
                    if !alike(&a.made, &b.made) {
                        continue;
                    }
                    let pairs = pairs(a, b);
                    pending.extend(pairs.into_iter().rev().map(|(then, now)| Visit::Into(then, now)));
                }
                Visit::Judge(then, now) => return Some((then, now)),
            }
        }
        None
    }
}

/// Arguments and inputs of two steps that are made alike, pair by pair.
fn pairs(a: &SealedStep, b: &SealedStep) -> Vec<(usize, usize)> {
    positions(a).into_iter().zip(positions(b)).collect()
}

/// The steps that a step names: arguments first, then what it was computed from.
pub fn positions(step: &SealedStep) -> Vec<usize> {
    let mut all = Vec::new();
    if let Made::Formula { arguments, .. } = &step.made {
        arguments.iter().for_each(|argument| steps_in(argument, &mut all));
    }
    all.extend(step.inputs.iter().filter_map(|(at, _)| at.parse::<usize>().ok()));
    all
}

fn steps_in(argument: &Argument, all: &mut Vec<usize>) {
    match argument {
        Argument::Step(at) => all.extend(at.parse::<usize>().ok()),
        Argument::List(list) => list.iter().for_each(|item| steps_in(item, all)),
        Argument::Options(options) => options.values().for_each(|item| steps_in(item, all)),
        _ => {}
    }
}

/// Whether two steps are made in the same way, whatever their inputs gave.
pub fn alike(a: &Made, b: &Made) -> bool {
    match (a, b) {
        (Made::Input(a), Made::Input(b)) => same_input(a, b),
        (Made::Formula { card: a, arguments: left }, Made::Formula { card: b, arguments: right }) => {
            a == b && left.len() == right.len() && left.iter().zip(right).all(|(a, b)| same_argument(a, b))
        }
        (Made::Folded { .. }, Made::Folded { .. }) => true,
        (a, b) => a == b,
    }
}

fn same_input(a: &SealedInput, b: &SealedInput) -> bool {
    match (&a.of, &b.of) {
        (InputOf::Typed { .. }, InputOf::Typed { .. }) => a.label == b.label,
        (InputOf::Constant { name: a, .. }, InputOf::Constant { name: b, .. }) => a == b,
        (a, b) => a == b,
    }
}

fn same_argument(a: &Argument, b: &Argument) -> bool {
    match (a, b) {
        // What a thing is made of stands in the inputs of the step that took it.
        (Argument::Step(_), Argument::Step(_)) | (Argument::Object { .. }, Argument::Object { .. }) => true,
        (Argument::List(a), Argument::List(b)) => {
            a.len() == b.len() && a.iter().zip(b).all(|(a, b)| same_argument(a, b))
        }
        (Argument::Options(a), Argument::Options(b)) => {
            a.len() == b.len() && a.iter().zip(b).all(|((m, a), (n, b))| m == n && same_argument(a, b))
        }
        (a, b) => a == b,
    }
}

fn words(then: &SealedStep, now: &SealedStep) -> String {
    let place = now.place.as_ref().or(then.place.as_ref());
    let place = place.map_or_else(String::new, |place| format!("{}, line {}: ", place.0, place.1));
    let (was, is) = (made_words(then), made_words(now));
    if was == is {
        let (then, now) = (in_trade_unit(then), in_trade_unit(now));
        format!("{place}{is}: {then} then, {now} now")
    } else {
        format!("{place}{was} then, {is} now")
    }
}

/// The value of a step with its unit, as people write it.
fn in_trade_unit(step: &SealedStep) -> String {
    let read = step.si.parse::<f64>().ok().zip(units::parse::unit(&step.unit).ok());
    let Some((si, unit)) = read else { return format!("{} {}", step.si, step.unit) };
    let unit = units::unit_for(&unit.dim);
    format!("{} {}", shortest(unit.from_si(si)), units::reader_text(&unit)).trim_end().to_owned()
}

/// How a step was made, in words.
pub fn made_words(step: &SealedStep) -> String {
    match &step.made {
        Made::Input(input) => input_words(input),
        Made::Arithmetic { operator, by: Some(by) } => format!("{operator} {by}"),
        Made::Arithmetic { operator, by: None } => operator.clone(),
        Made::Formula { card, arguments } => {
            let words: Vec<String> = arguments.iter().filter_map(argument_words).collect();
            format!("{card}({})", words.join(", "))
        }
        Made::Folded { steps, .. } => format!("{steps} steps folded"),
    }
}

fn input_words(input: &SealedInput) -> String {
    if let Some(label) = &input.label {
        return format!("\"{label}\"");
    }
    match &input.of {
        InputOf::Datum { dataset, record, field, t, .. } => {
            let t = t.as_ref().map_or_else(String::new, |t| format!(" at {t} K"));
            format!("{field} of {record}{t} ({dataset})")
        }
        InputOf::Constant { name, .. } | InputOf::Own { name } => name.clone(),
        InputOf::Typed { .. } | InputOf::Repeated { .. } => "a typed value".to_owned(),
    }
}

pub fn argument_words(argument: &Argument) -> Option<String> {
    match argument {
        Argument::Number(text) | Argument::Text(text) | Argument::Reaction(text) | Argument::Substance(text) => {
            Some(text.clone())
        }
        Argument::Object { words, .. } => Some(words.clone()),
        Argument::Flag(flag) => Some(flag.to_string()),
        Argument::Options(options) => {
            let words: Vec<String> = options
                .iter()
                .filter_map(|(name, value)| Some(format!("{name}: {}", argument_words(value)?)))
                .collect();
            (!words.is_empty()).then(|| words.join(", "))
        }
        _ => None,
    }
}
