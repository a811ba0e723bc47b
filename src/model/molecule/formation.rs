//! The formation enthalpy of a molecule at 298.15 K, and the molecule as a substance of a reaction.
//!
//! ΔfH°(298.15 K) = ΔfH°(0 K) + [H(298.15 K) − H(0)] − Σ n(E) [H(298.15 K) − H(0)] of the elements
//!
//! | symbol | unit  | meaning                                                                             |
//! |--------|-------|-------------------------------------------------------------------------------------|
//! | n(E)   | 1     | moles of an element's reference substance per mole of the molecule: ½ O2 for one O   |
//!
//! The increment of the molecule is its own, the elements' are those on record with their functions.
//! Source: definition of formation at the two temperatures; IUPAC Green Book, 3rd ed., section 2.11 (from memory).

use std::rc::Rc;
use std::sync::Arc;

use smallvec::SmallVec;

use crate::chem::species::Species;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::{Call, Card, Cx, On, Value};
use crate::model::function::T_REFERENCE;
use crate::model::gather::Figure;
use crate::model::molecule::answers::{self, molecule_of};
use crate::model::molecule::definition::GivenFormation;
use crate::model::molecule::error::MoleculeError;
use crate::model::molecule::{Molecule, RANGE_K};
use crate::model::property::{self, Property};
use crate::model::thermo::{AtT, Thermo};
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey, Node};
use crate::units::constants::STANDARD_PRESSURE;
use crate::units::{Dimension, Entity, Kind, State, What, Zero};

/// Name of the elements' figures among inputs.
const FIELD: &str = "enthalpy increment from 0 K";

/// The card of a formation enthalpy as it was given, for whatever may be given one.
macro_rules! formation_card {
    ($id:literal, $on:expr, $what:literal, $example:literal, $run:expr) => {
        pub static FORMATION_ENTHALPY: Card = Card {
            id: $id,
            name: "formation_enthalpy",
            on: $on,
            args: &[],
            gives: concat!("ΔfH°(298.15 K) per mole of the ", $what),
            doc: "The formation enthalpy that was given, at 298.15 K: as it is, or taken there from 0 K with its own \
                  H(298.15 K) - H(0) and those of the elements on record.",
            source: "definition of formation; IUPAC Green Book, 3rd ed., section 2.11 (from memory)",
            example: $example,
            claims: &[],
            alternatives: &[],
            run: $run,
            check_line: None,
            caution: None,
        };
    };
}
pub(in crate::model) use formation_card;

formation_card!(
    "molecule.formation-enthalpy",
    On::Molecule,
    "gas",
    "molecule(#{ formula: \"Ar\", formation_enthalpy: \"0 kJ/mol\", formation_temperature: \"298.15 K\" }).formation_enthalpy()",
    |cx, call| match formation(cx, call)? {
        Some(value) => Ok(Value::Quantity(value)),
        None => {
            let (molecule, what) = (molecule_of(call).text().to_owned(), "formation enthalpy");
            Err(MoleculeError::NotGiven { molecule, what }.into())
        }
    }
);

/// The formation enthalpy of a molecule at 298.15 K, made by `call`; `None` where none was given.
fn formation(cx: &Cx, call: &Rc<Call>) -> Result<Option<Quantity>, Fault> {
    let molecule = molecule_of(call);
    let species = &molecule.definition().substance.species;
    at_298(cx, call, molecule.definition().formation.as_ref(), species, || {
        let set = cx.constants();
        let per_rt = set.molar_gas.value * T_REFERENCE;
        let own = per_rt * (molecule.gas().share(T_REFERENCE, set).u + 1.0);
        let by = molecule.derivatives(T_REFERENCE).into_iter().map(|(node, change)| (node, per_rt * change.u));
        Ok((own, by.filter(|(_, by)| *by != 0.0).collect()))
    })
}

/// A figure in SI units, and each input with the derivative of the figure with respect to it.
pub(in crate::model) type WithInputs = (f64, Vec<(Rc<Node>, f64)>);

/// A given formation enthalpy of a species at 298.15 K, made by `call`; `own` is H(298.15 K) − H(0) of the species, asked
/// where it is needed. `None` where none was given.
///
/// # Errors
/// The figure of an element is not on record, or `own` fails.
pub(in crate::model) fn at_298(
    cx: &Cx,
    call: &Rc<Call>,
    given: Option<&GivenFormation>,
    species: &Species,
    own: impl FnOnce() -> Result<WithInputs, Fault>,
) -> Result<Option<Quantity>, Fault> {
    let Some(given) = given else { return Ok(None) };
    let mut si = given.value.si();
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = SmallVec::from_iter([(Rc::clone(given.value.node()), 1.0)]);
    if given.at_zero {
        let (increment, by) = own()?;
        si += increment;
        inputs.extend(by);
        for (leaf, count) in elements(cx, species)? {
            si -= count * leaf.si();
            inputs.push((leaf, -count));
        }
    }
    let state = State {
        zero: Some(Zero::Elements298),
        t_k: Some(T_REFERENCE),
        p_pa: Some(STANDARD_PRESSURE.value),
        standard: true,
        reaction: false,
    };
    let dim = property::dimension(Property::H, species.entity);
    let step = Rc::clone(call);
    Ok(Some(Quantity::from_step(si, dim, Kind::in_state(What::H, state), inputs, step, cx.place.clone())?))
}

/// H(298.15 K) − H(0) of each element's reference substance, and how many moles of it one mole of the species takes.
///
/// # Errors
/// The figure of an element is not on record, or the species is an ion.
fn elements(cx: &Cx, species: &Species) -> Result<Vec<(Rc<Node>, f64)>, Fault> {
    if species.charge != 0 {
        return Err(MoleculeError::ElementIncrement { element: "the electron".to_owned() }.into());
    }
    let mut all = Vec::new();
    for (element, count) in species.composition.iter() {
        let name = element.symbol().to_owned();
        let is_reference = |substance: &&Arc<Substance>| {
            let of = &substance.species.composition;
            of.len() == 1
                && !of.count(element).is_zero()
                && substance.function.as_ref().is_some_and(|f| f.is_reference_element && f.covers(T_REFERENCE))
        };
        let found = cx.data().substances().find(is_reference);
        let figure = found.and_then(|substance| {
            let function = substance.function.as_ref()?;
            Some((substance, function, function.h298_minus_h0?))
        });
        let Some((substance, function, increment)) = figure else {
            return Err(MoleculeError::ElementIncrement { element: name }.into());
        };
        let atoms = substance.species.composition.count(element).to_f64();
        let key = LeafKey::Datum {
            dataset: function.dataset.shared(),
            record: substance.species.id.clone(),
            field: FIELD,
            t_bits: 0,
            way: "",
        };
        // Printed in J/mol to three decimals by its report, which is not what it is good for.
        let input = Input { digit: Some(1.0), citation: Some(function.citation.clone()), ..Input::of(key) };
        let dim = Dimension::whole([2, 1, -2, 0, 0, 0]).over(&Dimension::amount(Entity::OPEN));
        let leaf = Quantity::input(increment, dim, Kind::PLAIN, input, None)?;
        all.push((Rc::clone(leaf.node()), count.to_f64() / atoms));
    }
    Ok(all)
}

/// A molecule in place of a table's record.
pub struct Own {
    molecule: Rc<Molecule>,
    formation: Option<Quantity>,
}

impl Own {
    /// # Errors
    /// Its formation enthalpy cannot be taken to 298.15 K.
    pub fn new(cx: &Cx, molecule: &Rc<Molecule>) -> Result<Own, Fault> {
        let call = Call { card: &FORMATION_ENTHALPY, args: vec![Value::Molecule(Rc::clone(molecule))] };
        Ok(Own { molecule: Rc::clone(molecule), formation: formation(cx, &Rc::new(call))? })
    }
}

fn figure(value: &Quantity) -> Figure {
    Figure::of_nodes(value.si(), [(Rc::clone(value.node()), 1.0)])
}

impl Thermo for Own {
    fn range_k(&self) -> (f64, f64) {
        RANGE_K
    }

    fn at(&self, cx: &Cx, t_k: f64) -> Result<AtT, Fault> {
        let ask = |card: &'static Card| answers::at(cx, card, &self.molecule, t_k);
        let functions = self.molecule.gas().functions(t_k, cx.constants());
        Ok(AtT {
            cp: figure(&ask(&answers::HEAT_CAPACITY)?),
            increment: figure(&ask(&answers::ENTHALPY_INCREMENT)?),
            entropy: Some(figure(&ask(&answers::ENTROPY)?)),
            cp_slope: functions.cp_slope,
        })
    }

    fn formation(&self) -> Option<Figure> {
        self.formation.as_ref().map(figure)
    }
}
