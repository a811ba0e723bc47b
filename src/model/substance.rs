//! A pure substance in one phase, asked for its properties per mole of it.
//!
//! H(T) − H(T₁) = ∫Cp dT, from the function's closed form, + ΣΔtrsH of the changes of phase between
//! (zero: the substance itself at T₁)
//!
//! Its enthalpy is counted from the elements at 298.15 K; an increment is counted from the substance itself. The two have
//! different zeros and are kept apart.
//! Source: definition of Cp; IUPAC Green Book, 3rd ed., section 2.11 (from memory).

use std::ops::Deref;
use std::rc::Rc;
use std::sync::Arc;

use smallvec::SmallVec;

use crate::data::catalog::Catalog;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Sources, Takes, Value};
use crate::model::check_line;
use crate::model::function::{self, T_REFERENCE};
use crate::model::gather::{self, Figure, FigureOrigin, GatherError};
use crate::model::path::{self, FROM_START, Leg, Phase, Route};
use crate::model::property::{self, Property};
use crate::model::stated;
use crate::model::terms::{Term, Terms};
use crate::model::thermo::Thermo;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey};
use crate::units::constants::STANDARD_PRESSURE;
use crate::units::{Kind, State, What, Zero};

/// One phase of a substance, per mole of it.
pub struct PureSubstance {
    terms: Terms,
    onward: Vec<(f64, Phase)>,
}

impl PureSubstance {
    pub fn new(substance: Arc<Substance>) -> Self {
        let (per, text) = (substance.species.entity, substance.id().to_owned());
        PureSubstance { terms: Terms::new(vec![Term::of_tables(substance, 1.0)], per, text), onward: Vec::new() }
    }

    /// With the phases it changes to on heating.
    pub fn on_record(substance: Arc<Substance>, data: &Catalog) -> Self {
        let onward = path::onward_phases(&substance, data);
        PureSubstance { onward, ..PureSubstance::new(substance) }
    }

    pub(super) fn made_by(&mut self, call: &Rc<Call>) {
        self.terms.made_by(call);
    }

    /// The phases that are inserted on heating, each with the temperature it begins at.
    pub fn onward(&self) -> &[(f64, Phase)] {
        &self.onward
    }

    /// The same with other figures.
    pub(super) fn answered_by(term: Term) -> Self {
        let (per, text) = (term.substance.species.entity, term.substance.id().to_owned());
        PureSubstance { terms: Terms::new(vec![term], per, text), onward: Vec::new() }
    }

    /// What answers for it in place of the tables.
    pub fn thermo(&self) -> Option<&Rc<dyn Thermo>> {
        self.terms.terms()[0].own.as_ref()
    }

    pub fn record(&self) -> &Arc<Substance> {
        &self.terms.terms()[0].substance
    }
}

impl Deref for PureSubstance {
    type Target = Terms;

    fn deref(&self) -> &Terms {
        &self.terms
    }
}

pub static SUBSTANCE: Card = Card {
    id: "substance.read",
    name: "substance",
    on: On::Nothing,
    args: &[Arg {
        name: "name",
        takes: Takes::Text,
        default: Default::Required,
        doc: "a name with phase, such as \"CO2(g)\" or \"C(cr,graphite)\"",
    }],
    gives: "a substance in one phase",
    doc: "Looks up a substance by its name with phase: formula or name, then (g), (l), (cr), (aq) or a crystal form.",
    source: "IUPAC Green Book, 3rd ed., section 2.10.1 (notation; from memory)",
    example: "substance(\"H2O(l)\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| Ok(Value::Substance(Rc::new(PureSubstance::on_record(cx.data().find(call.text(0))?, cx.data())))),
    check_line: None,
    caution: None,
};

pub static SUBSTANCES: Card = Card {
    id: "substance.search",
    name: "substances",
    on: On::Nothing,
    args: &[Arg {
        name: "text",
        takes: Takes::Text,
        default: Default::Required,
        doc: "a part of a name or formula, upper and lower case alike",
    }],
    gives: "the names with phase of the substances on record that hold the text",
    doc: "Lists substances on record by a part of their name or formula.",
    source: "the shipped tables",
    example: "substances(\"methan\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let found = cx.data().search(call.text(0));
        Ok(Value::List(found.iter().map(|substance| Value::Text(substance.id().into())).collect()))
    },
    check_line: None,
    caution: None,
};

macro_rules! increment_card {
    ($name:ident, $id:literal, $on:expr, $gives:literal, $doc:literal, $of:literal) => {
        pub static $name: Card = Card {
            id: $id,
            name: "enthalpy_increment",
            on: $on,
            args: INCREMENT_ARGS,
            gives: $gives,
            doc: $doc,
            source: "definition of Cp; IUPAC Green Book, 3rd ed., section 2.11 (from memory)",
            example: concat!($of, ".enthalpy_increment(\"450 degC\", \"25 degC\")"),
            claims: &[],
            alternatives: &[],
            run: increment,
            check_line: Some(check_line),
            caution: None,
        };
    };
}

const INCREMENT_ARGS: &[Arg] = &[
    Arg {
        name: "T",
        takes: Takes::Temperatures,
        default: Default::Required,
        doc: "end temperature; with a grid of them the answer is a curve",
    },
    Arg {
        name: "from",
        takes: Takes::Temperature,
        default: Default::Absent,
        doc: "start temperature; 298.15 K unless given",
    },
];

increment_card!(
    ENTHALPY_INCREMENT,
    "substance.enthalpy-increment",
    On::Substance,
    "H(T) - H(from) per mole of the substance, zero: the substance itself at the start",
    "Enthalpy taken up on heating, from the function's closed-form integral of Cp; recorded changes between condensed phases \
     on the way are included.",
    "substance(\"CO2(g)\")"
);
increment_card!(
    REACTION_INCREMENT,
    "reaction.enthalpy-increment",
    On::Reaction,
    "ΔrH(T) - ΔrH(from) per mole of reaction as written",
    "Change of the reaction enthalpy between two temperatures: what is added to a figure of one's own at the start.",
    "reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\")"
);

/// H(T) and H(from) of one species, with its stoichiometric number.
struct Heated {
    nu: f64,
    end: f64,
    start: f64,
    cp: (f64, f64),
    difference: Figure,
}

fn heated(term: &Term, t_k: f64, from_k: f64, cx: &Cx) -> Result<Heated, Fault> {
    let record = &term.substance;
    let species = || record.id().to_owned();
    if let Some(own) = &term.own {
        let (t_min, t_max) = own.range_k();
        if let Some(outside) = [t_k, from_k].into_iter().find(|t| !(t_min <= *t && *t <= t_max)) {
            return Err(GatherError::Range { species: species(), t_k: outside, t_min, t_max }.into());
        }
        let (end, start) = (own.at(cx, t_k)?, own.at(cx, from_k)?);
        return Ok(Heated {
            nu: term.nu,
            difference: Figure::combined(&[(&end.increment, 1.0), (&start.increment, -1.0)]),
            end: end.increment.si,
            start: start.increment.si,
            cp: (end.cp.si, start.cp.si),
        });
    }
    let function = record.function.as_ref().ok_or_else(|| GatherError::NoFunction { species: species(), t_k })?;
    let (lower, upper) = (t_k.min(from_k), t_k.max(from_k));
    if !(function.covers(lower) && function.covers(upper)) {
        let (t_min, t_max) = (function.t_min, function.t_max);
        if lower < t_min {
            return Err(GatherError::Range { species: species(), t_k: lower, t_min, t_max }.into());
        }
        return over_changes(term, &Route::to(record, upper, cx.data())?, t_k, from_k);
    }
    let (end, start) = (function::evaluate(function, t_k), function::evaluate(function, from_k));
    let input = Input {
        digit: Some(1.0),
        citation: Some(function.citation.clone()),
        ..Input::of(LeafKey::Datum {
            dataset: function.dataset.shared(),
            record: record.species.id.clone(),
            field: gather::HEAT_CAPACITY,
            t_bits: t_k.to_bits(),
            way: FROM_START,
        })
    };
    // What is drawn from the function is the difference; start and end of one function are not two figures.
    let difference = Figure { si: end.h - start.h, origin: input.into(), printed: None };
    let difference = stated::scaled(difference, function, record, stated::energy_dim())?;
    Ok(Heated { nu: term.nu, end: end.h, start: start.h, cp: (end.cp, start.cp), difference })
}

/// The same over changes of phase on the way; cooling is heating the other way round.
fn over_changes(term: &Term, route: &Route, t_k: f64, from_k: f64) -> Result<Heated, Fault> {
    let legs = route.legs_from(t_k.min(from_k));
    let difference = Figure::sum_of_nodes(legs.iter().map(Leg::node).collect::<Result<Vec<_>, Fault>>()?);
    let way = if t_k < from_k { -1.0 } else { 1.0 };
    let cp = |t_k: f64| way * route.phase_at(t_k).at(t_k).cp;
    Ok(Heated { nu: way * term.nu, end: difference.si, start: 0.0, cp: (cp(t_k), cp(from_k)), difference })
}

/// The two temperatures of a call, in kelvin.
fn span(call: &Call) -> (f64, f64) {
    let from_k = match &call.args[2] {
        Value::Quantity(from) => from.si(),
        _ => T_REFERENCE,
    };
    (call.quantity(1).si(), from_k)
}

fn increment(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction or a substance", call.card.id) };
    let (t_k, from_k) = span(call);
    let (mut si, mut slopes, mut inputs) = (0.0, (0.0, 0.0), SmallVec::new());
    for term in terms.terms() {
        let heated = heated(term, t_k, from_k, cx)?;
        si += heated.nu * (heated.end - heated.start);
        slopes = (slopes.0 + heated.nu * heated.cp.0, slopes.1 - heated.nu * heated.cp.1);
        property::enter(&mut inputs, &heated.difference, heated.nu, Property::H)?;
    }
    let from = match &call.args[2] {
        Value::Quantity(from) => Some(from),
        _ => None,
    };
    for (temperature, slope) in [(Some(call.quantity(1)), slopes.0), (from, slopes.1)] {
        if let Some(temperature) = temperature {
            inputs.push((property::as_argument(temperature), slope));
        }
    }
    let state = State {
        zero: Some(Zero::From(from_k)),
        t_k: Some(t_k),
        p_pa: Some(STANDARD_PRESSURE.value),
        standard: true,
        reaction: terms.is_reaction(),
    };
    let dim = property::dimension(Property::H, terms.per());
    let kind = Kind::in_state(What::H, state);
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(si, dim, kind, inputs, step, cx.place.clone())?))
}

fn check_line(cx: &Cx, call: &Call, value: &Quantity, sources: &mut Sources) -> String {
    let Some(terms) = call.terms() else { return String::new() };
    let (t_k, from_k) = span(call);
    let mut line = String::new();
    for term in terms.terms() {
        let Ok(heated) = heated(term, t_k, from_k, cx) else { return String::new() };
        let (end, start) = (heated.end / 1000.0, heated.start / 1000.0);
        let figures = match &heated.difference.origin {
            FigureOrigin::Nodes(_) if term.own.is_none() => {
                check_line::figures_of(&heated.difference, sources, &check_line::kilo)
            }
            _ => {
                let source = heated.difference.citation().map(|c| format!("[{}]", sources.number(c)));
                format!("({end:.3} - ({start:.3})){}", source.unwrap_or_default())
            }
        };
        let sign = match (line.is_empty(), heated.nu < 0.0) {
            (true, false) => "",
            (true, true) => "-",
            (false, false) => " + ",
            (false, true) => " - ",
        };
        let nu = if heated.nu.abs() == 1.0 { String::new() } else { format!("{} × ", heated.nu.abs()) };
        line.push_str(&format!("{sign}{nu}{figures}"));
    }
    format!("{line} = {:.3} kJ/mol", value.si() / 1000.0)
}
