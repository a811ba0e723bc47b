//! What is asked of values and is more than one value: an uncertainty budget, a Monte Carlo run, a derivation, a comparison.
//!
//! An [`Answer`] is shown as a whole, and its parts can be computed with: `x.expanded(0.95).U`. The parts that are
//! quantities keep the value they were asked of in their history, and are exact: they describe an uncertainty and have none.

use std::rc::Rc;
use std::sync::Arc;

use smallvec::SmallVec;
use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::budget::Budget;
use crate::model::card::{Arg, Call, Default, Takes, Value, listed};
use crate::model::compare::Comparison;
use crate::model::cycle::Cycle;
use crate::model::derivation::Derivation;
use crate::model::expanded::Expanded;
use crate::model::gap::Gap;
use crate::model::molecule::power_fit::HandedOn;
use crate::model::molecule::shares::Shares;
use crate::model::monte_carlo::Propagation;
use crate::model::plant::balance::HeatBalance;
use crate::model::shortcut::{SideBySide, Validity};
use crate::quantity::Quantity;
use crate::record::node::Step;
use crate::units::{Base, Dimension, Kind, Unit, What, unit_for};

/// An answer, to be read and to be taken parts of.
#[derive(Clone)]
pub enum Answer {
    Budget(Rc<Budget>),
    Expanded(Rc<Expanded>),
    Propagation(Rc<Propagation>),
    Derivation(Rc<Derivation>),
    Comparison(Rc<Comparison>),
    Cycle(Rc<Cycle>),
    Gap(Rc<Gap>),
    HeatBalance(Rc<HeatBalance>),
    Shares(Rc<Shares>),
    PowerFit(Rc<HandedOn>),
    Validity(Rc<Validity>),
    SideBySide(Rc<SideBySide>),
}

/// The argument that says how sure an interval is to be.
pub(super) const LEVEL: Arg = Arg {
    name: "level",
    takes: Takes::Number,
    default: Default::Number(0.95),
    doc: "level of confidence, between 0 and 1",
};

/// A part that an answer does not have.
#[derive(Clone, Debug, PartialEq, Error)]
#[error("{answer} has no part `{part}`")]
pub struct NoSuchPart {
    answer: &'static str,
    part: String,
    known: String,
}

impl Explain for NoSuchPart {
    fn code(&self) -> &'static str {
        "answer-part-unknown"
    }

    fn hint(&self) -> String {
        format!("its parts are {}", self.known)
    }
}

impl Answer {
    /// What it is, in words for messages.
    pub fn sort(&self) -> &'static str {
        match self {
            Answer::Budget(_) => "an uncertainty budget",
            Answer::Expanded(_) => "an expanded uncertainty",
            Answer::Propagation(_) => "a Monte Carlo run",
            Answer::Derivation(_) => "a derivation",
            Answer::Comparison(_) => "a comparison",
            Answer::Cycle(_) => "a cycle",
            Answer::Gap(_) => "an explanation of a gap",
            Answer::HeatBalance(_) => "a heat balance",
            Answer::Shares(_) => "a table of contributions",
            Answer::PowerFit(_) => "a sum of powers",
            Answer::Validity(_) => "the range of a shortcut",
            Answer::SideBySide(_) => "shortcuts side by side",
        }
    }

    /// Its parts by name.
    pub fn parts(&self) -> Vec<(&'static str, Value)> {
        match self {
            Answer::Budget(budget) => budget.parts(),
            Answer::Expanded(expanded) => expanded.parts(),
            Answer::Propagation(propagation) => propagation.parts(),
            Answer::Derivation(derivation) => derivation.parts(),
            Answer::Comparison(comparison) => comparison.parts(),
            Answer::Cycle(cycle) => cycle.parts(),
            Answer::Gap(gap) => gap.parts(),
            Answer::HeatBalance(balance) => balance.parts(),
            Answer::Shares(shares) => shares.parts(),
            Answer::PowerFit(fit) => fit.parts(),
            Answer::Validity(validity) => validity.parts(),
            Answer::SideBySide(ways) => ways.parts(),
        }
    }

    /// A part by its name.
    ///
    /// # Errors
    /// It has none of that name.
    pub fn part(&self, name: &str) -> Result<Value, NoSuchPart> {
        let parts = self.parts();
        match parts.iter().find(|(known, _)| *known == name) {
            Some((_, value)) => Ok(value.clone()),
            None => {
                let known = listed(parts.iter().map(|(known, _)| *known));
                Err(NoSuchPart { answer: self.sort(), part: name.to_owned(), known })
            }
        }
    }
}

/// The unit in which differences of a value are shown: kelvin for temperature points.
pub fn difference_unit(value: &Quantity) -> Arc<Unit> {
    of_differences(&value.unit())
}

/// The same for any unit.
pub fn of_differences(unit: &Arc<Unit>) -> Arc<Unit> {
    if unit.is_point() { Arc::new(unit_for(&Dimension::base(Base::Kelvin))) } else { Arc::clone(unit) }
}

/// Whether a value's uncertainty is that of its logarithm: an equilibrium constant, which is never negative.
pub fn is_logarithmic(value: &Quantity) -> bool {
    value.kind().what == What::K && value.si() > 0.0
}

/// A figure about a value, such as the end of an interval, made by the formula that was asked.
///
/// # Errors
/// The figure is not finite.
pub fn figure(call: &Rc<Call>, of: &Quantity, si: f64) -> Result<Quantity, Fault> {
    made(call, si, of.dim().clone(), of.kind().clone(), of.unit())
}

/// A width about a value, such as U: a plain value, or a temperature difference, of its dimension.
///
/// # Errors
/// The width is not finite.
pub fn width(call: &Rc<Call>, of: &Quantity, si: f64) -> Result<Quantity, Fault> {
    let kind = if of.kind().what.is_temperature() { Kind::of(What::TemperatureDifference) } else { Kind::PLAIN };
    made(call, si, of.dim().clone(), kind, difference_unit(of))
}

fn made(call: &Rc<Call>, si: f64, dim: Dimension, kind: Kind, unit: Arc<Unit>) -> Result<Quantity, Fault> {
    let step: Rc<dyn Step> = Rc::clone(call) as Rc<dyn Step>;
    Ok(Quantity::from_step(si, dim, kind, SmallVec::new(), step, None)?.in_unit(Some(unit)))
}
