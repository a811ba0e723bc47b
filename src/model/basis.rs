//! Another basis for a reaction value: per mole of one of the reaction's species.
//!
//! x per mole of X = x / |ν(X)|
//!
//! | symbol | unit       | meaning                                                      |
//! |--------|------------|--------------------------------------------------------------|
//! | x      | J/mol[rxn] | a value per mole of reaction as written                      |
//! | ν(X)   | 1          | stoichiometric number of X in that reaction; its sign is kept by saying "consumed" or "formed" |
//!
//! The sign of the value stays: an exothermic reaction is negative per mole of anything.
//! Source: IUPAC Green Book, 3rd ed., section 2.11.1 (from memory).

use std::rc::Rc;

use smallvec::smallvec;
use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value, call_of};
use crate::model::reaction::Reaction;
use crate::quantity::Quantity;
use crate::record::node;
use crate::units::{self, Dimension, Entity, Kind};

/// Why a value cannot be given per mole of a species.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum BasisError {
    #[error("the value is {basis}, not per mole of reaction as written")]
    NotPerReaction { basis: String },
    #[error("the value was not computed from a reaction, so the stoichiometric number of {entity} is not known")]
    NoReaction { entity: String },
    #[error("{entity} does not take part in {reaction}")]
    NotInReaction { entity: String, reaction: String, known: String },
    #[error(
        "the value rests on reactions in which {entity} has different stoichiometric numbers, {first} and {second}"
    )]
    SeveralNumbers { entity: String, first: f64, second: f64 },
    #[error("{entity} takes part in {reaction} in more than one phase")]
    SeveralPhases { entity: String, reaction: String },
}

impl Explain for BasisError {
    fn code(&self) -> &'static str {
        match self {
            BasisError::NotPerReaction { .. } => "not-per-reaction",
            BasisError::NoReaction { .. } => "reaction-not-known",
            BasisError::NotInReaction { .. } => "species-not-in-reaction",
            BasisError::SeveralNumbers { .. } => "stoichiometric-number-not-one",
            BasisError::SeveralPhases { .. } => "species-in-several-phases",
        }
    }

    fn hint(&self) -> String {
        match self {
            BasisError::NotPerReaction { .. } => "ask a value of a reaction, such as `r.enthalpy(T)`".to_owned(),
            BasisError::NoReaction { entity } => {
                format!(
                    "multiply by it yourself, as in `x * exact(\"1 mol[rxn]/mol[{entity}]\")` with the number that holds"
                )
            }
            BasisError::NotInReaction { known, .. } => format!("choose one of {known}"),
            BasisError::SeveralNumbers { .. } => "take the value per mole before adding the reactions".to_owned(),
            BasisError::SeveralPhases { entity, .. } => {
                format!("multiply by the number that is meant, as in `x * exact(\"1 mol[rxn]/mol[{entity}]\")`")
            }
        }
    }
}

pub static PER: Card = Card {
    id: "quantity.per",
    name: "per",
    on: On::Quantity,
    args: &[Arg {
        name: "species",
        takes: Takes::Text,
        default: Default::Required,
        doc: "a species of the reaction, without phase: \"CH4\"",
    }],
    gives: "the value per mole of that species consumed or formed",
    doc: "Divides a reaction value by the size of the species' own stoichiometric number. The sign of the value is kept.",
    source: "IUPAC Green Book, 3rd ed., section 2.11.1 (from memory)",
    example: "reaction(\"2 CO(g) + O2(g) -> 2 CO2(g)\").enthalpy(\"450 degC\").per(\"CO\")",
    claims: &[],
    alternatives: &[],
    run,
    check_line: None,
    caution: None,
};

fn run(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let value = call.quantity(0);
    let written = call.text(1);
    let entity = units::entity(written).unwrap_or_else(|| Entity::named(written));
    if !value.dim().is_per_reaction() {
        let basis = units::basis_words(value.dim()).unwrap_or_else(|| "a total".to_owned());
        return Err(BasisError::NotPerReaction { basis }.into());
    }
    let nu = number_of(value, entity)?;
    let dim = value.dim().times(&Dimension::amount(Entity::RXN)).over(&Dimension::amount(entity));
    let (factor, state) = (1.0 / nu.abs(), value.kind().state.clone());
    let inputs = smallvec![(Rc::clone(value.node()), factor)];
    let kind = Kind { what: value.kind().what, state };
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(value.si() * factor, dim, kind, inputs, step, cx.place.clone())?))
}

/// The stoichiometric number of an entity in the reactions that a value rests on.
fn number_of(value: &Quantity, entity: Entity) -> Result<f64, BasisError> {
    let name = || entity.name().to_owned();
    let mut found: Option<f64> = None;
    let mut missing: Option<&Reaction> = None;
    let history = node::history(value.node());
    for call in history.iter().filter_map(|node| call_of(node)) {
        let [Value::Reaction(reaction), ..] = &call.args[..] else { continue };
        let numbers: Vec<f64> = reaction
            .terms()
            .iter()
            .filter(|term| term.substance.species.entity == entity)
            .map(|term| term.nu)
            .collect();
        match (numbers.as_slice(), found) {
            ([], _) => missing = Some(reaction),
            ([nu], None) => found = Some(*nu),
            ([nu], Some(first)) if *nu != first => {
                return Err(BasisError::SeveralNumbers { entity: name(), first, second: *nu });
            }
            ([_], _) => {}
            _ => return Err(BasisError::SeveralPhases { entity: name(), reaction: reaction.text().to_owned() }),
        }
    }
    match (found, missing) {
        (Some(nu), None) => Ok(nu),
        (_, Some(reaction)) => {
            let known: Vec<&str> = reaction.terms().iter().map(|term| term.substance.species.entity.name()).collect();
            let reaction_text = reaction.text().to_owned();
            Err(BasisError::NotInReaction { entity: name(), reaction: reaction_text, known: known.join(", ") })
        }
        (None, None) => Err(BasisError::NoReaction { entity: name() }),
    }
}

/// "consumed" or "formed", for a value that was taken per mole of a species.
pub fn direction(value: &Quantity) -> Option<&'static str> {
    let call = call_of(value.node()).filter(|call| call.card.id == PER.id)?;
    let written = call.text(1);
    let entity = units::entity(written).unwrap_or_else(|| Entity::named(written));
    number_of(call.quantity(0), entity).ok().map(|nu| if nu < 0.0 { "consumed" } else { "formed" })
}
