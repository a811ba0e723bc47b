//! The way of one substance from 298.15 K to T where its written phase ends on the way: changes of phase inserted from data.
//!
//! H(T) − H(298.15 K) = Σ [Hφ(end) − Hφ(start)] + Σ ΔtrsH       S(T) = S₁(T₁) + Σ ΔtrsS + Σ [Sφ(end) − Sφ(start)]
//!
//! | symbol       | unit             | meaning                                                               |
//! |--------------|------------------|-----------------------------------------------------------------------|
//! | φ            |                  | the phases passed, from the one written to the one that exists at T   |
//! | start, end   | K                | 298.15 K or the transition into φ; the transition out of φ or T       |
//! | ΔtrsH, ΔtrsS | J/mol, J/(mol K) | recorded figures of the transitions, inputs of their own              |
//!
//! A name with phase is the phase at 298.15 K. Within the range of its record the record is used as it stands, stable or
//! not; beyond its end, the transition recorded there leads on to the next condensed phase, and so on. A change to the gas
//! is never inserted: where it happens depends on the pressure. Cp is that of the phase at T. The surprise: a phase that
//! does not exist at 298.15 K, such as Fe(cr,gamma), stands for itself, and beyond its record it is refused.
//! Source: definition of Cp; additivity of enthalpy and entropy over a path (from memory).

use std::rc::Rc;
use std::sync::Arc;

use crate::data::catalog::Catalog;
use crate::data::function::Function;
use crate::data::substance::Substance;
use crate::data::transition::Transition;
use crate::fault::Fault;
use crate::model::function::{self, Functions, T_REFERENCE};
use crate::model::gather::{
    self, Contribution, Drawn, Figure, GatherError, HeatCapacity, INTEGRATED, Slopes, Taken, flat,
};
use crate::model::terms::Terms;
use crate::num::math;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey, Node};
use crate::source::Citation;
use crate::units::{Base, Dimension, Entity, Kind};

/// Names of the fields of a transition's figures, singular, as in "transition enthalpy of Fe(cr,alpha)->Fe(cr,gamma)".
pub const TRANSITION_ENTHALPY: &str = "transition enthalpy";
pub const TRANSITION_ENTROPY: &str = "transition entropy";

/// Of an increment between two temperatures that a user gives.
pub(super) const FROM_START: &str = "integrated from the start";
const FROM_TRANSITION: &str = "integrated from the transition into the phase";
const HELD: &str = "Cp held at its value where the phase ends";

/// A phase on the way, with its function.
#[derive(Clone)]
pub struct Phase {
    pub substance: Arc<Substance>,
    pub function: Arc<Function>,
}

impl Phase {
    /// `None` where it has no function.
    pub fn of(substance: &Arc<Substance>) -> Option<Phase> {
        Some(Phase { substance: Arc::clone(substance), function: Arc::clone(substance.function.as_ref()?) })
    }

    pub fn at(&self, t_k: f64) -> Functions {
        function::evaluate(&self.function, t_k)
    }
}

/// The phases of one substance from the one written to the one that exists at a temperature.
pub struct Route {
    first: Phase,
    /// Each transition, and the phase it leads to, in order of temperature.
    changes: Vec<(Arc<Transition>, Phase)>,
    t_k: f64,
}

/// A part of a route.
pub enum Leg<'a> {
    /// One phase between two temperatures.
    Heating { phase: &'a Phase, from_k: f64, to_k: f64, way: &'static str },
    /// A change of phase.
    Change(&'a Transition),
}

impl Leg<'_> {
    /// Enthalpy taken up, J/mol.
    pub fn dh(&self) -> f64 {
        match self {
            Leg::Heating { phase, from_k, to_k, .. } => phase.at(*to_k).h - phase.at(*from_k).h,
            Leg::Change(transition) => transition.dh,
        }
    }

    /// Its enthalpy as an input of what is computed from it.
    ///
    /// # Errors
    /// The figure is not finite.
    pub fn node(&self) -> Result<Rc<Node>, Fault> {
        match self {
            Leg::Heating { phase, to_k, way, .. } => {
                drawn(phase, gather::HEAT_CAPACITY, &Drawn { si: self.dh(), t_k: *to_k, way }, Sort::Energy)
            }
            Leg::Change(transition) => changed(transition, Sort::Energy),
        }
    }

    /// The entropy gained on it; from 298.15 K, the entropy at its end.
    fn entropy_node(&self) -> Result<Rc<Node>, Fault> {
        let drawn = |phase, figure| drawn(phase, gather::ENTROPY, &figure, Sort::PerKelvin);
        match self {
            Leg::Heating { phase, from_k, to_k, .. } if *from_k == T_REFERENCE => {
                drawn(phase, Drawn { si: phase.at(*to_k).s, t_k: *to_k, way: "" })
            }
            Leg::Heating { phase, from_k, to_k, .. } => {
                let si = phase.at(*to_k).s - phase.at(*from_k).s;
                drawn(phase, Drawn { si, t_k: *to_k, way: "gained since the transition into the phase" })
            }
            Leg::Change(transition) => changed(transition, Sort::PerKelvin),
        }
    }
}

impl Route {
    /// The route from the written phase at 298.15 K to `t_k`; without a change where its record reaches that far.
    ///
    /// # Errors
    /// It has no function, or nothing on record leads to `t_k`.
    pub fn to(written: &Arc<Substance>, t_k: f64, data: &Catalog) -> Result<Route, GatherError> {
        let species = || written.id().to_owned();
        let first = Phase::of(written).ok_or_else(|| GatherError::NoFunction { species: species(), t_k })?;
        let (t_min, t_max) = (first.function.t_min, first.function.t_max);
        let range = || GatherError::Range { species: species(), t_k, t_min, t_max };
        let mut changes: Vec<(Arc<Transition>, Phase)> = Vec::new();
        if first.function.covers(t_k) {
            return Ok(Route { first, changes, t_k });
        }
        if !first.function.covers(T_REFERENCE) || t_k < t_min {
            return Err(range());
        }
        loop {
            let last = changes.last().map_or(&first, |(_, phase)| phase);
            if last.function.covers(t_k) {
                return Ok(Route { first, changes, t_k });
            }
            match onward(last, data) {
                Some(next) => changes.push(next),
                None => return Err(gas_instead(written, last, t_k, data).unwrap_or_else(range)),
            }
        }
    }

    pub fn first(&self) -> &Phase {
        &self.first
    }

    /// The phase that exists at the end of the route.
    pub fn last(&self) -> &Phase {
        self.changes.last().map_or(&self.first, |(_, phase)| phase)
    }

    /// The phases passed, the one at the end included.
    pub fn phases(&self) -> impl Iterator<Item = &Phase> {
        std::iter::once(&self.first).chain(self.changes.iter().map(|(_, phase)| phase))
    }

    pub fn changes(&self) -> impl Iterator<Item = &Transition> {
        self.changes.iter().map(|(transition, _)| &**transition)
    }

    pub fn crosses(&self) -> bool {
        !self.changes.is_empty()
    }

    /// The phase at a temperature on the route; a transition temperature belongs to the phase that ends there.
    pub(super) fn phase_at(&self, t_k: f64) -> &Phase {
        self.changes.iter().rev().find(|(transition, _)| transition.t_k < t_k).map_or(&self.first, |(_, phase)| phase)
    }

    /// The parts of the route above a temperature on it, from low to high.
    pub fn legs_from(&self, start_k: f64) -> Vec<Leg<'_>> {
        let mut legs = Vec::with_capacity(2 * self.changes.len() + 1);
        let (mut phase, mut from_k) = (&self.first, start_k);
        let mut way = if start_k == T_REFERENCE { INTEGRATED } else { FROM_START };
        for (transition, next) in &self.changes {
            if start_k <= transition.t_k {
                legs.push(Leg::Heating { phase, from_k, to_k: transition.t_k, way });
                legs.push(Leg::Change(transition));
                (from_k, way) = (transition.t_k, FROM_TRANSITION);
            }
            phase = next;
        }
        legs.push(Leg::Heating { phase, from_k, to_k: self.t_k, way });
        legs
    }

    /// `Fe(cr,alpha) is Fe(cr,gamma), changed at 1184 K`; `None` where no phase changes.
    pub fn words(&self) -> Option<String> {
        let (_, last) = self.changes.last()?;
        let at: Vec<String> = self.changes().map(|transition| format!("{} K", transition.t_k)).collect();
        Some(format!("{} is {}, changed at {}", self.first.substance.id(), last.substance.id(), at.join(", ")))
    }

    /// The changes with their enthalpies: `to Fe(cr,gamma) at 1184 K with ΔtrsH = 0.900 kJ/mol`.
    pub fn change_words(&self) -> String {
        let change = |(transition, phase): &(Arc<Transition>, Phase)| {
            let kilo = transition.dh / 1000.0;
            format!("to {} at {} K with ΔtrsH = {kilo:.3} kJ/mol", phase.substance.id(), transition.t_k)
        };
        self.changes.iter().map(change).collect::<Vec<_>>().join(", ")
    }

    /// Whether the route passes into a phase that another term of the reaction is.
    pub(super) fn meets_another_term(&self, at: usize, terms: &Terms) -> bool {
        let is_other =
            |id: &str| terms.terms().iter().enumerate().any(|(n, term)| n != at && term.substance.id() == id);
        self.changes.iter().any(|(_, phase)| is_other(phase.substance.id()))
    }

    /// What one mole contributes at the end of the route, with the heat capacity as the method takes it. The enthalpies of
    /// transition belong to every way of taking it but the two that leave them out by definition.
    ///
    /// # Errors
    /// A figure is not finite.
    pub(super) fn contribution(&self, nu: f64, formation: Figure, mode: HeatCapacity) -> Result<Contribution, Fault> {
        let t_k = self.t_k;
        let (first, last) = (&self.first, self.last());
        let at_0 = first.at(T_REFERENCE);
        let cp_at = |phase: &Phase, t_k: f64| Drawn { si: phase.at(t_k).cp, t_k, way: "" };
        let slope_at = |phase: &Phase, t_k: f64| function::cp_slope(&phase.function, t_k);
        let (taken, cp_of) = match mode {
            HeatCapacity::Full => return self.integrated(nu, formation),
            HeatCapacity::Missed => return self.missed(nu, formation),
            HeatCapacity::FirstOrder { .. } => unreachable!("it is a sum of two full integrals"),
            HeatCapacity::Neglected => (gather::neglected(at_0, t_k), first),
            HeatCapacity::Constant => (flat(at_0, t_k, cp_at(first, T_REFERENCE), 0.0, gather::AT_REFERENCE), first),
            HeatCapacity::Midpoint => {
                let middle = 0.5 * (t_k + T_REFERENCE);
                let phase = self.phase_at(middle);
                (flat(at_0, t_k, cp_at(phase, middle), 0.5 * slope_at(phase, middle), gather::HALF_WAY), phase)
            }
            HeatCapacity::Mean => {
                let si = 0.5 * (at_0.cp + last.at(t_k).cp);
                let cp = Drawn { si, t_k, way: gather::MEAN_OF_BOTH };
                (flat(at_0, t_k, cp, 0.5 * slope_at(last, t_k), gather::BOTH_ENDS), last)
            }
        };
        let Taken { increment, entropy, cp, slopes } = taken;
        let mut enthalpies = vec![drawn(cp_of, gather::HEAT_CAPACITY, &increment, Sort::Energy)?];
        let mut entropies = vec![drawn(first, gather::ENTROPY, &entropy, Sort::PerKelvin)?];
        if mode != HeatCapacity::Neglected {
            self.add_changes(&mut enthalpies, &mut entropies)?;
        }
        let cp = Figure::sum_of_nodes([drawn(cp_of, gather::HEAT_CAPACITY, &cp, Sort::PerKelvin)?]);
        Ok(assembled(nu, formation, enthalpies, entropies, cp, slopes))
    }

    /// Cp integrated phase by phase, with the changes between.
    fn integrated(&self, nu: f64, formation: Figure) -> Result<Contribution, Fault> {
        let (mut enthalpies, mut entropies) = (Vec::new(), Vec::new());
        for leg in self.legs_from(T_REFERENCE) {
            enthalpies.push(leg.node()?);
            entropies.push(leg.entropy_node()?);
        }
        let (last, t_k) = (self.last(), self.t_k);
        let cp = Drawn { si: last.at(t_k).cp, t_k, way: "" };
        let slopes = Slopes { increment: cp.si, entropy: cp.si / t_k, cp: function::cp_slope(&last.function, t_k) };
        let cp = Figure::sum_of_nodes([drawn(last, gather::HEAT_CAPACITY, &cp, Sort::PerKelvin)?]);
        Ok(assembled(nu, formation, enthalpies, entropies, cp, slopes))
    }

    /// The changes left out: the written phase, with its Cp held from where its record ends.
    fn missed(&self, nu: f64, formation: Figure) -> Result<Contribution, Fault> {
        let (first, t_k) = (&self.first, self.t_k);
        let end_k = self.changes().next().map_or(t_k, |transition| transition.t_k);
        let at_end = first.at(end_k);
        let (span, ln_ratio) = (t_k - end_k, math::ln(t_k / end_k));
        let enthalpies = vec![
            Leg::Heating { phase: first, from_k: T_REFERENCE, to_k: end_k, way: INTEGRATED }.node()?,
            drawn(first, gather::HEAT_CAPACITY, &Drawn { si: at_end.cp * span, t_k, way: HELD }, Sort::Energy)?,
        ];
        let entropies = vec![
            drawn(first, gather::ENTROPY, &Drawn { si: at_end.s, t_k: end_k, way: "" }, Sort::PerKelvin)?,
            drawn(first, gather::ENTROPY, &Drawn { si: at_end.cp * ln_ratio, t_k, way: HELD }, Sort::PerKelvin)?,
        ];
        let slopes = Slopes { increment: at_end.cp, entropy: at_end.cp / t_k, cp: 0.0 };
        let cp = Drawn { si: at_end.cp, t_k: end_k, way: "" };
        let cp = Figure::sum_of_nodes([drawn(first, gather::HEAT_CAPACITY, &cp, Sort::PerKelvin)?]);
        Ok(assembled(nu, formation, enthalpies, entropies, cp, slopes))
    }

    fn add_changes(&self, enthalpies: &mut Vec<Rc<Node>>, entropies: &mut Vec<Rc<Node>>) -> Result<(), Fault> {
        for transition in self.changes() {
            enthalpies.push(changed(transition, Sort::Energy)?);
            entropies.push(changed(transition, Sort::PerKelvin)?);
        }
        Ok(())
    }
}

fn assembled(
    nu: f64,
    formation: Figure,
    enthalpies: Vec<Rc<Node>>,
    entropies: Vec<Rc<Node>>,
    cp: Figure,
    slopes: Slopes,
) -> Contribution {
    let increment = Some(Figure::sum_of_nodes(enthalpies));
    let entropy = Some(Figure::sum_of_nodes(entropies));
    Contribution { nu, formation, increment, entropy, cp: Some(cp), slopes }
}

/// The phases that routes from a written phase lead through, each with the temperature it begins at.
pub fn onward_phases(written: &Arc<Substance>, data: &Catalog) -> Vec<(f64, Phase)> {
    let Some(first) = Phase::of(written).filter(|phase| phase.function.covers(T_REFERENCE)) else { return Vec::new() };
    let next = |last: &Phase| onward(last, data).map(|(transition, phase)| (transition.t_k, phase));
    std::iter::successors(next(&first), |(_, last)| next(last)).collect()
}

/// The highest temperature that routes from a phase lead to.
pub(super) fn reach_k(written: &Arc<Substance>, data: &Catalog) -> Option<f64> {
    let own = written.function.as_ref()?.t_max;
    Some(onward_phases(written, data).last().map_or(own, |(_, phase)| phase.function.t_max))
}

/// The transition recorded where a phase ends on heating, and the condensed phase it leads to.
fn onward(phase: &Phase, data: &Catalog) -> Option<(Arc<Transition>, Phase)> {
    let id = phase.substance.id();
    let leads = |transition: &&Arc<Transition>| *transition.from == *id && transition.to != transition.from;
    data.transitions_of(&phase.substance).iter().filter(leads).find_map(|transition| {
        let next = Phase::of(&data.find(&transition.to).ok()?)?;
        let holds = |phase: &Phase| phase.function.covers(transition.t_k);
        (!next.substance.species.is_gas() && holds(phase) && holds(&next)).then(|| (Arc::clone(transition), next))
    })
}

/// The transitions that lead from one phase up to another, in order; `None` where they do not.
pub fn chain(from: &Arc<Substance>, to: &Substance, data: &Catalog) -> Option<Vec<Arc<Transition>>> {
    let (mut phase, mut transitions) = (Phase::of(from)?, Vec::new());
    while phase.substance.id() != to.id() {
        let (transition, next) = onward(&phase, data)?;
        transitions.push(transition);
        phase = next;
    }
    Some(transitions)
}

/// The refusal where the condensed phases end and the gas goes on.
fn gas_instead(written: &Substance, last: &Phase, t_k: f64, data: &Catalog) -> Option<GatherError> {
    let phases = data.phases_of(written);
    let reaches = |substance: &&Arc<Substance>| substance.function.as_ref().is_some_and(|f| f.covers(t_k));
    let gas = phases.iter().filter(|substance| substance.species.is_gas()).find(reaches)?;
    (t_k > last.function.t_max && !written.species.is_gas()).then(|| GatherError::GasNotInserted {
        phase: last.substance.id().to_owned(),
        gas: gas.id().to_owned(),
        t_k,
        t_end: last.function.t_max,
    })
}

/// The routes of the terms of a reaction that change phase on their way to `t_k`, each with the place of its term.
pub fn crossings(terms: &Terms, t_k: f64, data: &Catalog) -> Vec<(usize, Route)> {
    let of_tables = terms.terms().iter().enumerate().filter(|(_, term)| term.own.is_none());
    let routes = of_tables.filter_map(|(at, term)| Some((at, Route::to(&term.substance, t_k, data).ok()?)));
    routes.filter(|(_, route)| route.crosses()).collect()
}

/// What a figure is per mole.
#[derive(Clone, Copy, PartialEq)]
pub(super) enum Sort {
    Energy,
    PerKelvin,
}

impl Sort {
    /// What functions and what is computed from them are good to, as in `gather`.
    fn digit(self) -> f64 {
        if self == Sort::Energy { 1.0 } else { 0.001 }
    }
}

/// What one phase takes up between two temperatures, as an input.
///
/// # Errors
/// The figure is not finite.
pub fn heated(phase: &Phase, from_k: f64, to_k: f64) -> Result<Rc<Node>, Fault> {
    let way = if from_k == T_REFERENCE { INTEGRATED } else { FROM_TRANSITION };
    Leg::Heating { phase, from_k, to_k, way }.node()
}

/// The enthalpy of a change from one phase of a transition to the other, as their two functions have it: what belongs to a
/// phase whose function continues the enthalpy scale of another. The recorded figure is this one, rounded.
///
/// # Errors
/// The figure is not finite.
pub fn by_functions(transition: &Transition, from: &Phase, to: &Phase) -> Result<Rc<Node>, Fault> {
    let (dataset, record, t_bits) = (transition.dataset.shared(), transition.id.clone(), transition.t_k.to_bits());
    let way = "difference of the two functions";
    let key = LeafKey::Datum { dataset, record, field: TRANSITION_ENTHALPY, t_bits, way };
    leaf(to.at(transition.t_k).h - from.at(transition.t_k).h, key, &transition.citation, Sort::Energy)
}

/// A figure drawn from a phase's function.
fn drawn(phase: &Phase, field: &'static str, figure: &Drawn, sort: Sort) -> Result<Rc<Node>, Fault> {
    let (dataset, record) = (phase.function.dataset.shared(), phase.substance.species.id.clone());
    let key = LeafKey::Datum { dataset, record, field, t_bits: figure.t_k.to_bits(), way: figure.way };
    leaf(figure.si, key, &phase.function.citation, sort)
}

/// A figure of a transition.
fn changed(transition: &Transition, sort: Sort) -> Result<Rc<Node>, Fault> {
    let (si, field) = match sort {
        Sort::Energy => (transition.dh, TRANSITION_ENTHALPY),
        Sort::PerKelvin => (transition.ds, TRANSITION_ENTROPY),
    };
    let (dataset, record) = (transition.dataset.shared(), Arc::clone(&transition.id));
    let key = LeafKey::Datum { dataset, record, field, t_bits: transition.t_k.to_bits(), way: "" };
    leaf(si, key, &transition.citation, sort)
}

fn leaf(si: f64, key: LeafKey, citation: &Citation, sort: Sort) -> Result<Rc<Node>, Fault> {
    input_node(si, Input { digit: Some(sort.digit()), citation: Some(citation.clone()), ..Input::of(key) }, sort)
}

/// A figure per mole of its species as an input.
pub(super) fn input_node(si: f64, input: Input, sort: Sort) -> Result<Rc<Node>, Fault> {
    let energy = Dimension::whole([2, 1, -2, 0, 0, 0]);
    let dim = if sort == Sort::Energy { energy } else { energy.over(&Dimension::base(Base::Kelvin)) };
    let dim = dim.over(&Dimension::amount(Entity::OPEN));
    Ok(Rc::clone(Quantity::input(si, dim, Kind::PLAIN, input, None)?.node()))
}
