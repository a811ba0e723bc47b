//! Whether a gap between two values is what a usual mistake would leave.
//!
//! Each mistake is computed for the substances, temperature and figures in the history of the values at hand, and named
//! only if it fits *and* hardly any random gap would fit as well. It fits where what it leaves over is within the rounding
//! of the figures and twice the standard uncertainty of the gap. The chance of a random gap is
//!
//! P = r/|p| · n · N / ln 900
//!
//! | symbol | unit | meaning                                                                                    |
//! |--------|------|--------------------------------------------------------------------------------------------|
//! | p      | as the gap | gap that the mistake would leave                                                     |
//! | r      | as the gap | what is left over, no less than the rounding; where that is not enough, than u       |
//! | n      | 1    | mistakes of the same kind that were tested, within a factor 30 of the gap                  |
//! | N      | 1    | kinds of mistakes that were tested                                                         |
//! | ln 900 | 1    | width of the prior: random gaps of either sign, log-uniform within a factor 30 to each side |
//!
//! and a mistake is named where P is no more than [`NAMED`]: the more was tried, the better it must fit. The sum over all
//! that was tried is then the chance that a random gap has any name. The surprise: a small gap known to few digits has
//! no name, whatever its cause, since too many mistakes would fit it.
//!
//! One mistake is tested at a time. The prior and the limit are common practice, no source; the correction for the number
//! of trials is Bonferroni's.

pub mod candidate;
mod case;
mod digits;
mod reaction;
mod species;
mod whole;

use std::collections::BTreeMap;
use std::rc::Rc;

use crate::fault::Fault;
use crate::model::answer::Answer;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value, call_of};
use crate::model::compare;
use crate::quantity::{Quantity, text};
use crate::record::node::{self, LeafKey, Node};
use crate::record::register::Reported;
use crate::source::Citation;
use candidate::{Candidate, Mistake, Scale};
use case::Case;

/// The largest chance of a random gap at which a mistake is named.
pub const NAMED: f64 = 0.05;
/// ln 900: random gaps within a factor 30 to both sides.
const WIDTH: f64 = 6.802_394_763_324_311;
const FACTOR: f64 = 30.0;
/// How many standard uncertainties may be left over.
const COVERAGE: f64 = 2.0;
/// Rounding of sums in double precision, relative to the values.
const NUMERIC: f64 = 1e-12;
/// Properties of reactions that are looked into; a value that rests on more is a sum nobody mistakes one term of.
const MOST_PROPERTIES: usize = 8;

/// A gap with the mistakes that would leave it.
pub struct Gap {
    pub a: Quantity,
    pub b: Quantity,
    /// b - a, or ln(b/a) of equilibrium constants.
    pub gap: f64,
    pub scale: Scale,
    /// Standard uncertainty of the gap, where any is stated.
    pub u: Option<f64>,
    /// What rounding of the typed figures may contribute to the gap at most.
    pub rounding: f64,
    /// Alternatives that were computed, and of how many kinds.
    pub tested: usize,
    pub kinds: usize,
    /// Best first.
    pub fits: Vec<Fit>,
    /// What could not be tested, and why.
    pub left_out: Vec<String>,
}

/// A mistake that would leave the gap.
pub struct Fit {
    pub told: Told,
    /// Other mistakes that leave the very same gap, so that figures cannot tell them apart.
    pub also: Vec<Told>,
    /// b - a with this mistake.
    pub predicted: f64,
    /// Gap minus prediction.
    pub residual: f64,
    /// Whether rounding alone bridges the residual; else the uncertainty is needed.
    pub within_rounding: bool,
    /// How often a random gap would fit one of the alternatives as well.
    pub chance: f64,
    pub sources: Vec<Citation>,
}

/// A mistake in words.
#[derive(Clone, Debug, PartialEq)]
pub struct Told {
    pub mistake: Mistake,
    pub words: String,
    /// Whether it is in the first value, so that the second is right.
    pub in_first: bool,
}

struct Trial {
    told: Told,
    /// b - a with this mistake.
    predicted: f64,
    sources: Vec<Citation>,
    also: Vec<Told>,
}

impl Trial {
    /// The second value is the first with a mistake, or the first is the second with one.
    fn of(candidate: Candidate, in_first: bool) -> Trial {
        let Candidate { mistake, words, predicted, sources } = candidate;
        let predicted = if in_first { -predicted } else { predicted };
        Trial { told: Told { mistake, words, in_first }, predicted, sources, also: Vec::new() }
    }
}

impl Gap {
    /// Looks for mistakes in either value that would leave the gap between them.
    ///
    /// # Errors
    /// The two cannot be compared.
    pub fn of(cx: &Cx, a: &Quantity, b: &Quantity) -> Result<Gap, Fault> {
        let (difference, by_logarithm) = compare::difference(a, b)?;
        let scale = if by_logarithm { Scale::Logarithm } else { Scale::Linear };
        let gap = -difference.si();
        let sizes = [a, b].into_iter().filter_map(|value| scale.of(value.si()));
        let numeric = NUMERIC * sizes.map(f64::abs).sum::<f64>();
        let rounding = scale.small(rounding_of(a), a.si()).abs() + scale.small(rounding_of(b), b.si()).abs();
        let u = compare::uncertainty(a, b, &difference, by_logarithm);
        let mut left_out = Vec::new();
        let mut trials = trials(cx, a, b, scale, &mut left_out);
        trials.retain(|trial| trial.predicted.abs() > numeric);
        let trials = distinct(trials, numeric);
        let (resolution, known_u) = (rounding + numeric, u.unwrap_or(0.0));
        let judge = Judge { gap, resolution, numeric, u: known_u, trials: &trials };
        let fits = if gap.abs() > judge.resolution { judge.fits() } else { Vec::new() };
        let (tested, kinds) = (trials.len(), judge.kinds().len());
        Ok(Gap { a: a.clone(), b: b.clone(), gap, scale, u, rounding, tested, kinds, fits, left_out })
    }
}

impl Gap {
    pub(super) fn parts(&self) -> Vec<(&'static str, Value)> {
        vec![("fits", Value::List(self.fits.iter().map(|fit| self.fit_map(fit)).collect()))]
    }

    /// Numbers are bare, in the unit of the first value, so that they can be sorted and tested.
    fn fit_map(&self, fit: &Fit) -> Value {
        let unit = self.a.unit();
        let factor = if unit.is_point() { 1.0 } else { unit.factor };
        let text = |text: &str| Value::Text(text.into());
        let sources = fit.sources.iter().map(|source| text(&source.to_string())).collect();
        let entries = [
            ("id", text(fit.told.mistake.id())),
            ("words", text(&fit.told.words)),
            ("value", text(if fit.told.in_first { "a" } else { "b" })),
            ("predicted", Value::Number(fit.predicted / factor)),
            ("residual", Value::Number(fit.residual / factor)),
            ("chance", Value::Number(fit.chance)),
            ("sources", Value::List(sources)),
        ];
        Value::Options(Rc::new(entries.into_iter().map(|(name, value)| (name.to_owned(), value)).collect()))
    }
}

/// Every mistake in either value, each with the gap b - a that it leaves.
fn trials(cx: &Cx, a: &Quantity, b: &Quantity, scale: Scale, left_out: &mut Vec<String>) -> Vec<Trial> {
    // What can happen to a finished figure reads the same from both sides, so it is told of the second.
    let mut trials: Vec<Trial> =
        whole::candidates(a, scale).into_iter().map(|candidate| Trial::of(candidate, false)).collect();
    for (value, in_first) in [(a, false), (b, true)] {
        let mut found = reaction::per_mole(value, scale);
        properties(cx, value, scale, &mut found, left_out);
        typed_digits(value, scale, &mut found);
        trials.extend(found.into_iter().map(|candidate| Trial::of(candidate, in_first)));
    }
    left_out.sort();
    left_out.dedup();
    trials
}

fn properties(cx: &Cx, value: &Quantity, scale: Scale, out: &mut Vec<Candidate>, left_out: &mut Vec<String>) {
    let reported = Reported::of(value.node());
    let is_property = |call: &Call| crate::model::property::Property::of(call.card).is_some();
    let of_property = |node: &'_ Rc<Node>| call_of(node).is_some_and(is_property);
    let nodes: Vec<&Rc<Node>> = reported.history().iter().filter(|node| of_property(node)).collect();
    if nodes.len() > MOST_PROPERTIES {
        left_out.push(format!("mistakes inside a value that rests on {} properties of reactions", nodes.len()));
        return;
    }
    for node in &nodes {
        let Some(call) = call_of(node) else { continue };
        let Some(case) = Case::of(cx, value, &reported, node, call, scale, nodes.len() > 1) else { continue };
        reaction::candidates(&case, out);
        species::candidates(&case, out, left_out);
    }
}

/// Two neighbouring digits of a typed figure swapped.
fn typed_digits(value: &Quantity, scale: Scale, out: &mut Vec<Candidate>) {
    let Some(y) = scale.of(value.si()) else { return };
    let reported = Reported::of(value.node());
    // Digits of a chosen temperature are swapped where the property is computed anew with it.
    for sensitivity in value.sensitivities().into_iter().filter(|sensitivity| !sensitivity.chosen) {
        let typed = sensitivity.input().filter(|input| matches!(input.key, LeafKey::Typed { .. }));
        let Some(label) = typed.and_then(|input| input.label.as_ref()) else { continue };
        for swapped in digits::swapped(label) {
            let Ok(other) = text::parse(&swapped, None, 0) else { continue };
            let price = reported.price(&BTreeMap::from([(sensitivity.leaf.id(), other.si())])).0;
            let Some(with) = scale.of(value.si() - price) else { continue };
            let words = format!("{label} was typed as {swapped}");
            out.push(Candidate { mistake: Mistake::Digits, words, predicted: with - y, sources: Vec::new() });
        }
    }
}

/// What rounding of typed figures may be off in a value: half a unit of the last digit of each. A value computed from
/// tables is not rounded, and a mistake in it starts from the same figures.
fn rounding_of(value: &Quantity) -> f64 {
    let typed = |input: &node::Input| matches!(input.key, LeafKey::Typed { .. } | LeafKey::Repeated { .. });
    // A temperature that was chosen is what it says, to all digits.
    let measured = value.sensitivities().into_iter().filter(|sensitivity| !sensitivity.chosen);
    let parts = measured.filter_map(|sensitivity| {
        let digit = sensitivity.input().filter(|input| typed(input))?.digit?;
        Some((0.5 * sensitivity.derivative * digit).abs())
    });
    parts.sum()
}

/// Mistakes of one kind that leave the same gap are one trial, known by several words.
fn distinct(trials: Vec<Trial>, numeric: f64) -> Vec<Trial> {
    let mut kept: Vec<Trial> = Vec::new();
    for trial in trials {
        let same = |known: &&mut Trial| {
            known.told.mistake == trial.told.mistake && (known.predicted - trial.predicted).abs() <= numeric
        };
        match kept.iter_mut().find(same) {
            Some(known) => known.also.push(trial.told),
            None => kept.push(trial),
        }
    }
    kept
}

struct Judge<'a> {
    gap: f64,
    /// What rounding of the figures and of the computation may leave over, and the latter alone.
    resolution: f64,
    numeric: f64,
    u: f64,
    trials: &'a [Trial],
}

impl Judge<'_> {
    /// Trials within reach of the gap, by kind.
    fn kinds(&self) -> BTreeMap<Mistake, usize> {
        let mut kinds = BTreeMap::new();
        for trial in self.trials {
            let ratio = (trial.predicted / self.gap).abs();
            let within = (1.0 / FACTOR..=FACTOR).contains(&ratio);
            *kinds.entry(trial.told.mistake).or_insert(0) += usize::from(within);
        }
        kinds
    }

    fn fits(&self) -> Vec<Fit> {
        let kinds = self.kinds();
        let mut fits: Vec<Fit> = self.trials.iter().filter_map(|trial| self.fit(trial, &kinds)).collect();
        fits.sort_by(|a, b| a.chance.total_cmp(&b.chance).then(a.told.mistake.cmp(&b.told.mistake)));
        let mut told: Vec<Fit> = Vec::new();
        for fit in fits {
            // Figures cannot tell apart what leaves the same gap; the less common one stands beside the more common.
            match told.iter_mut().find(|known| (known.predicted - fit.predicted).abs() <= self.numeric) {
                Some(known) => known.also.extend(std::iter::once(fit.told).chain(fit.also)),
                None => told.push(fit),
            }
        }
        told
    }

    fn fit(&self, trial: &Trial, kinds: &BTreeMap<Mistake, usize>) -> Option<Fit> {
        let residual = self.gap - trial.predicted;
        let left = residual.abs();
        if left > self.resolution + COVERAGE * self.u {
            return None;
        }
        let within_rounding = left <= self.resolution;
        // Figures of the same origin differ by rounding; of another origin, by u, and a closer fit than u is luck.
        let resolved = if within_rounding { self.resolution } else { left.max(self.u) };
        let own = kinds.get(&trial.told.mistake).copied().unwrap_or(0).max(1);
        let chance = resolved / trial.predicted.abs() / WIDTH * (own * kinds.len()) as f64;
        (chance <= NAMED).then(|| Fit {
            told: trial.told.clone(),
            also: trial.also.clone(),
            predicted: trial.predicted,
            residual,
            within_rounding,
            chance,
            sources: trial.sources.clone(),
        })
    }
}

pub static EXPLAIN_GAP: Card = Card {
    id: "quantity.explain-gap",
    name: "explain_gap",
    on: On::Nothing,
    args: &[
        Arg {
            name: "a",
            takes: Takes::AnyQuantity,
            default: Default::Required,
            doc: "a value, best one computed here, so that its history can be searched",
        },
        Arg {
            name: "b",
            takes: Takes::AnyQuantity,
            default: Default::Required,
            doc: "another of the same dimension and kind, computed or typed with its digits",
        },
    ],
    gives: "the usual mistakes that would leave such a gap, best first, to be read; `.fits` is the list",
    doc: "Computes what some hundred usual mistakes would do to the values at hand: the wrong phase of water, Δn(gas)·R·T, \
          calories, increments from 0 K, 1 atm for 1 bar, a wrong coefficient, powers of ten, the sign, degrees Celsius for \
          kelvin, swapped digits, per mole of another species, another dataset, a shortcut in the heat capacity. A mistake \
          is named only where it fits within rounding and uncertainty, and where chance would hardly fit as well.",
    source: "the mistakes are common practice, no source; each alternative names the sources of its figures",
    example: "explain_gap(reaction(\"2 H2(g) + O2(g) -> 2 H2O(g)\").enthalpy(\"298.15 K\"), \"-571.66 kJ/mol[rxn]\")",
    claims: &[],
    alternatives: &[],
    run,
    check_line: None,
    caution: None,
};

fn run(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let gap = Gap::of(cx, call.quantity(0), call.quantity(1))?;
    Ok(Value::Answer(Answer::Gap(Rc::new(gap))))
}
