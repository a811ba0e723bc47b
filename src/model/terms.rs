//! A formal sum of species: what a reaction and a pure substance have in common.
//!
//! A reaction is Σ ν X per mole of reaction, a substance is 1 X per mole of X. Everything that is computed from species'
//! records is computed of [`Terms`], so both answer the same questions with the same code.

use std::rc::Rc;
use std::sync::Arc;

use crate::data::substance::Substance;
use crate::model::card::Call;
use crate::model::origin::Origin;
use crate::model::thermo::Thermo;
use crate::units::Entity;

/// One species with its stoichiometric number, positive for products.
#[derive(Clone)]
pub struct Term {
    /// The species, with what the shipped tables say of it.
    pub substance: Arc<Substance>,
    pub nu: f64,
    /// What answers for the species in place of the tables.
    pub own: Option<Rc<dyn Thermo>>,
}

impl Term {
    /// A species that the shipped tables answer for.
    pub fn of_tables(substance: Arc<Substance>, nu: f64) -> Self {
        Term { substance, nu, own: None }
    }
}

/// A substance of one's own, by which a name of an equation is answered.
#[derive(Clone)]
pub struct Stand {
    pub substance: Arc<Substance>,
    pub thermo: Rc<dyn Thermo>,
}

/// The sum, and per mole of what it is.
pub struct Terms {
    terms: Vec<Term>,
    per: Entity,
    text: String,
    origin: Option<Origin>,
}

impl Terms {
    pub fn new(terms: Vec<Term>, per: Entity, text: String) -> Self {
        Terms { terms, per, text, origin: None }
    }

    /// The call that made this, where it is known.
    pub fn origin(&self) -> Option<&Origin> {
        self.origin.as_ref()
    }

    pub(super) fn made_by(&mut self, call: &Rc<Call>) {
        self.origin = Origin::of(call);
    }

    pub fn terms(&self) -> &[Term] {
        &self.terms
    }

    /// Per mole of this: of reaction as written, or of the substance.
    pub fn per(&self) -> Entity {
        self.per
    }

    pub fn is_reaction(&self) -> bool {
        self.per == Entity::RXN
    }

    /// As written, in a form that reads back.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// How species differ from their standard states, in words; empty where none does.
    pub fn conditions(&self) -> Vec<String> {
        self.terms.iter().filter_map(|term| term.own.as_ref()?.condition()).collect()
    }

    /// Sum of the stoichiometric numbers of the gases.
    pub fn delta_n_gas(&self) -> f64 {
        self.terms.iter().filter(|term| term.substance.species.is_gas()).map(|term| term.nu).sum()
    }

    /// The largest stoichiometric number by size: the scale of a tolerance.
    pub fn largest_nu(&self) -> f64 {
        self.terms.iter().map(|term| term.nu.abs()).fold(0.0, f64::max)
    }
}
