//! A reaction: balanced terms, each a substance of the catalogue with its stoichiometric number.
//!
//! Made from an equation as written; Δn(gas) is derived and never typed. The surprise: a substance is one phase here, and
//! a name without a phase is refused, since the phase is worth tens of kJ/mol.

use std::ops::Deref;
use std::rc::Rc;
use std::sync::Arc;

use crate::chem::balance::{self, Party};
use crate::chem::equation::Equation;
use crate::data::catalog::Catalog;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::{Arg, Card, Default, On, Takes, Value};
use crate::model::terms::{Term, Terms};
use crate::units::Entity;

/// A reaction as written: its terms, per mole of reaction.
pub struct Reaction {
    equation: Equation,
    terms: Terms,
}

impl Reaction {
    /// Reads a balanced equation whose species are in the catalogue.
    ///
    /// # Errors
    /// It does not read, is not balanced, or names a species that is unknown or not one.
    pub fn read(text: &str, data: &Catalog) -> Result<Reaction, Fault> {
        let equation = Equation::parse(text, &|name| Ok(data.find(name)?.species.clone()))?;
        let mut terms = Vec::with_capacity(equation.terms().len());
        for (species, nu) in equation.terms() {
            terms.push(Term::of_tables(data.find(&species.id)?, nu.to_f64()));
        }
        let terms = Terms::new(terms, Entity::RXN, equation.to_string());
        Ok(Reaction { equation, terms })
    }

    /// The reaction with one species in another phase. Where the reaction already has that phase, the two add up, and
    /// where they cancel, nothing is left of them.
    ///
    /// # Errors
    /// The catalogue does not have the species.
    pub fn with(&self, id: &str, instead: &Arc<Substance>, data: &Catalog) -> Result<Reaction, Fault> {
        let side = |products: bool| {
            let terms = self.equation.terms().iter().filter(|(_, nu)| nu.is_positive() == products);
            let named = terms.map(|(species, nu)| {
                let name = if *species.id == *id { instead.id() } else { &species.id };
                format!("{} {name}", nu.abs())
            });
            named.collect::<Vec<_>>().join(" + ")
        };
        Reaction::read(&format!("{} -> {}", side(false), side(true)), data)
    }

    pub fn equation(&self) -> &Equation {
        &self.equation
    }
}

impl Deref for Reaction {
    type Target = Terms;

    fn deref(&self) -> &Terms {
        &self.terms
    }
}

pub static REACTION: Card = Card {
    id: "reaction.read",
    name: "reaction",
    on: On::Nothing,
    args: &[Arg {
        name: "equation",
        takes: Takes::Text,
        default: Default::Required,
        doc: "a balanced equation with phases, `CO(g) + H2O(g) -> CO2(g) + H2(g)`; coefficients are integers, decimals or fractions",
    }],
    gives: "a reaction",
    doc: "Reads a reaction. Each species names its phase: (g), (l), (cr), (aq), or a crystal form as in C(cr,graphite). \
          Elements and charge must balance.",
    source: "IUPAC Green Book, 3rd ed., section 2.10.1 (notation; from memory)",
    example: "reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| Ok(Value::Reaction(Rc::new(Reaction::read(call.text(0), cx.data())?))),
    check_line: None,
    caution: None,
};

pub static BALANCE: Card = Card {
    id: "reaction.balance",
    name: "balance",
    on: On::Nothing,
    args: &[Arg {
        name: "equation",
        takes: Takes::Text,
        default: Default::Required,
        doc: "species on both sides of an arrow; coefficients that are given are ignored",
    }],
    gives: "the balanced equation as a text",
    doc: "Solves for the smallest whole stoichiometric numbers, exactly. Refused where there is none, or more than one \
          independent solution.",
    source: "conservation of each element and of charge",
    example: "balance(\"CH4(g) + O2(g) -> CO2(g) + H2O(g)\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let party = |name: &str| {
            let species = cx.data().species(name)?;
            Ok(Party { name: species.id.to_string(), composition: species.composition, charge: species.charge })
        };
        let balanced = balance::balance(call.text(0), &party)?;
        Ok(Value::Text(balanced.to_string().into()))
    },
    check_line: None,
    caution: None,
};
