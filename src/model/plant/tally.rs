//! Sums of n H over portions, with derivatives with respect to every input.
//!
//! The formation enthalpy of a species stands in what is fed and in what leaves; it enters the result once, with what is
//! left of it, so that what does not react costs no uncertainty.

use std::rc::Rc;

use smallvec::SmallVec;

use crate::fault::Fault;
use crate::model::card::Cx;
use crate::model::gather::{self, Contribution, Figure, Method};
use crate::model::plant::amount::Weights;
use crate::model::plant::stream::Portion;
use crate::model::property::{self, Property};
use crate::model::terms::{Term, Terms};
use crate::quantity::Quantity;
use crate::record::node::Node;
use crate::units::Entity;

/// Inputs of a node, each with its derivative.
pub type Inputs = SmallVec<[(Rc<Node>, f64); 2]>;

/// What the balance is drawn up in.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Energy {
    /// Constant pressure.
    H,
    /// Constant volume: gases ideal, the volume of condensed species neglected.
    U,
}

/// One side, or both with their signs.
pub struct Tally<'a> {
    cx: &'a Cx<'a>,
    method: &'a Method,
    energy: Energy,
    r: Quantity,
    /// J or W
    pub si: f64,
    weights: Weights,
    formations: Vec<(String, Figure, f64)>,
    increments: Vec<(Figure, f64)>,
}

/// Σ n h of some portions at one temperature, and its slope.
#[derive(Clone, Copy, Debug, Default)]
pub struct Sum {
    /// J or W
    pub si: f64,
    /// Σ n Cp, or Σ n Cv: J/K or W/K
    pub capacity: f64,
}

/// What each of some terms contributes at T.
///
/// # Errors
/// A figure is missing, or T is outside the data.
pub fn contributions(terms: Vec<Term>, t_k: f64, method: &Method, cx: &Cx) -> Result<Vec<Contribution>, Fault> {
    gather::contributions(&Terms::new(terms, Entity::OPEN, String::new()), t_k, method, cx)
}

/// H, or U, of one mole, and its slope.
pub fn molar(one: &Contribution, term: &Term, energy: Energy, rt: f64, r: f64) -> (f64, f64) {
    let h = one.formation.si + one.increment.as_ref().map_or(0.0, |increment| increment.si);
    let takes_off = energy == Energy::U && term.substance.species.is_gas();
    if takes_off { (h - rt, one.slopes.increment - r) } else { (h, one.slopes.increment) }
}

/// Σ n h without derivatives with respect to the inputs.
///
/// # Errors
/// A figure is missing, or T is outside the data.
pub fn sum(portions: &[Portion], t_k: f64, energy: Energy, method: &Method, cx: &Cx) -> Result<Sum, Fault> {
    let all = contributions(portions.iter().map(|portion| portion.term.clone()).collect(), t_k, method, cx)?;
    let r = cx.constants().molar_gas.value;
    let mut sum = Sum::default();
    for (one, portion) in all.iter().zip(portions) {
        let (h, cp) = molar(one, &portion.term, energy, r * t_k, r);
        sum.si += portion.amount.si * h;
        sum.capacity += portion.amount.si * cp;
    }
    Ok(sum)
}

impl<'a> Tally<'a> {
    pub fn new(energy: Energy, method: &'a Method, cx: &'a Cx<'a>) -> Self {
        let r = property::gas_constant(cx.constants());
        Tally {
            cx,
            method,
            energy,
            r,
            si: 0.0,
            weights: Weights::default(),
            formations: Vec::new(),
            increments: Vec::new(),
        }
    }

    /// Adds `sign` times what some portions have at `t_k`; where the temperature is a value of its own it is an input too.
    ///
    /// # Errors
    /// A figure is missing, or T is outside the data.
    pub fn add(&mut self, sign: f64, portions: &[Portion], t_k: f64, t: Option<&Quantity>) -> Result<Sum, Fault> {
        let terms = portions.iter().map(|portion| portion.term.clone()).collect();
        let all = contributions(terms, t_k, self.method, self.cx)?;
        let mut sum = Sum::default();
        for (one, portion) in all.iter().zip(portions) {
            let n = portion.amount.si;
            let (h, cp) = molar(one, &portion.term, self.energy, self.r.si() * t_k, self.r.si());
            sum.si += n * h;
            sum.capacity += n * cp;
            self.weights.add_all(&portion.amount.of, sign * h);
            match self.formations.iter_mut().find(|(id, _, _)| id == portion.id()) {
                Some((_, _, weight)) => *weight += sign * n,
                None => self.formations.push((portion.id().to_owned(), one.formation.clone(), sign * n)),
            }
            if let Some(increment) = &one.increment {
                self.increments.push((increment.clone(), sign * n));
            }
            if self.energy == Energy::U && portion.term.substance.species.is_gas() {
                self.weights.add(self.r.node(), -sign * n * t_k);
            }
        }
        if let Some(t) = t {
            self.weights.add(&property::as_argument(t), sign * sum.capacity);
        }
        self.si += sign * sum.si;
        Ok(sum)
    }

    /// Adds the heat capacity of some portions, whose derivative is `by_capacity`, to the inputs.
    ///
    /// # Errors
    /// A figure is missing, or T is outside the data.
    pub fn add_capacity(&mut self, by_capacity: f64, portions: &[Portion], t: &Quantity) -> Result<(), Fault> {
        let t_k = t.si();
        let terms = portions.iter().map(|portion| portion.term.clone()).collect();
        let all = contributions(terms, t_k, self.method, self.cx)?;
        let mut slope = 0.0;
        for (one, portion) in all.iter().zip(portions) {
            let n = portion.amount.si;
            let (_, cp) = molar(one, &portion.term, self.energy, self.r.si() * t_k, self.r.si());
            self.weights.add_all(&portion.amount.of, by_capacity * cp);
            if let Some(figure) = &one.cp {
                let mut nodes = Inputs::new();
                property::enter(&mut nodes, figure, by_capacity * n, Property::Cp)?;
                nodes.iter().for_each(|(node, weight)| self.weights.add(node, *weight));
            }
            if self.energy == Energy::U && portion.term.substance.species.is_gas() {
                self.weights.add(self.r.node(), -by_capacity * n);
            }
            slope += n * one.slopes.cp;
        }
        self.weights.add(&property::as_argument(t), by_capacity * slope);
        Ok(())
    }

    pub fn add_value(&mut self, value: &Quantity, weight: f64) {
        self.weights.add(value.node(), weight);
        self.si += weight * value.si();
    }

    /// Every input with its derivative, times a factor.
    ///
    /// # Errors
    /// A figure is not finite.
    pub fn inputs(&self, factor: f64) -> Result<Inputs, Fault> {
        let mut inputs = SmallVec::new();
        for (_, figure, weight) in &self.formations {
            if *weight != 0.0 {
                property::enter(&mut inputs, figure, factor * weight, Property::H)?;
            }
        }
        for (figure, weight) in &self.increments {
            property::enter(&mut inputs, figure, factor * weight, Property::H)?;
        }
        inputs.extend(self.weights.iter().map(|(node, weight)| (Rc::clone(node), factor * weight)));
        Ok(inputs)
    }
}
