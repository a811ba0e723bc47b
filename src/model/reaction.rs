//! A reaction: balanced terms, each a substance of the catalogue with its stoichiometric number.
//!
//! Made from an equation as written; Δn(gas) is derived and never typed. The surprise: a substance is one phase here, and
//! a name without a phase is refused, since the phase is worth tens of kJ/mol.

use std::collections::BTreeMap;
use std::ops::Deref;
use std::rc::Rc;
use std::sync::Arc;

use crate::chem::balance::{self, Party};
use crate::chem::equation::Equation;
use crate::data::catalog::Catalog;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::fit_card;
use crate::model::molecule::error::MoleculeError;
use crate::model::molecule::formation::Own;
use crate::model::solid::answers;
use crate::model::terms::{Stand, Term, Terms};
use crate::units::Entity;

/// A reaction as written: its terms, per mole of reaction.
pub struct Reaction {
    equation: Equation,
    terms: Terms,
    own: Named,
}

/// Substances of one's own, by the names that an equation has for them.
pub type Named = BTreeMap<String, Stand>;

impl Reaction {
    /// Reads a balanced equation whose species are in the catalogue.
    ///
    /// # Errors
    /// It does not read, is not balanced, or names a species that is unknown or not one.
    pub fn read(text: &str, data: &Catalog) -> Result<Reaction, Fault> {
        Reaction::read_with(text, data, Named::new())
    }

    /// The same where some names stand for substances of one's own.
    ///
    /// # Errors
    /// As [`Reaction::read`], or one of the names is not in the equation.
    pub fn read_with(text: &str, data: &Catalog, own: Named) -> Result<Reaction, Fault> {
        let by_name = |name: &str| own.iter().find(|(known, _)| same_name(known, name)).map(|(_, stand)| stand);
        let equation = Equation::parse(text, &|name| match by_name(name) {
            Some(stand) => Ok(stand.substance.species.clone()),
            None => Ok(data.find(name)?.species.clone()),
        })?;
        let by_id = |id: &str| own.values().find(|stand| stand.substance.id() == id);
        let mut terms = Vec::with_capacity(equation.terms().len());
        for (species, nu) in equation.terms() {
            terms.push(match by_id(&species.id) {
                Some(stand) => {
                    let (substance, own) = (Arc::clone(&stand.substance), Some(Rc::clone(&stand.thermo)));
                    Term { substance, nu: nu.to_f64(), own }
                }
                None => Term::of_tables(data.find(&species.id)?, nu.to_f64()),
            });
        }
        let unused = |stand: &Stand| !terms.iter().any(|term| term.substance.id() == stand.substance.id());
        if let Some((name, stand)) = own.iter().find(|(_, stand)| unused(stand)) {
            let (name, given) = (name.clone(), stand.substance.id().to_owned());
            return Err(MoleculeError::NotInEquation { name, given }.into());
        }
        let terms = Terms::new(terms, Entity::RXN, equation.to_string());
        Ok(Reaction { equation, terms, own })
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
        // What changed its phase is a record of the tables again.
        let kept = self.own.iter().filter(|(_, stand)| stand.substance.id() != id);
        let kept = kept.map(|(_, stand)| (stand.substance.id().to_owned(), stand.clone())).collect();
        Reaction::read_with(&format!("{} -> {}", side(false), side(true)), data, kept)
    }

    pub(super) fn made_by(&mut self, call: &Rc<Call>) {
        self.terms.made_by(call);
    }

    /// The same reaction with other figures for some of its terms.
    pub(super) fn answered_by(&self, terms: Vec<Term>) -> Reaction {
        let terms = Terms::new(terms, Entity::RXN, self.text().to_owned());
        Reaction { equation: self.equation.clone(), terms, own: self.own.clone() }
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

/// Whether two names are one, spaces apart.
fn same_name(a: &str, b: &str) -> bool {
    let plain = |text: &str| text.chars().filter(|c| !c.is_whitespace()).collect::<String>();
    plain(a) == plain(b)
}

/// The substances of one's own that a call gives in `own`.
fn given(cx: &Cx, options: Option<&Value>) -> Result<Named, Fault> {
    let mut named = Named::new();
    let Some(Value::Options(options)) = options else { return Ok(named) };
    let Some(own) = options.get("own") else { return Ok(named) };
    let Value::Options(own) = own else {
        let (key, wanted) = ("own".to_owned(), "a map from names with phase to substances, as in #{ \"CO2(g)\": m }");
        return Err(MoleculeError::Sort { key, wanted, given: own.sort().to_owned() }.into());
    };
    for (name, value) in own.iter() {
        let stand = match value {
            Value::Molecule(molecule) => Stand {
                substance: Arc::clone(&molecule.definition().substance),
                thermo: Rc::new(Own::new(cx, molecule)?),
            },
            Value::Crystal(crystal) => {
                Stand { substance: Arc::clone(&crystal.substance), thermo: Rc::new(answers::Own::new(cx, crystal)?) }
            }
            Value::Substance(own) => fit_card::stand(cx, name, own)?,
            other => {
                let (key, wanted) = (format!("own: {name}"), "a molecule, a crystal or a fitted heat capacity");
                return Err(MoleculeError::Sort { key, wanted, given: other.sort().to_owned() }.into());
            }
        };
        named.insert(name.clone(), stand);
    }
    Ok(named)
}

pub static REACTION: Card = Card {
    id: "reaction.read",
    name: "reaction",
    on: On::Nothing,
    args: &[
        Arg {
            name: "equation",
            takes: Takes::Text,
            default: Default::Required,
            doc: "a balanced equation with phases, `CO(g) + H2O(g) -> CO2(g) + H2(g)`; coefficients are integers, decimals or fractions",
        },
        Arg {
            name: "options",
            takes: Takes::Options(&[Arg {
                name: "own",
                takes: Takes::Any,
                default: Default::Absent,
                doc: "substances of one's own in place of records, by their names in the equation: #{ \"CO2(g)\": molecule(\"CO2\") }",
            }]),
            default: Default::NoOptions,
            doc: "what stands for some of the names",
        },
    ],
    gives: "a reaction",
    doc: "Reads a reaction. Each species names its phase: (g), (l), (cr), (aq), or a crystal form as in C(cr,graphite). \
          Elements and charge must balance.",
    source: "IUPAC Green Book, 3rd ed., section 2.10.1 (notation; from memory)",
    example: "reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let own = given(cx, call.args.get(1))?;
        Ok(Value::Reaction(Rc::new(Reaction::read_with(call.text(0), cx.data(), own)?)))
    },
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
