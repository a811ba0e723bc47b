//! The cycle behind a reaction enthalpy at T, leg by leg: reactants to 298.15 K, the reaction there, products to T.
//!
//! ΔrH°(T) = Σ legs = −Σ(reactants) ν [H(T) − H(298.15 K)] + ΔrH°(298.15 K) + Σ(products) ν [H(T) − H(298.15 K)]
//!
//! | symbol        | unit  | meaning                                                             |
//! |---------------|-------|---------------------------------------------------------------------|
//! | H(T) − H(298.15 K) | J/mol | per species, a leg for each phase heated and for each change of phase |
//! | ν             | 1     | size of the stoichiometric number                                   |
//!
//! All legs are per mole of reaction as written. The legs rest on the figures that the reaction enthalpy rests on; what they
//! leave open when added up is rounding, and is shown. The surprise: a phase that does not exist at 298.15 K continues the
//! enthalpy scale of another, so its legs pass through that one, and its change of phase is the difference of the two functions.
//! Source: Hess's law; IUPAC Green Book, 3rd ed., section 2.11 (from memory).

use std::rc::Rc;

use smallvec::SmallVec;

use crate::data::catalog::Catalog;
use crate::fault::Fault;
use crate::model::answer::Answer;
use crate::model::card::{self, Call, Card, Cx, On, Sources, Value};
use crate::model::function::T_REFERENCE;
use crate::model::gather::{self, Contribution, Figure, HeatCapacity, Method};
use crate::model::path::{self, Leg, Phase, Route};
use crate::model::property::{self, Property};
use crate::model::property_card::{self, ENTHALPY};
use crate::model::terms::Term;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey, Node};
use crate::source::Citation;
use crate::units::{Base, Dimension, Kind, What};

/// What happens on a leg.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Happens {
    Cooling,
    Heating,
    PhaseChange,
    Reaction,
}

impl Happens {
    pub fn word(self) -> &'static str {
        match self {
            Happens::Cooling => "cooling",
            Happens::Heating => "heating",
            Happens::PhaseChange => "phase change",
            Happens::Reaction => "reaction",
        }
    }
}

/// One leg.
pub struct CycleLeg {
    pub happens: Happens,
    /// `Fe(cr,gamma)`, `Fe(cr,gamma) -> Fe(cr,alpha)`, or the equation.
    pub what: String,
    pub from_k: f64,
    pub to_k: f64,
    /// Moles of it per mole of reaction.
    pub nu: f64,
    /// Per mole of reaction.
    pub dh: Quantity,
    /// Numbers of its sources.
    pub sources: Vec<usize>,
}

/// A reaction enthalpy, leg by leg.
pub struct Cycle {
    pub equation: String,
    pub t_k: f64,
    pub legs: Vec<CycleLeg>,
    pub sum: Quantity,
    /// The reaction enthalpy as asked for alone.
    pub total: Quantity,
    /// What the legs leave open, J/mol.
    pub residual: f64,
    pub sources: Vec<Citation>,
}

impl Cycle {
    pub(super) fn parts(&self) -> Vec<(&'static str, Value)> {
        let row = |leg: &CycleLeg| {
            let text = |text: &str| Value::Text(text.into());
            let point = |t_k: f64| point(t_k).map_or(Value::Nothing, Value::Quantity);
            let columns = [
                ("leg", text(leg.happens.word())),
                ("species", text(&leg.what)),
                ("from", point(leg.from_k)),
                ("to", point(leg.to_k)),
                ("dH", Value::Quantity(leg.dh.clone())),
            ];
            Value::Options(Rc::new(columns.map(|(name, value)| (name.to_owned(), value)).into()))
        };
        vec![
            ("rows", Value::List(self.legs.iter().map(row).collect())),
            ("sum", Value::Quantity(self.sum.clone())),
            ("total", Value::Quantity(self.total.clone())),
        ]
    }
}

/// A temperature that the calculation sets, without uncertainty.
fn point(t_k: f64) -> Result<Quantity, Fault> {
    let input = Input { u: Some(0.0), ..Input::of(LeafKey::Own(format!("{t_k} K").into())) };
    Ok(Quantity::input(t_k, Dimension::base(Base::Kelvin), Kind::of(What::TemperaturePoint), input, None)?)
}

pub static CYCLE: Card = Card {
    id: "reaction.cycle",
    name: "cycle",
    on: On::Reaction,
    args: property_card::ARGS,
    gives: "the legs with their enthalpies, as a table and a picture; its parts are `rows` (a list of maps with `leg`, \
            `species`, `from`, `to`, `dH`), `sum` and `total`",
    doc: "The cycle behind the reaction enthalpy at T, leg by leg: reactants to 298.15 K, the reaction there, products to T, \
          each change of phase a leg of its own.",
    source: "Hess's law; IUPAC Green Book, 3rd ed., section 2.11 (from memory)",
    example: "reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\").cycle(\"450 degC\")",
    claims: &[],
    alternatives: &[],
    caution: None,
    run: |cx, call| Ok(Value::Answer(Answer::Cycle(Rc::new(cycle(cx, call)?)))),
    check_line: None,
};

/// A leg of one species on its way up from 298.15 K, per mole of it.
struct Up {
    happens: Happens,
    from: String,
    /// Where a change of phase leads.
    to: Option<String>,
    from_k: f64,
    to_k: f64,
    figure: Figure,
}

impl Up {
    fn heating(phase: &str, from_k: f64, to_k: f64, figure: Figure) -> Up {
        let happens = if to_k < from_k { Happens::Cooling } else { Happens::Heating };
        Up { happens, from: phase.to_owned(), to: None, from_k, to_k, figure }
    }

    fn change(from: &str, to: &str, t_k: f64, figure: Figure) -> Up {
        let to = Some(to.to_owned());
        Up { happens: Happens::PhaseChange, from: from.to_owned(), to, from_k: t_k, to_k: t_k, figure }
    }
}

fn cycle(cx: &Cx, call: &Rc<Call>) -> Result<Cycle, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let Value::Quantity(total) = card::call(cx, &ENTHALPY, call.args.clone())? else {
        unreachable!("a reaction enthalpy is a quantity")
    };
    let (t_k, method) = (call.quantity(1).si(), property::method_of(call, cx)?);
    let contributions = gather::contributions(terms, t_k, &method, cx)?;
    let mut ups = Vec::with_capacity(contributions.len());
    for (term, contribution) in terms.terms().iter().zip(&contributions) {
        ups.push(upward(term, contribution, t_k, &method, cx.data())?);
    }
    let mut sources = Sources::default();
    let mut legs = Vec::new();
    let sides = |products: bool| contributions.iter().zip(&ups).filter(move |(c, _)| (c.nu > 0.0) == products);
    for (contribution, up) in sides(false) {
        for leg in up.iter().rev() {
            legs.push(made(cx, call, leg, contribution.nu, &mut sources)?);
        }
    }
    let equation = at_reference(call, &ups, cx.data());
    legs.push(reaction_leg(cx, call, equation, &contributions, &mut sources)?);
    for (contribution, up) in sides(true) {
        for leg in up {
            legs.push(made(cx, call, leg, contribution.nu, &mut sources)?);
        }
    }
    let parts: Vec<(Rc<Node>, f64)> = legs.iter().map(|leg| (Rc::clone(leg.dh.node()), 1.0)).collect();
    let sum = enthalpy(cx, call, legs.iter().map(|leg| leg.dh.si()).sum(), parts.into())?;
    sources.number(&Citation::new(call.card.source, ""));
    let (equation, residual, sources) = (terms.text().to_owned(), sum.si() - total.si(), sources.list().to_vec());
    Ok(Cycle { equation, t_k, legs, sum, total, residual, sources })
}

/// A leg in the cycle: reactants go down, products up.
fn made(cx: &Cx, call: &Rc<Call>, up: &Up, nu: f64, sources: &mut Sources) -> Result<CycleLeg, Fault> {
    let down = nu < 0.0;
    let (from_k, to_k) = if down { (up.to_k, up.from_k) } else { (up.from_k, up.to_k) };
    let happens = match up.happens {
        Happens::Heating if down => Happens::Cooling,
        Happens::Cooling if down => Happens::Heating,
        other => other,
    };
    let what = match &up.to {
        None => up.from.clone(),
        Some(to) if down => format!("{to} -> {}", up.from),
        Some(to) => format!("{} -> {to}", up.from),
    };
    let mut inputs = SmallVec::new();
    property::enter(&mut inputs, &up.figure, nu, Property::H)?;
    let cited = numbers(&[&up.figure], sources);
    let dh = enthalpy(cx, call, nu * up.figure.si, inputs)?;
    Ok(CycleLeg { happens, what, from_k, to_k, nu: nu.abs(), dh, sources: cited })
}

fn reaction_leg(
    cx: &Cx,
    call: &Rc<Call>,
    what: String,
    contributions: &[Contribution],
    sources: &mut Sources,
) -> Result<CycleLeg, Fault> {
    let (mut si, mut inputs) = (0.0, SmallVec::new());
    for contribution in contributions {
        si += contribution.nu * contribution.formation.si;
        property::enter(&mut inputs, &contribution.formation, contribution.nu, Property::H)?;
    }
    let figures: Vec<&Figure> = contributions.iter().map(|contribution| &contribution.formation).collect();
    let cited = numbers(&figures, sources);
    let dh = enthalpy(cx, call, si, inputs)?;
    Ok(CycleLeg {
        happens: Happens::Reaction,
        what,
        from_k: T_REFERENCE,
        to_k: T_REFERENCE,
        nu: 1.0,
        dh,
        sources: cited,
    })
}

/// The equation in the phases of 298.15 K, which are others where a written phase does not exist there.
fn at_reference(call: &Call, ups: &[Vec<Up>], data: &Catalog) -> String {
    let Some(Value::Reaction(written)) = call.args.first() else { return String::new() };
    let mut equation = Rc::clone(written);
    for (term, up) in written.terms().iter().zip(ups) {
        let Some(first) = up.first().filter(|first| first.from != term.substance.id()) else { continue };
        let there = data.find(&first.from).map_err(Fault::from);
        match there.and_then(|there| equation.with(term.substance.id(), &there, data)) {
            Ok(other) => equation = Rc::new(other),
            // Both sides are one phase there, and nothing happens.
            Err(_) => return format!("none: only {} at {T_REFERENCE} K", first.from),
        }
    }
    equation.text().to_owned()
}

/// The numbers of the sources of some figures, each once.
fn numbers(figures: &[&Figure], sources: &mut Sources) -> Vec<usize> {
    let mut cited = Vec::new();
    let mut enter = |citation: &Citation| {
        let number = sources.number(citation);
        if !cited.contains(&number) {
            cited.push(number);
        }
    };
    for figure in figures {
        figure.citation().into_iter().for_each(&mut enter);
        if let gather::FigureOrigin::Nodes(nodes) = &figure.origin {
            nodes.iter().filter_map(|(node, _)| node.input()?.citation.as_ref()).for_each(&mut enter);
        }
    }
    cited
}

/// An enthalpy on the way is a plain value: it belongs to two temperatures, and those of all legs are added up.
fn enthalpy(cx: &Cx, call: &Rc<Call>, si: f64, inputs: SmallVec<[(Rc<Node>, f64); 2]>) -> Result<Quantity, Fault> {
    let Some(terms) = call.terms() else { unreachable!("{} is asked of a reaction", call.card.id) };
    let dim = property::dimension(Property::H, terms.per());
    Ok(Quantity::from_step(si, dim, Kind::PLAIN, inputs, Rc::clone(call) as Rc<_>, cx.place.clone())?)
}

/// The legs of one species from 298.15 K to T.
fn upward(
    term: &Term,
    contribution: &Contribution,
    t_k: f64,
    method: &Method,
    data: &Catalog,
) -> Result<Vec<Up>, Fault> {
    let id = term.substance.id();
    let Some(increment) = &contribution.increment else { return Ok(Vec::new()) };
    let in_one = || vec![Up::heating(id, T_REFERENCE, t_k, increment.clone())];
    let Some(written) = Phase::of(&term.substance).filter(|_| term.own.is_none()) else { return Ok(in_one()) };
    if !written.function.covers(T_REFERENCE) && !matches!(method.heat_capacity, HeatCapacity::FirstOrder { .. }) {
        return Ok(through_reference(&written, t_k, data)?.unwrap_or_else(in_one));
    }
    let route = Route::to(&term.substance, t_k, data)?;
    // An expansion is no path through temperatures, so it has no legs to be told apart.
    if !route.crosses() || matches!(method.heat_capacity, HeatCapacity::FirstOrder { .. }) {
        return Ok(in_one());
    }
    let held = (method.heat_capacity != HeatCapacity::Full).then_some(increment);
    route.legs_from(T_REFERENCE).iter().map(|leg| on_route(leg, held, t_k)).collect()
}

/// A leg of a route; where Cp is held at one value, its share of what that takes up in all.
fn on_route(leg: &Leg, held: Option<&Figure>, t_k: f64) -> Result<Up, Fault> {
    match (leg, held) {
        (Leg::Change(transition), _) => {
            let figure = Figure::sum_of_nodes([leg.node()?]);
            Ok(Up::change(&transition.from, &transition.to, transition.t_k, figure))
        }
        (Leg::Heating { phase, from_k, to_k, .. }, Some(Figure { origin: gather::FigureOrigin::Nodes(nodes), .. })) => {
            // The first node of such an increment is the heat capacity's; the others are the changes of phase.
            let (heated, _) = &nodes[0];
            let share = (to_k - from_k) / (t_k - T_REFERENCE);
            let figure = Figure::of_nodes(share * heated.si(), [(Rc::clone(heated), share)]);
            Ok(Up::heating(phase.substance.id(), *from_k, *to_k, figure))
        }
        (Leg::Heating { phase, from_k, to_k, .. }, _) => {
            let figure = Figure::sum_of_nodes([leg.node()?]);
            Ok(Up::heating(phase.substance.id(), *from_k, *to_k, figure))
        }
    }
}

/// The legs of a phase that does not exist at 298.15 K, through the phase that does and whose enthalpy scale it continues;
/// `None` where no transitions lead from one to the other.
fn through_reference(written: &Phase, t_k: f64, data: &Catalog) -> Result<Option<Vec<Up>>, Fault> {
    let reference = data.reference_phase(&written.substance).and_then(|substance| Phase::of(&substance));
    let Some(mut phase) = reference else { return Ok(None) };
    // Upwards from the reference phase, or downwards to a phase of low temperature.
    let up = path::chain(&phase.substance, &written.substance, data);
    let down =
        || path::chain(&written.substance, &phase.substance, data).map(|chain| chain.into_iter().rev().collect());
    let Some(transitions) = up.or_else(down) else { return Ok(None) };
    let heating = |phase: &Phase, from_k: f64, to_k: f64| {
        let figure = Figure::sum_of_nodes([path::heated(phase, from_k, to_k)?]);
        Ok::<Up, Fault>(Up::heating(phase.substance.id(), from_k, to_k, figure))
    };
    let (mut at_k, mut legs) = (T_REFERENCE, Vec::new());
    for transition in transitions {
        let next = if *transition.from == *phase.substance.id() { &transition.to } else { &transition.from };
        let Some(next) = Phase::of(&data.find(next)?) else { return Ok(None) };
        legs.push(heating(&phase, at_k, transition.t_k)?);
        let figure = Figure::sum_of_nodes([path::by_functions(&transition, &phase, &next)?]);
        legs.push(Up::change(phase.substance.id(), next.substance.id(), transition.t_k, figure));
        (phase, at_k) = (next, transition.t_k);
    }
    legs.push(heating(&phase, at_k, t_k)?);
    Ok(Some(legs))
}
