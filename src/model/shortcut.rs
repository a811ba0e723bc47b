//! Where a shortcut serves, and where it is worse than none.
//!
//! error(T) = ΔrH by the shortcut − ΔrH by the integral of ΔrCp
//!
//! | shortcut                 | error                                         |
//! |--------------------------|-----------------------------------------------|
//! | `no-correction`          | −[ΔrH(T) − ΔrH(298.15 K)]                      |
//! | `constant-heat-capacity` | ΔrCp(298.15 K) (T − 298.15 K) − [ΔrH(T) − ΔrH(298.15 K)] |
//!
//! The formation enthalpies cancel, so the answer is that of the heat capacity functions alone. Ends are bracketed on a grid
//! of 1 K and then bisected: an excursion narrower than the grid would be missed, and no function of the shipped range has one.
//! Source: definition of Cp; IUPAC Green Book, 3rd ed., section 2.11 (from memory).

use std::collections::BTreeMap;
use std::rc::Rc;

use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::function::{self, T_REFERENCE};
use crate::model::gather::{GatherError, HeatCapacity, Method};
use crate::model::property::{self, Property};
use crate::model::terms::Terms;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey};
use crate::units::{Base, Dimension, Kind, What, parse};

const NO_CORRECTION: &str = "no-correction";
const CONSTANT: &str = "constant-heat-capacity";
const WORDS: &[&str] = &[NO_CORRECTION, CONSTANT];

/// Why no interval can be given.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum ShortcutError {
    #[error("the heat capacity functions of {reaction} have no common range that holds 298.15 K")]
    NoCommonRange { reaction: String },
    #[error("a tolerance of {given} is not a positive energy per mole")]
    Tolerance { given: String },
}

impl Explain for ShortcutError {
    fn code(&self) -> &'static str {
        match self {
            ShortcutError::NoCommonRange { .. } => "no-common-range",
            ShortcutError::Tolerance { .. } => "tolerance-not-positive",
        }
    }

    fn hint(&self) -> String {
        match self {
            ShortcutError::NoCommonRange { .. } => "choose phases that exist at 298.15 K".to_owned(),
            ShortcutError::Tolerance { .. } => "give it as in \"1 kJ/mol\"".to_owned(),
        }
    }
}

const REACTION: Arg = Arg { name: "reaction", takes: Takes::Reaction, default: Default::Required, doc: "a reaction" };

pub static VALID_TO: Card = Card {
    id: "shortcut.valid-to",
    name: "valid_to",
    on: On::Nothing,
    args: &[
        REACTION,
        Arg { name: "shortcut", takes: Takes::Word(WORDS), default: Default::Required, doc: "which shortcut" },
        Arg {
            name: "tolerance",
            takes: Takes::AnyQuantity,
            default: Default::Required,
            doc: "the largest error allowed in the reaction enthalpy, such as \"1 kJ/mol\"",
        },
    ],
    gives: "a map: `intervals` of temperature within the tolerance, first the one that holds 298.15 K; `worse_than_none`, \
            where the correction is farther off than no correction; `range`, where all species have functions",
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
    args: &[REACTION, Arg { name: "T", takes: Takes::Temperature, default: Default::Required, doc: "temperature" }],
    gives: "a map from each way of taking the heat capacity to the reaction enthalpy it gives",
    doc: "Sets the reaction enthalpy by every shortcut beside the full integral.",
    source: "definition of Cp; IUPAC Green Book, 3rd ed., section 2.11 (from memory)",
    example: "compare_shortcuts(reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\"), \"1000 K\")",
    claims: &[],
    alternatives: &[],
    run: compare,
    check_line: None,
    caution: None,
};

/// What the errors of the shortcuts are computed from.
struct Heating<'a> {
    terms: &'a Terms,
    /// ΔrCp at 298.15 K, J/(mol K)
    cp: f64,
    /// Σ ν H(298.15 K), J/mol
    h: f64,
    range: (f64, f64),
}

impl<'a> Heating<'a> {
    fn of(terms: &'a Terms) -> Result<Self, Fault> {
        let (mut cp, mut h, mut range) = (0.0, 0.0, (0.0_f64, f64::INFINITY));
        for term in terms.terms() {
            let species = || term.substance.id().to_owned();
            let function = term.substance.function.as_ref();
            let function = function.ok_or_else(|| GatherError::NoFunction { species: species(), t_k: T_REFERENCE })?;
            range = (range.0.max(function.t_min), range.1.min(function.t_max));
            if !function.covers(T_REFERENCE) {
                return Err(ShortcutError::NoCommonRange { reaction: terms.text().to_owned() }.into());
            }
            let at = function::evaluate(function, T_REFERENCE);
            (cp, h) = (cp + term.nu * at.cp, h + term.nu * at.h);
        }
        Ok(Heating { terms, cp, h, range })
    }

    /// ΔrH(T) − ΔrH(298.15 K) in J/mol.
    fn increment(&self, t_k: f64) -> f64 {
        let at = |function: &crate::data::function::Function| function::evaluate(function, t_k).h;
        let sum: f64 =
            self.terms.terms().iter().map(|term| term.nu * term.substance.function.as_deref().map_or(0.0, at)).sum();
        sum - self.h
    }

    fn error(&self, shortcut: &str, t_k: f64) -> f64 {
        let corrected = if shortcut == CONSTANT { self.cp * (t_k - T_REFERENCE) } else { 0.0 };
        corrected - self.increment(t_k)
    }
}

/// The intervals of `range` in which `excess` is not positive, each with ends to 1e-6 K.
fn intervals(range: (f64, f64), excess: impl Fn(f64) -> f64) -> Vec<(f64, f64)> {
    let steps = (range.1 - range.0).ceil() as usize;
    // The reference temperature is a point of the grid, since every error vanishes there.
    let mut grid: Vec<f64> = (0..=steps).map(|i| (range.0 + i as f64).min(range.1)).collect();
    grid.push(T_REFERENCE);
    grid.sort_by(f64::total_cmp);
    let crossing = |mut a: f64, mut b: f64| {
        let starts_inside = excess(a) <= 0.0;
        while b - a > 1e-6 {
            let middle = 0.5 * (a + b);
            if (excess(middle) <= 0.0) == starts_inside { a = middle } else { b = middle }
        }
        0.5 * (a + b)
    };
    let mut found = Vec::new();
    let mut open = (excess(grid[0]) <= 0.0).then_some(grid[0]);
    for pair in grid.windows(2) {
        match (open, excess(pair[1]) <= 0.0) {
            (None, true) => open = Some(crossing(pair[0], pair[1])),
            (Some(from), false) => {
                found.push((from, crossing(pair[0], pair[1])));
                open = None;
            }
            _ => {}
        }
    }
    found.extend(open.map(|from| (from, range.1)));
    found
}

fn valid_to(_: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let (shortcut, tolerance) = (call.text(1), call.quantity(2));
    let molar = parse::unit("J/mol[rxn]")?;
    let given = || ShortcutError::Tolerance { given: crate::quantity::text::shown_plain(tolerance) };
    let tolerance_si = tolerance.to(molar).map_err(|_| given())?.si();
    if tolerance_si <= 0.0 {
        return Err(given().into());
    }
    let heating = Heating::of(terms)?;
    let mut within = intervals(heating.range, |t_k| heating.error(shortcut, t_k).abs() - tolerance_si);
    within.sort_by_key(|(from, to)| !(*from <= T_REFERENCE && T_REFERENCE <= *to));
    let worse = match &**shortcut {
        CONSTANT => intervals(heating.range, |t_k| {
            let (by, none) = (heating.error(CONSTANT, t_k).abs(), heating.error(NO_CORRECTION, t_k).abs());
            // At 298.15 K both vanish, and neither is worse.
            if t_k == T_REFERENCE { 1.0 } else { none - by }
        }),
        _ => Vec::new(),
    };
    let list = |pairs: Vec<(f64, f64)>| {
        let pair = |(from, to)| Ok(Value::List(vec![kelvin(from)?, kelvin(to)?]));
        Ok::<Value, Fault>(Value::List(pairs.into_iter().map(pair).collect::<Result<_, Fault>>()?))
    };
    let range = Value::List(vec![kelvin(heating.range.0)?, kelvin(heating.range.1)?]);
    let answer = [("intervals", list(within)?), ("worse_than_none", list(worse)?), ("range", range)];
    Ok(Value::Options(Rc::new(answer.map(|(name, value)| (name.to_owned(), value)).into())))
}

/// A computed temperature, exact as far as the functions are.
fn kelvin(t_k: f64) -> Result<Value, Fault> {
    let input = Input { u: Some(0.0), digit: Some(0.1), ..Input::of(LeafKey::Own(format!("{t_k} K").into())) };
    let kind = Kind::of(What::OpenTemperature);
    Ok(Value::Quantity(Quantity::input(t_k, Dimension::base(Base::Kelvin), kind, input, None)?))
}

fn compare(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let mut answer = BTreeMap::new();
    let full = Method::from_words(None, None, cx.data())?;
    for (name, heat_capacity) in [
        ("full", HeatCapacity::Full),
        (CONSTANT, HeatCapacity::Constant),
        ("midpoint", HeatCapacity::Midpoint),
        ("mean", HeatCapacity::Mean),
        (NO_CORRECTION, HeatCapacity::Neglected),
    ] {
        let method = Method { heat_capacity, ..full.clone() };
        // The value by a shortcut, with the inputs that it took.
        let value = property::value(Property::H, terms, call.quantity(1), &method, call, cx)?;
        answer.insert(name.to_owned(), Value::Quantity(value));
    }
    Ok(Value::Options(Rc::new(answer)))
}
