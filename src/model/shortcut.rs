//! Where a shortcut serves, and where it is worse than none.
//!
//! error(T) = ΔrH by the shortcut − ΔrH by the integral of ΔrCp
//!
//! | shortcut                       | ΔrH by it                                          |
//! |--------------------------------|----------------------------------------------------|
//! | `no-correction`                | ΔrH(298.15 K)                                      |
//! | `constant-heat-capacity`       | ΔrH(298.15 K) + ΔrCp(298.15 K) (T − 298.15 K)      |
//! | `midpoint`                     | ΔrH(298.15 K) + ΔrCp half-way (T − 298.15 K)       |
//! | `mean`                         | ΔrH(298.15 K) + mean of ΔrCp at both ends (T − 298.15 K) |
//! | `taylor`                       | ΔrH(T₀) + ΔrCp(T₀) (T − T₀)                        |
//! | `internal-energy-for-enthalpy` | ΔrU(T) = ΔrH(T) − Δn(gas) R T                      |
//!
//! The formation enthalpies cancel, so the answer is that of the heat capacity functions alone, taken as the properties of a
//! reaction take them. Ends are bracketed on a grid of 1 K and then bisected: an excursion narrower than the grid would be
//! missed, and no function of the shipped range has one.
//! Source: definition of Cp; IUPAC Green Book, 3rd ed., section 2.11 (from memory).

use std::collections::BTreeMap;
use std::rc::Rc;

use thiserror::Error;

use crate::data::catalog::Catalog;
use crate::data::dataset::DatasetId;
use crate::fault::{Explain, Fault};
use crate::model::answer::{self, Answer};
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::function::T_REFERENCE;
use crate::model::gather::{self, GatherError, HeatCapacity, Method};
use crate::model::path;
use crate::model::property::{self, Property};
use crate::model::terms::{Term, Terms};
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey};
use crate::units::{Base, Dimension, Kind, What, parse};

/// A way of doing without the integral of ΔrCp, or of taking another function for ΔrH.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Shortcut {
    NoCorrection,
    Constant,
    Midpoint,
    Mean,
    FirstOrder { about_k: f64 },
    InternalEnergy,
}

const NO_CORRECTION: &str = "no-correction";
const CONSTANT: &str = "constant-heat-capacity";
const MIDPOINT: &str = "midpoint";
const MEAN: &str = "mean";
const FIRST_ORDER: &str = "taylor";
const INTERNAL_ENERGY: &str = "internal-energy-for-enthalpy";
const WORDS: &[&str] = &[NO_CORRECTION, CONSTANT, MIDPOINT, MEAN, FIRST_ORDER, INTERNAL_ENERGY];

impl Shortcut {
    fn named(word: &str, about_k: Option<f64>) -> Result<Shortcut, ShortcutError> {
        let shortcut = match (word, about_k) {
            (FIRST_ORDER, Some(about_k)) => return Ok(Shortcut::FirstOrder { about_k }),
            (FIRST_ORDER, None) => return Err(ShortcutError::StartMissing),
            (word, Some(_)) => return Err(ShortcutError::StartUnused { shortcut: word.to_owned() }),
            (CONSTANT, None) => Shortcut::Constant,
            (MIDPOINT, None) => Shortcut::Midpoint,
            (MEAN, None) => Shortcut::Mean,
            (INTERNAL_ENERGY, None) => Shortcut::InternalEnergy,
            _ => Shortcut::NoCorrection,
        };
        Ok(shortcut)
    }

    pub fn id(self) -> &'static str {
        match self {
            Shortcut::NoCorrection => NO_CORRECTION,
            Shortcut::Constant => CONSTANT,
            Shortcut::Midpoint => MIDPOINT,
            Shortcut::Mean => MEAN,
            Shortcut::FirstOrder { .. } => FIRST_ORDER,
            Shortcut::InternalEnergy => INTERNAL_ENERGY,
        }
    }

    /// In a few words, for legends and tables.
    pub fn words(self) -> String {
        match self {
            Shortcut::NoCorrection => "no correction".to_owned(),
            Shortcut::Constant => "ΔrCp as at 298.15 K".to_owned(),
            Shortcut::Midpoint => "ΔrCp as half-way".to_owned(),
            Shortcut::Mean => "ΔrCp as mean of ends".to_owned(),
            Shortcut::FirstOrder { about_k } => format!("first order about {about_k} K"),
            Shortcut::InternalEnergy => "ΔrU for ΔrH".to_owned(),
        }
    }

    /// How it takes the heat capacity; the full integral where it takes another function.
    fn heat_capacity(self) -> HeatCapacity {
        match self {
            Shortcut::NoCorrection => HeatCapacity::Neglected,
            Shortcut::Constant => HeatCapacity::Constant,
            Shortcut::Midpoint => HeatCapacity::Midpoint,
            Shortcut::Mean => HeatCapacity::Mean,
            Shortcut::FirstOrder { about_k } => HeatCapacity::FirstOrder { about_k },
            Shortcut::InternalEnergy => HeatCapacity::Full,
        }
    }

    /// Whether it corrects for temperature at all, so that it can be worse than doing nothing.
    fn corrects(self) -> bool {
        !matches!(self, Shortcut::NoCorrection | Shortcut::InternalEnergy)
    }

    /// The temperature at which it starts out right.
    fn start_k(self) -> f64 {
        match self {
            Shortcut::FirstOrder { about_k } => about_k,
            _ => T_REFERENCE,
        }
    }
}

/// Why no interval can be given.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum ShortcutError {
    #[error("the heat capacity functions of {reaction} have no common range that holds 298.15 K")]
    NoCommonRange { reaction: String },
    #[error("a tolerance of {given} is not a positive energy per mole")]
    Tolerance { given: String },
    #[error("a first-order expansion was asked for without saying about which temperature")]
    StartMissing,
    #[error("`about` was given, and {shortcut} is no expansion about a temperature")]
    StartUnused { shortcut: String },
}

impl Explain for ShortcutError {
    fn code(&self) -> &'static str {
        match self {
            ShortcutError::NoCommonRange { .. } => "no-common-range",
            ShortcutError::Tolerance { .. } => "tolerance-not-positive",
            ShortcutError::StartMissing => "expansion-start-missing",
            ShortcutError::StartUnused { .. } => "expansion-start-unused",
        }
    }

    fn hint(&self) -> String {
        match self {
            ShortcutError::NoCommonRange { .. } => "choose phases that exist at 298.15 K".to_owned(),
            ShortcutError::Tolerance { .. } => "give it as in \"1 kJ/mol\"".to_owned(),
            ShortcutError::StartMissing => "name it among the options, as in `about: \"500 K\"`".to_owned(),
            ShortcutError::StartUnused { .. } => {
                "leave `about` out, or ask for the expansion by the word \"taylor\"".to_owned()
            }
        }
    }
}

const REACTION: Arg = Arg { name: "reaction", takes: Takes::Reaction, default: Default::Required, doc: "a reaction" };

/// The start of an expansion, as an option.
pub(super) const ABOUT: Arg = Arg {
    name: "about",
    takes: Takes::Temperature,
    default: Default::Absent,
    doc: "the temperature a first-order expansion starts from, such as \"500 K\"",
};

const TOLERANCE: Arg = Arg {
    name: "tolerance",
    takes: Takes::AnyQuantity,
    default: Default::Required,
    doc: "the largest error allowed in the reaction enthalpy, such as \"1 kJ/mol\"",
};

pub static VALID_TO: Card = Card {
    id: "shortcut.valid-to",
    name: "valid_to",
    on: On::Nothing,
    args: &[
        REACTION,
        Arg { name: "shortcut", takes: Takes::Word(WORDS), default: Default::Required, doc: "which shortcut" },
        TOLERANCE,
        Arg {
            name: "options",
            takes: Takes::Options(&[ABOUT]),
            default: Default::NoOptions,
            doc: "where an expansion starts",
        },
    ],
    gives: "an answer with a picture, and its parts: `intervals` of temperature within the tolerance, first the one that \
            holds 298.15 K or the start of the expansion; `worse_than_none`, where the correction is farther off than no \
            correction; `range`, where all species have functions",
    doc: "Finds all temperatures at which a shortcut for the reaction enthalpy stays within a tolerance of the full integral.",
    source: "definition of Cp; IUPAC Green Book, 3rd ed., section 2.11 (from memory)",
    example: "valid_to(reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\"), \"constant-heat-capacity\", \"1 kJ/mol\")",
    claims: &[],
    alternatives: &[],
    run: valid_to,
    check_line: None,
    caution: None,
};

pub static COMPARE_SHORTCUTS: Card = Card {
    id: "shortcut.compare",
    name: "compare_shortcuts",
    on: On::Nothing,
    args: &[
        REACTION,
        Arg { name: "T", takes: Takes::Temperature, default: Default::Required, doc: "temperature" },
        Arg {
            name: "options",
            takes: Takes::Options(&[ABOUT, Arg { default: Default::Absent, ..TOLERANCE }]),
            default: Default::NoOptions,
            doc: "where an expansion starts, and the tolerance that the picture marks",
        },
    ],
    gives: "an answer with a picture, and its parts: `full`, the enthalpy by the full integral; by the name of each shortcut \
            what it gives; `errors`, a map from each name to what it is off by",
    doc: "Sets the reaction enthalpy by every shortcut beside the full integral, each with its error.",
    source: "definition of Cp; IUPAC Green Book, 3rd ed., section 2.11 (from memory)",
    example: "compare_shortcuts(reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\"), \"1000 K\")",
    claims: &[],
    alternatives: &[],
    run: compare,
    check_line: None,
    caution: None,
};

/// How the error of a shortcut goes with temperature.
#[derive(Clone, Debug, PartialEq)]
pub struct Course {
    pub shortcut: Shortcut,
    /// K and J/mol
    pub points: Vec<(f64, f64)>,
}

/// Where a shortcut stays within a tolerance.
pub struct Validity {
    pub reaction: String,
    pub shortcut: Shortcut,
    pub tolerance: Quantity,
    pub tolerance_si: f64,
    /// First the one that holds the temperature at which the shortcut starts out right.
    pub intervals: Vec<(f64, f64)>,
    pub worse_than_none: Vec<(f64, f64)>,
    pub range: (f64, f64),
    /// The shortcut, and no correction beside it where that is another one.
    pub courses: Vec<Course>,
}

/// The reaction enthalpy by every shortcut.
pub struct SideBySide {
    pub reaction: String,
    pub t_k: f64,
    pub full: Quantity,
    pub ways: Vec<Way>,
    pub tolerance_si: Option<f64>,
    pub courses: Vec<Course>,
}

/// One shortcut, and what it is off by.
pub struct Way {
    pub shortcut: Shortcut,
    pub value: Quantity,
    pub error: Quantity,
}

impl Validity {
    pub(super) fn parts(&self) -> Vec<(&'static str, Value)> {
        let list = |pairs: &[(f64, f64)]| Value::List(pairs.iter().map(|pair| kelvins(*pair)).collect());
        vec![
            ("intervals", list(&self.intervals)),
            ("worse_than_none", list(&self.worse_than_none)),
            ("range", kelvins(self.range)),
        ]
    }
}

impl SideBySide {
    pub(super) fn parts(&self) -> Vec<(&'static str, Value)> {
        let mut parts = vec![("full", Value::Quantity(self.full.clone()))];
        parts.extend(self.ways.iter().map(|way| (way.shortcut.id(), Value::Quantity(way.value.clone()))));
        let error = |way: &Way| (way.shortcut.id().to_owned(), Value::Quantity(way.error.clone()));
        let errors: BTreeMap<String, Value> = self.ways.iter().map(error).collect();
        parts.push(("errors", Value::Options(Rc::new(errors))));
        parts
    }
}

/// What the errors of the shortcuts are computed from.
struct Heating<'a> {
    terms: &'a Terms,
    datasets: Vec<DatasetId>,
    /// Where all species have functions, K.
    range: (f64, f64),
    r: f64,
    cx: &'a Cx<'a>,
}

impl<'a> Heating<'a> {
    fn of(terms: &'a Terms, cx: &'a Cx<'a>) -> Result<Self, Fault> {
        let mut range = (0.0_f64, f64::INFINITY);
        for term in terms.terms() {
            let own = range_of(term, terms, cx.data())?;
            range = (range.0.max(own.0), range.1.min(own.1));
        }
        if !(range.0 <= T_REFERENCE && T_REFERENCE <= range.1) {
            return Err(ShortcutError::NoCommonRange { reaction: terms.text().to_owned() }.into());
        }
        let datasets = gather::datasets_for(terms, &gather::Formation::First, cx.data());
        // The formation enthalpies cancel, so it does not matter from where they are.
        let datasets = datasets.or_else(|_| gather::datasets_for(terms, &gather::Formation::Mixed, cx.data()))?;
        Ok(Heating { terms, datasets, range, r: cx.constants().molar_gas.value, cx })
    }

    /// ΔrH(T) − ΔrH(298.15 K) in J/mol.
    fn increment(&self, t_k: f64, mode: HeatCapacity) -> Result<f64, Fault> {
        let mut sum = 0.0;
        for (term, dataset) in self.terms.terms().iter().zip(&self.datasets) {
            let contribution = gather::contribution(term, dataset, t_k, mode, self.cx)?;
            sum += contribution.nu * contribution.increment.map_or(0.0, |figure| figure.si);
        }
        Ok(sum)
    }

    fn error(&self, shortcut: Shortcut, t_k: f64) -> Result<f64, Fault> {
        match shortcut {
            Shortcut::InternalEnergy => Ok(-self.terms.delta_n_gas() * self.r * t_k),
            Shortcut::NoCorrection => Ok(-self.increment(t_k, HeatCapacity::Full)?),
            _ => Ok(self.increment(t_k, shortcut.heat_capacity())? - self.increment(t_k, HeatCapacity::Full)?),
        }
    }

    /// By how much the shortcut is farther off than no correction: positive where it is worse.
    fn excess_over_none(&self, shortcut: Shortcut, t_k: f64) -> Result<f64, Fault> {
        let (by, none) = (self.error(shortcut, t_k)?, self.error(Shortcut::NoCorrection, t_k)?);
        Ok(by.abs() - none.abs() - ROUNDING)
    }

    fn course(&self, shortcut: Shortcut, (from, to): (f64, f64)) -> Result<Course, Fault> {
        let at = |i: u32| from + (to - from) * f64::from(i) / f64::from(PIECES);
        let points: Result<_, Fault> = (0..=PIECES).map(|i| Ok((at(i), self.error(shortcut, at(i))?))).collect();
        Ok(Course { shortcut, points: points? })
    }

    /// The intervals in which `excess` is not positive, each with ends to 1e-6 K.
    fn intervals(&self, excess: impl Fn(f64) -> Result<f64, Fault>) -> Result<Vec<(f64, f64)>, Fault> {
        let range = self.range;
        let steps = (range.1 - range.0).ceil() as usize;
        // The reference temperature is a point of the grid, since there most errors vanish.
        let mut grid: Vec<f64> = (0..=steps).map(|i| (range.0 + i as f64).min(range.1)).collect();
        grid.push(T_REFERENCE);
        grid.sort_by(f64::total_cmp);
        let crossing = |mut a: f64, mut b: f64, starts_inside: bool| {
            while b - a > 1e-6 {
                let middle = 0.5 * (a + b);
                if (excess(middle)? <= 0.0) == starts_inside { a = middle } else { b = middle }
            }
            Ok::<f64, Fault>(0.5 * (a + b))
        };
        let mut found = Vec::new();
        let mut open = (excess(grid[0])? <= 0.0).then_some(grid[0]);
        for pair in grid.windows(2) {
            if let Some(fault) = (self.cx.halted)() {
                return Err(fault);
            }
            match (open, excess(pair[1])? <= 0.0) {
                (None, true) => open = Some(crossing(pair[0], pair[1], false)?),
                (Some(from), false) => {
                    found.push((from, crossing(pair[0], pair[1], true)?));
                    open = None;
                }
                _ => {}
            }
        }
        found.extend(open.map(|from| (from, range.1)));
        Ok(found)
    }
}

/// J/mol. Bound: what rounding leaves of two sums of terms up to 1e7 J/mol that ought to be equal.
const ROUNDING: f64 = 1e-6;

/// Straight pieces of a curve in a picture.
const PIECES: u32 = 120;

/// Where a term has functions, K, changes of phase on the way included. Two phases that the equation tells apart stay two.
pub(super) fn range_of(term: &Term, terms: &Terms, data: &Catalog) -> Result<(f64, f64), GatherError> {
    if let Some(own) = &term.own {
        return Ok(own.range_k());
    }
    let species = || term.substance.id().to_owned();
    let function = term.substance.function.as_ref();
    let function = function.ok_or_else(|| GatherError::NoFunction { species: species(), t_k: T_REFERENCE })?;
    let entity = |term: &Term| term.substance.species.entity;
    let told_apart = terms.terms().iter().filter(|other| entity(other) == entity(term)).count() > 1;
    let reach_k = if told_apart { None } else { path::reach_k(&term.substance, data) };
    Ok((function.t_min, reach_k.unwrap_or(function.t_max)))
}

/// What a tolerance is in J/mol.
fn tolerance_si(tolerance: &Quantity) -> Result<f64, Fault> {
    let given = || ShortcutError::Tolerance { given: crate::quantity::text::shown_plain(tolerance) };
    let si = tolerance.to(parse::unit("J/mol[rxn]")?).map_err(|_| given())?.si();
    if si > 0.0 { Ok(si) } else { Err(given().into()) }
}

fn valid_to(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let tolerance = call.quantity(2);
    let tolerance_si = tolerance_si(tolerance)?;
    let shortcut = Shortcut::named(call.text(1), call.option_quantity("about").map(Quantity::si))?;
    let heating = Heating::of(terms, cx)?;
    let mut within = heating.intervals(|t_k| Ok(heating.error(shortcut, t_k)?.abs() - tolerance_si))?;
    let start = shortcut.start_k();
    within.sort_by_key(|(from, to)| !(*from <= start && start <= *to));
    let worse_than_none = match shortcut.corrects() {
        true => heating.intervals(|t_k| Ok(-heating.excess_over_none(shortcut, t_k)?))?,
        false => Vec::new(),
    };
    let shown = shown_range(&heating, start, &within, &worse_than_none);
    let mut courses = vec![heating.course(shortcut, shown)?];
    if shortcut.corrects() {
        courses.push(heating.course(Shortcut::NoCorrection, shown)?);
    }
    let answer = Validity {
        reaction: terms.text().to_owned(),
        shortcut,
        tolerance: tolerance.clone(),
        tolerance_si,
        intervals: within,
        worse_than_none,
        range: heating.range,
        courses,
    };
    Ok(Value::Answer(Answer::Validity(Rc::new(answer))))
}

/// What a picture shows: as far as anything changes, and some way on.
fn shown_range(heating: &Heating, start: f64, within: &[(f64, f64)], worse: &[(f64, f64)]) -> (f64, f64) {
    let ends = within.iter().chain(worse).flat_map(|(from, to)| [*from, *to]);
    let changes = ends.filter(|t| *t > heating.range.0 && *t < heating.range.1);
    let last = changes.fold(start.max(T_REFERENCE) + 200.0, f64::max);
    (heating.range.0, heating.range.1.min(last + 0.2 * (last - heating.range.0)))
}

/// The ends of an interval: computed temperatures, exact as far as the functions are.
fn kelvins((from, to): (f64, f64)) -> Value {
    let end = |t_k: f64| {
        let input = Input { u: Some(0.0), digit: Some(0.1), ..Input::of(LeafKey::Own(format!("{t_k} K").into())) };
        let kind = Kind::of(What::OpenTemperature);
        let made = Quantity::input(t_k, Dimension::base(Base::Kelvin), kind, input, None);
        made.map_or(Value::Nothing, Value::Quantity)
    };
    Value::List(vec![end(from), end(to)])
}

fn compare(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let t = call.quantity(1);
    let about_k = call.option_quantity("about").map(Quantity::si);
    let tolerance_si = call.option_quantity("tolerance").map(tolerance_si).transpose()?;
    let method = Method::from_words(None, None, cx.data())?;
    // The value by a shortcut, with the inputs that it took.
    let value = |property, heat_capacity| {
        let method = Method { heat_capacity, ..method.clone() };
        property::value(property, terms, t, &method, call, cx)
    };
    let full = value(Property::H, HeatCapacity::Full)?;
    let mut shortcuts = vec![Shortcut::Constant, Shortcut::Midpoint, Shortcut::Mean];
    shortcuts.extend(about_k.map(|about_k| Shortcut::FirstOrder { about_k }));
    shortcuts.extend([Shortcut::NoCorrection, Shortcut::InternalEnergy]);
    let mut ways = Vec::with_capacity(shortcuts.len());
    for shortcut in shortcuts {
        let property = if shortcut == Shortcut::InternalEnergy { Property::U } else { Property::H };
        let value = value(property, shortcut.heat_capacity())?;
        let error = answer::width(call, &full, value.si() - full.si())?;
        ways.push(Way { shortcut, value, error });
    }
    let courses = courses(terms, cx, t.si(), about_k, &ways)?;
    let (reaction, t_k) = (terms.text().to_owned(), t.si());
    Ok(Value::Answer(Answer::SideBySide(Rc::new(SideBySide { reaction, t_k, full, ways, tolerance_si, courses }))))
}

/// The errors from 298.15 K, or where an expansion starts, to T and some way beyond. None where no common range is at hand.
fn courses(terms: &Terms, cx: &Cx, t_k: f64, about_k: Option<f64>, ways: &[Way]) -> Result<Vec<Course>, Fault> {
    let Ok(heating) = Heating::of(terms, cx) else { return Ok(Vec::new()) };
    let starts = [T_REFERENCE, about_k.unwrap_or(T_REFERENCE), t_k];
    let (low, high) = starts.iter().fold((f64::INFINITY, 0.0_f64), |(l, h), t| (l.min(*t), h.max(*t)));
    let room = (0.15 * (high - low)).max(50.0);
    let shown = (heating.range.0.max(low - room), heating.range.1.min(high + room));
    // ΔrU is off by Δn(gas) R T, a straight line that would only hide the others.
    let drawn = ways.iter().map(|way| way.shortcut).filter(|shortcut| *shortcut != Shortcut::InternalEnergy);
    drawn.map(|shortcut| heating.course(shortcut, shown)).collect()
}
