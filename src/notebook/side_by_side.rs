//! The derivation of a value as it was sealed beside the one it has now, for a reader who wants to see where they part.
//!
//! [`side_by_side`] pairs steps from the value down and numbers the pairs in the order of calculation. The surprise: where
//! the two are made in different ways, what lies under them is still paired as far as it is alike, so that an edited factor
//! does not hide that everything before it is the same.

use std::collections::{BTreeMap, BTreeSet};

use crate::model::card::{Arg, On, Takes};
use crate::model::{CARDS, check_line, symbols};
use crate::notebook::parting::{alike, argument_words, made_words, parts_at, positions};
use crate::notebook::seal::{Argument, Made, Seal, SealedStep, SealedValue};
use crate::notebook::skeleton::{self, Skeleton, operator_of};
use crate::notebook::verdict::{SideBySide, StepPair, StepSide};
use crate::quantity::Quantity;
use crate::quantity::round::{decimals_for, decimals_for_digits, fixed, shortest};
use crate::units;

/// More pairs than this are not listed: those that differ come first.
const MOST: usize = 48;

/// Digits of a figure that is the same on both sides, or stands alone.
const DIGITS: i32 = 8;

/// Positions of the steps of a pair.
type Pair = (Option<usize>, Option<usize>);

/// Puts the sealed derivation of a value beside that of the value now; none where the seal's own steps cannot be followed, or
/// are more than a seal keeps of a value.
pub fn side_by_side(seal: &Seal, sealed: &SealedValue, now: &Quantity, under: &str) -> Option<SideBySide> {
    let mut skeleton = Skeleton::default();
    let last_now = skeleton.enter(now).step;
    let last_then = sealed.step.parse::<usize>().ok().filter(|at| *at < seal.steps.len())?;
    let sides = Sides { then: &seal.steps, now: &skeleton.steps };
    let parting = parts_at(sides.then, sides.now, last_then, last_now)
        .map(|(then, now)| (Some(through(sides.then, then)), Some(through(sides.now, now))));
    let pairs = sides.pairs(last_then, last_now)?;
    let numbers = Numbers::of(&pairs);
    let all: Vec<StepPair> = (pairs.iter().enumerate())
        .map(|(at, pair)| sides.shown(at + 1, *pair, &numbers, parting == Some(*pair)))
        .collect();
    let listed = listed(&all);
    let left_out = |same: bool| {
        let is_out = |(at, pair): &(usize, &StepPair)| !listed.contains(at) && pair.is_same() == same;
        all.iter().enumerate().filter(is_out).count()
    };
    let (same_left_out, others_left_out) = (left_out(true), left_out(false));
    let pairs = all.into_iter().enumerate().filter(|(at, _)| listed.contains(at)).map(|(_, pair)| pair).collect();
    Some(SideBySide { under: under.to_owned(), pairs, same_left_out, others_left_out })
}

/// Which pairs are listed: where the derivations part, the value itself, what differs, and then what is the same.
fn listed(all: &[StepPair]) -> BTreeSet<usize> {
    if all.len() <= MOST {
        return (0..all.len()).collect();
    }
    let mut chosen: BTreeSet<usize> = all.iter().position(|pair| pair.parts).into_iter().collect();
    chosen.insert(all.len() - 1);
    let of = |same: bool| -> Vec<usize> { (0..all.len()).filter(|at| all[*at].is_same() == same).collect() };
    for candidates in [of(false), of(true)] {
        let room = MOST - chosen.len();
        if candidates.len() <= room {
            chosen.extend(candidates);
        } else {
            // Of a long list the beginning and the end: the first cause, and how it reached the value.
            chosen.extend(&candidates[..room / 2]);
            chosen.extend(&candidates[candidates.len() - room / 2..]);
            break;
        }
    }
    chosen
}

/// A step behind those that only say at which temperature a value was taken.
fn through(steps: &[SealedStep], mut at: usize) -> usize {
    while let Some(Made::Arithmetic { operator, .. }) = steps.get(at).map(|step| &step.made)
        && operator == "condition"
        // A step of a whole seal comes after its inputs; one that does not would lead round in a circle.
        && let Some(before) = positions(&steps[at]).first().copied().filter(|before| *before < at)
    {
        at = before;
    }
    at
}

struct Sides<'a> {
    then: &'a [SealedStep],
    now: &'a [SealedStep],
}

/// The number of the pair that holds a step, for each side.
struct Numbers {
    then: BTreeMap<usize, usize>,
    now: BTreeMap<usize, usize>,
}

impl Numbers {
    fn of(pairs: &[Pair]) -> Numbers {
        let of = |side: fn(&Pair) -> Option<usize>| {
            pairs.iter().enumerate().filter_map(|(at, pair)| Some((side(pair)?, at + 1))).collect()
        };
        Numbers { then: of(|pair| pair.0), now: of(|pair| pair.1) }
    }
}

impl Sides<'_> {
    /// All steps under two values, paired, inputs before their users; none where a seal was made to hold too many.
    fn pairs(&self, then: usize, now: usize) -> Option<Vec<Pair>> {
        // The order is kept by hand, since derivations are long.
        enum Visit {
            Into(Pair),
            Done(Pair),
        }
        let (mut seen_then, mut seen_now) = (BTreeSet::new(), BTreeSet::new());
        let mut pairs = Vec::new();
        let start = (Some(through(self.then, then)), Some(through(self.now, now)));
        let mut pending = vec![Visit::Into(start)];
        while let Some(visit) = pending.pop() {
            match visit {
                Visit::Into((then, now)) => {
                    let new = (then.filter(|at| seen_then.insert(*at)), now.filter(|at| seen_now.insert(*at)));
                    if new == (None, None) {
                        continue;
                    }
                    if seen_then.len() > 2 * skeleton::MOST {
                        return None;
                    }
                    pending.push(Visit::Done(new));
                    pending.extend(self.under(new).into_iter().rev().map(Visit::Into));
                }
                Visit::Done(pair) => pairs.push(pair),
            }
        }
        Some(pairs)
    }

    /// What the steps of a pair were computed from: alike ones paired, then the rest by their order.
    fn under(&self, (then, now): Pair) -> Vec<Pair> {
        fn inputs(steps: &[SealedStep], at: Option<usize>) -> Vec<usize> {
            let named = at.and_then(|at| steps.get(at)).map(positions).unwrap_or_default();
            let mut known = BTreeSet::new();
            let there = named.into_iter().filter(|before| *before < steps.len());
            there
                .map(|before| through(steps, before))
                .filter(|before| known.insert(*before))
                .take(skeleton::MOST)
                .collect()
        }
        let (left, mut right) = (inputs(self.then, then), inputs(self.now, now));
        let mut alone = Vec::new();
        let mut pairs: Vec<Pair> = Vec::new();
        for then in left {
            match right.iter().position(|now| alike(&self.then[then].made, &self.now[*now].made)) {
                Some(at) => pairs.push((Some(then), Some(right.remove(at)))),
                None => {
                    pairs.push((Some(then), None));
                    alone.push(pairs.len() - 1);
                }
            }
        }
        let is_input = |step: &SealedStep| matches!(step.made, Made::Input(_));
        for at in alone {
            let Some(then) = pairs[at].0 else { continue };
            // Two computed values, or two figures in the same unit, may stand for each other.
            let fits = |now: &usize| {
                let (a, b) = (&self.then[then], &self.now[*now]);
                is_input(a) == is_input(b) && (!is_input(a) || a.unit == b.unit)
            };
            if let Some(found) = right.iter().position(fits) {
                pairs[at].1 = Some(right.remove(found));
            }
        }
        pairs.extend(right.into_iter().map(|now| (None, Some(now))));
        pairs
    }

    fn shown(&self, number: usize, (then, now): Pair, numbers: &Numbers, parts: bool) -> StepPair {
        let side = |steps: &[SealedStep], at: Option<usize>, numbers: &BTreeMap<usize, usize>| {
            let step = steps.get(at?)?;
            Some((words(steps, step, numbers), step.clone(), figure(step)))
        };
        let (then, now) = (side(self.then, then, &numbers.then), side(self.now, now, &numbers.now));
        let both = then.as_ref().zip(now.as_ref()).filter(|(then, now)| then.2.1 == now.2.1);
        let decimals = both.and_then(|(then, now)| decimals_to_tell(then.2.0?, now.2.0?));
        let made = |(words, step, (value, unit)): (String, SealedStep, (Option<f64>, String))| StepSide {
            words,
            place: step.place.map(|place| format!("{}, line {}", place.0, place.1)),
            value: value.map_or(step.si, shortest),
            shown: shown(value, &unit, decimals),
            unit,
        };
        StepPair { number, then: then.map(made), now: now.map(made), parts }
    }
}

/// A step's value in the unit that people write it in; no value where the step is not readable.
fn figure(step: &SealedStep) -> (Option<f64>, String) {
    let unit = if step.unit == "1" { None } else { units::parse::unit(&step.unit).ok() };
    match (step.si.parse::<f64>().ok(), unit) {
        (Some(si), Some(unit)) => {
            let unit = units::unit_for(&unit.dim);
            (Some(unit.from_si(si)), unit.text.to_string())
        }
        (si, None) if step.unit == "1" => (si, "1".to_owned()),
        _ => (None, step.unit.clone()),
    }
}

/// Decimals with which two figures are told apart by two digits, and at least six digits; none where they are the same.
fn decimals_to_tell(then: f64, now: f64) -> Option<i32> {
    let larger = then.abs().max(now.abs());
    let by = (now - then).abs();
    (by > 0.0 && by.is_finite())
        .then(|| decimals_for(by).max(decimals_for_digits(larger, 6)).min(decimals_for_digits(larger, 17)))
}

fn shown(value: Option<f64>, unit: &str, decimals: Option<i32>) -> String {
    let Some(value) = value else { return "not readable".to_owned() };
    let number = match decimals {
        Some(decimals) => fixed(value, decimals),
        None if value == 0.0 => "0".to_owned(),
        None => {
            let (short, rounded) = (shortest(value), fixed(value, decimals_for_digits(value, DIGITS)));
            if short.len() <= rounded.len() { short } else { rounded }
        }
    };
    let unit = match units::parse::unit(unit) {
        _ if unit == "1" => String::new(),
        Ok(unit) => units::reader_text(&unit),
        Err(_) => unit.to_owned(),
    };
    format!("{number} {unit}").trim_end().to_owned()
}

/// How a step was made, with the numbers of the pairs it was made from.
fn words(steps: &[SealedStep], step: &SealedStep, numbers: &BTreeMap<usize, usize>) -> String {
    let name = |at: &str| {
        let number = at.parse().ok().and_then(|at| numbers.get(&through(steps, at)));
        number.map_or_else(|| "?".to_owned(), |number| format!("step {number}"))
    };
    match &step.made {
        Made::Arithmetic { operator, by } => {
            let names: Vec<String> = step.inputs.iter().map(|(at, _)| name(at)).collect();
            let by = by.as_ref().and_then(|by| by.parse().ok());
            match operator_of(operator, by) {
                Some(operator) => check_line::arithmetic(&operator, &names),
                None => format!("{} of {}", made_words(step), names.join(", ")),
            }
        }
        Made::Formula { card, arguments } => applied(card, arguments, &name),
        Made::Input(_) | Made::Folded { .. } => made_words(step),
    }
}

/// A formula's name with what it was applied to, and its equation.
fn applied(id: &str, arguments: &[Argument], name: &dyn Fn(&str) -> String) -> String {
    let Some(card) = CARDS.iter().find(|card| card.id == id) else { return id.to_owned() };
    let receivers = usize::from(card.on != On::Nothing);
    let mut words = card.name.replace('_', " ");
    for (at, argument) in arguments.iter().enumerate() {
        let Some(written) = written(argument, name) else { continue };
        match at.checked_sub(receivers).and_then(|at| card.args.get(at)) {
            None => words.push_str(&format!(" of {written}")),
            Some(Arg { takes: Takes::Options(_), .. }) => words.push_str(&format!(", {written}")),
            Some(arg) => words.push_str(&format!(", {} = {written}", arg.name)),
        }
    }
    match symbols::of(card) {
        Some(formula) => format!("{words}; {}", formula.text),
        None => words,
    }
}

fn written(argument: &Argument, name: &dyn Fn(&str) -> String) -> Option<String> {
    match argument {
        Argument::Step(at) => Some(name(at)),
        Argument::List(list) => {
            let items: Vec<String> = list.iter().filter_map(|item| written(item, name)).collect();
            (!items.is_empty()).then(|| items.join(", "))
        }
        Argument::Options(options) => {
            let option = |(key, value): (&String, &Argument)| Some(format!("{key}: {}", written(value, name)?));
            let words: Vec<String> = options.iter().filter_map(option).collect();
            (!words.is_empty()).then(|| words.join(", "))
        }
        Argument::Other(what) => Some(what.clone()),
        other => argument_words(other),
    }
}
