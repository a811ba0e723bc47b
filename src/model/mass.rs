//! Molar mass, and values per mass, per mole and per kilogram of a stream.
//!
//! M(X) = Σ n(E) Aᵣ(E) · 1 g/mol
//!
//! | symbol | unit    | meaning                                                                  |
//! |--------|---------|--------------------------------------------------------------------------|
//! | n(E)   | 1       | atoms of element E in X                                                  |
//! | Aᵣ(E)  | 1       | standard atomic weight; its printed bound is taken as rectangular        |
//!
//! Each element is one input, so that masses of two substances of one element are correlated as they should. Electrons of
//! ions and the molar mass constant's 3e-10 are left out, far below the spread of natural isotopes.
//! Source: IUPAC CIAAW standard atomic weights; JCGM 100:2008, clause 4.3.7 for the rectangle.

use std::rc::Rc;

use smallvec::SmallVec;
use thiserror::Error;

use crate::chem::composition::Composition;
use crate::chem::formula::Formula;
use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::molecule::parameter::Parameter;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey, Step};
use crate::units::{self, Dimension, Entity, Kind, Of};

/// Why a value has no such basis.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum MassError {
    #[error("what {entity} is made of is not known, so it has no molar mass here")]
    NoComposition { entity: String },
    #[error("{element} has no standard atomic weight, so {entity} has no molar mass here")]
    NoWeight { entity: String, element: String },
    #[error("the value is {basis}, and {function} wants one {wanted}")]
    Basis { function: &'static str, basis: String, wanted: &'static str },
    #[error("the content is given in {given}, and {function} wants kg of {entity} per kg of {stream}")]
    Content { function: &'static str, given: String, entity: String, stream: String },
}

impl Explain for MassError {
    fn code(&self) -> &'static str {
        match self {
            MassError::NoComposition { .. } => "composition-unknown",
            MassError::NoWeight { .. } => "atomic-weight-missing",
            MassError::Basis { .. } => "basis-does-not-fit",
            MassError::Content { .. } => "content-does-not-fit",
        }
    }

    fn hint(&self) -> String {
        match self {
            MassError::NoComposition { entity } => {
                format!("divide by the molar mass yourself, as in `x / q(\"16.04 g[{entity}]/mol[{entity}]\")`")
            }
            MassError::NoWeight { .. } => "use the isotope's mass from your own source".to_owned(),
            MassError::Basis { wanted, .. } => {
                format!("bring it to a value {wanted} first; a reaction value with `.per(\"CH4\")`")
            }
            MassError::Content { entity, stream, .. } => format!("write it as `q(\"0.12 kg[{entity}]/kg[{stream}]\")`"),
        }
    }
}

/// The molar mass of an entity, in kg[X]/mol[X], with its elements as inputs.
///
/// # Errors
/// Its composition is not known, or an element has no standard atomic weight.
pub(super) fn molar_mass(cx: &Cx, entity: Entity, step: Rc<dyn Step>) -> Result<Quantity, Fault> {
    let Parameter { value: si, inputs, .. } = of_atoms(cx, entity, &composition_of(cx, entity)?)?;
    let dim = Dimension::mass(entity).over(&Dimension::amount(entity));
    Ok(Quantity::from_step(si, dim, Kind::PLAIN, inputs, step, cx.place.clone())?)
}

/// The molar mass of a composition in kg/mol, with its elements as inputs.
///
/// # Errors
/// An element has no standard atomic weight.
pub(super) fn of_atoms(cx: &Cx, entity: Entity, composition: &Composition) -> Result<Parameter, Fault> {
    let terms = composition.molar_mass_terms().map_err(Fault::from)?;
    let (mut value, mut inputs) = (0.0, SmallVec::new());
    for (element, count) in terms {
        let weight = cx.data().atomic_weight(element).ok_or_else(|| MassError::NoWeight {
            entity: entity.name().to_owned(),
            element: element.symbol().to_owned(),
        })?;
        let key = LeafKey::Datum {
            dataset: "atomic-weights".into(),
            record: element.symbol().into(),
            field: "atomic weight",
            t_bits: 0,
            way: "",
        };
        let citation = Some(weight.citation.clone());
        let input = Input { u: Some(weight.u_standard), citation, ..Input::of(key) };
        let leaf = Quantity::input(weight.value_g_mol, Dimension::none(), Kind::PLAIN, input, None)?;
        let partial = count / 1000.0;
        value += partial * weight.value_g_mol;
        inputs.push((Rc::clone(leaf.node()), partial));
    }
    Ok(Parameter { name: "molar mass".to_owned(), value, inputs })
}

fn composition_of(cx: &Cx, entity: Entity) -> Result<Composition, Fault> {
    let recorded = cx.data().substances().find(|substance| substance.species.entity == entity);
    if let Some(substance) = recorded {
        return Ok(substance.species.composition.clone());
    }
    let unknown = |_| MassError::NoComposition { entity: entity.name().to_owned() };
    Ok(Formula::parse(entity.name()).map_err(unknown)?.composition().clone())
}

/// The one entity that a value is per mole, or per kilogram, of.
fn per(dim: &Dimension, of: Of) -> Option<Entity> {
    match dim.entities() {
        [(kind, entity, -2)] if *kind == of && *entity != Entity::RXN && !entity.is_open() => Some(*entity),
        _ => None,
    }
}

fn unfit(function: &'static str, value: &Quantity, wanted: &'static str) -> Fault {
    let basis = units::basis_words(value.dim()).unwrap_or_else(|| "a total".to_owned());
    MassError::Basis { function, basis, wanted }.into()
}

pub static MOLAR_MASS: Card = Card {
    id: "mass.molar",
    name: "molar_mass",
    on: On::Nothing,
    args: &[Arg {
        name: "name",
        takes: Takes::Text,
        default: Default::Required,
        doc: "a formula or the name of a substance, with or without phase",
    }],
    gives: "mass per mole of the substance",
    doc: "Molar mass from standard atomic weights, with the spread of natural materials as its uncertainty.",
    source: "IUPAC CIAAW standard atomic weights 2021",
    example: "molar_mass(\"CH4\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let name = call.text(0);
        let entity = units::entity(name).unwrap_or_else(|| Entity::named(name));
        let step: Rc<dyn Step> = Rc::<Call>::clone(call);
        Ok(Value::Quantity(molar_mass(cx, entity, step)?))
    },
    check_line: None,
    caution: None,
};

pub static PER_MASS: Card = Card {
    id: "mass.per-mass",
    name: "per_mass",
    on: On::Quantity,
    args: &[],
    gives: "the value per kilogram of the substance it was per mole of",
    doc: "Divides a molar value by the molar mass of its substance.",
    source: "IUPAC CIAAW standard atomic weights 2021",
    example: "q(\"-890.6(4) kJ/mol[CH4]\").per_mass()",
    claims: &[],
    alternatives: &[],
    run: per_mass,
    check_line: None,
    caution: None,
};

fn per_mass(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let value = call.quantity(0);
    let entity = per(value.dim(), Of::Amount).ok_or_else(|| unfit("per_mass", value, "per mole of one substance"))?;
    let step: Rc<dyn Step> = Rc::<Call>::clone(call);
    let mass = molar_mass(cx, entity, step)?;
    Ok(Value::Quantity(value.over(&mass, cx.place.clone())?))
}

pub static PER_MOLE: Card = Card {
    id: "mass.per-mole",
    name: "per_mole",
    on: On::Quantity,
    args: &[],
    gives: "the value per mole: of the substance it was per kilogram of, or of particles for an energy per particle",
    doc: "Multiplies a specific value by the molar mass of its substance, or an energy per particle, such as one in eV or \
          E_h, by the Avogadro constant.",
    source: "IUPAC CIAAW standard atomic weights 2021; SI Brochure, 9th ed., for the Avogadro constant",
    example: "q(\"27.2 eV\").per_mole()",
    claims: &[],
    alternatives: &[],
    run: per_mole,
    check_line: None,
    caution: None,
};

fn per_mole(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let value = call.quantity(0);
    if let Some(entity) = per(value.dim(), Of::Mass) {
        let step: Rc<dyn Step> = Rc::<Call>::clone(call);
        let mass = molar_mass(cx, entity, step)?;
        return Ok(Value::Quantity(value.times(&mass, cx.place.clone())?));
    }
    if *value.dim() != Dimension::whole([2, 1, -2, 0, 0, 0]) {
        return Err(unfit("per_mole", value, "per kilogram of one substance, or an energy per particle"));
    }
    let avogadro = constant(cx, &cx.constants().avogadro, Dimension::none().over(&Dimension::amount(Entity::OPEN)))?;
    Ok(Value::Quantity(value.times(&avogadro, cx.place.clone())?))
}

pub static WAVENUMBER_ENERGY: Card = Card {
    id: "mass.wavenumber-energy",
    name: "wavenumber_energy",
    on: On::Quantity,
    args: &[],
    gives: "the energy per particle, E = h c ν̃",
    doc: "Takes a wavenumber to the energy of one quantum, E = h c ν̃; `per_mole()` takes it on to an energy per mole.",
    source: "SI Brochure, 9th ed., defining constants h and c",
    example: "q(\"2349 cm^-1\").wavenumber_energy().per_mole()",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let value = call.quantity(0);
        if *value.dim() != Dimension::whole([-1, 0, 0, 0, 0, 0]) {
            return Err(unfit("wavenumber_energy", value, "in cm^-1, a wavenumber"));
        }
        let hc = constant(cx, &cx.constants().wavenumber_energy, Dimension::whole([3, 1, -2, 0, 0, 0]))?;
        Ok(Value::Quantity(value.times(&hc, cx.place.clone())?))
    },
    check_line: None,
    caution: None,
};

fn constant(cx: &Cx, constant: &units::constants::Constant, dim: Dimension) -> Result<Quantity, Fault> {
    let key = LeafKey::Constant { year: cx.constants().year, name: constant.name };
    let input = Input { u: Some(constant.u), citation: Some(constant.citation()), ..Input::of(key) };
    Ok(Quantity::input(constant.value, dim, Kind::PLAIN, input, None)?)
}

pub static PER_KG_OF: Card = Card {
    id: "mass.per-kg-of",
    name: "per_kg_of",
    on: On::Quantity,
    args: &[
        Arg {
            name: "stream",
            takes: Takes::Text,
            default: Default::Required,
            doc: "a stream or material, such as \"feed\"",
        },
        Arg {
            name: "content",
            takes: Takes::AnyQuantity,
            default: Default::Required,
            doc: "kilograms of the value's substance per kilogram of the stream, `q(\"0.12 kg[CH4]/kg[feed]\")`",
        },
    ],
    gives: "the value per kilogram of the stream",
    doc: "Takes a value per mole or per kilogram of a substance to one per kilogram of a stream that contains it.",
    source: "definition of a mass fraction",
    example: "q(\"-890.6(4) kJ/mol[CH4]\").per_kg_of(\"feed\", \"0.12(1) kg[CH4]/kg[feed]\")",
    claims: &[],
    alternatives: &[],
    run: per_kg_of,
    check_line: None,
    caution: None,
};

fn per_kg_of(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (value, stream, content) = (call.quantity(0), call.text(1), call.quantity(2));
    let specific = match (per(value.dim(), Of::Mass), per(value.dim(), Of::Amount)) {
        (Some(entity), _) => (entity, value.clone()),
        (None, Some(entity)) => {
            let step: Rc<dyn Step> = Rc::<Call>::clone(call);
            (entity, value.over(&molar_mass(cx, entity, step)?, cx.place.clone())?)
        }
        _ => return Err(unfit("per_kg_of", value, "per mole or per kilogram of one substance")),
    };
    let (entity, specific) = specific;
    let wanted = Dimension::mass(entity).over(&Dimension::mass(Entity::named(stream)));
    if *content.dim() != wanted {
        let (entity, stream) = (entity.name().to_owned(), stream.to_string());
        let given = units::unit_for(content.dim()).text.to_string();
        return Err(MassError::Content { function: "per_kg_of", given, entity, stream }.into());
    }
    Ok(Value::Quantity(specific.times(content, cx.place.clone())?))
}

#[cfg(test)]
mod tests {
    use std::cell::Cell;

    use super::*;
    use crate::model::card::{self, References};
    use crate::units::constants;

    fn ask(card: &'static Card, args: &[&str]) -> Result<Quantity, Fault> {
        let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
        let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
        let mut args: Vec<Value> = args.iter().map(|arg| Value::Text((*arg).into())).collect();
        if card.on == On::Quantity {
            let Value::Text(written) = &args[0] else { unreachable!() };
            args[0] = Value::Quantity(crate::quantity::text::parse(written, None, 0).unwrap());
        }
        match card::call(&cx, card, args)? {
            Value::Quantity(value) => Ok(value),
            other => panic!("{} gives {}", card.id, other.sort()),
        }
    }

    #[test]
    fn a_molar_mass_is_the_sum_of_its_atoms_with_one_input_for_each_element() {
        // CIAAW 2021, abridged: H 1.0080(2), C 12.011(2), both bounds. Sum and spread by hand.
        let methane = ask(&MOLAR_MASS, &["CH4"]).unwrap();
        assert!((methane.si() - 16.043e-3).abs() < 1e-15);
        let u = f64::sqrt(0.002 * 0.002 + 16.0 * 0.0002 * 0.0002) / f64::sqrt(3.0) / 1000.0;
        assert!((methane.spread().u().unwrap() - u).abs() < 1e-15);
        assert_eq!(methane.sensitivities().len(), 2);
    }

    #[test]
    fn a_value_goes_to_mass_and_back() {
        let specific = ask(&PER_MASS, &["-890.6(4) kJ/mol[CH4]"]).unwrap();
        assert_eq!(specific.unit().text.as_ref(), "kJ/kg[CH4]");
        assert!((specific.si() / 1000.0 + 890.6 / 16.043e-3).abs() < 1e-6);
        assert!(ask(&PER_MASS, &["-890.6 kJ/mol[rxn]"]).is_err());
    }

    #[test]
    fn an_energy_per_particle_goes_to_the_mole() {
        // SI Brochure, 9th ed.: e N_A = 96 485.332 12… C/mol, so 1 eV is 96.485 332 12… kJ/mol.
        let molar = ask(&PER_MOLE, &["1 eV"]).unwrap();
        assert!((molar.si() - 96_485.332_123_310_02).abs() < 1e-9);
        // CODATA: N_A h c = 0.119 626 565 638… J m/mol, so 1000 cm^-1 is 11.962 656 6 kJ/mol.
        let quantum = ask(&WAVENUMBER_ENERGY, &["1000 cm^-1"]).unwrap();
        let avogadro = constants::current().avogadro.value;
        assert!((quantum.si() * avogadro - 11_962.656_563_869_7).abs() < 1e-7);
    }

    #[test]
    fn a_content_takes_a_value_to_a_stream() {
        let feed = ask(&PER_KG_OF, &["50.0 kJ/kg[CH4]", "feed", "0.10 kg[CH4]/kg[feed]"]).unwrap();
        assert_eq!((feed.si(), feed.unit().text.as_ref()), (5000.0, "kJ/kg[feed]"));
        assert!(ask(&PER_KG_OF, &["50.0 kJ/kg[CH4]", "feed", "0.10 kg[C2H6]/kg[feed]"]).is_err());
    }
}
