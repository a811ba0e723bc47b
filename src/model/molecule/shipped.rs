//! A molecule of the shipped constants, `molecule("CO2")`, each figure an input with its source.

use std::rc::Rc;
use std::sync::Arc;

use crate::data::molecule::{Constants, Printed, Shape};
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::Cx;
use crate::model::mass;
use crate::model::molecule::Molecule;
use crate::model::molecule::definition::{Definition, GivenTorsion, Motion};
use crate::model::molecule::error::MoleculeError;
use crate::model::molecule::parameter::{self, Parameter};
use crate::model::molecule::treatment::Treatment;
use crate::model::statmech::diatomic::Spins;
use crate::num::math;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey};
use crate::units::{Kind, parse as unit_parse};

/// Names of the vibrations of one record, in the order of its list, and of its levels.
const NTH: [&str; 24] = [
    "1st", "2nd", "3rd", "4th", "5th", "6th", "7th", "8th", "9th", "10th", "11th", "12th", "13th", "14th", "15th",
    "16th", "17th", "18th", "19th", "20th", "21st", "22nd", "23rd", "24th",
];
const AXES: [&str; 3] = ["A", "B", "C"];

/// The gas on record that goes by a name without phase.
pub fn find(cx: &Cx, name: &str) -> Option<Arc<Substance>> {
    let name = name.trim().trim_end_matches("(g)");
    cx.data().find(&format!("{name}(g)")).ok()
}

/// The molecule of that name.
///
/// # Errors
/// No constants of it are shipped.
pub fn molecule(cx: &Cx, name: &str) -> Result<Molecule, Fault> {
    let found = find(cx, name).and_then(|substance| {
        let constants = Arc::clone(cx.data().molecule(&substance)?);
        Some((substance, constants))
    });
    let Some((substance, constants)) = found else {
        let known: Vec<&str> = cx.data().molecules().map(|one| one.id.trim_end_matches("(g)")).collect();
        return Err(MoleculeError::NotOnRecord { name: name.to_owned(), known: known.join(", ") }.into());
    };
    Ok(Molecule::new(definition(cx, substance, &constants)?, Treatment::default()))
}

fn definition(cx: &Cx, substance: Arc<Substance>, record: &Constants) -> Result<Definition, Fault> {
    let leaf = |printed: &Printed, field: &'static str, way: &'static str| -> Result<Parameter, Fault> {
        let quantity = input(record, printed, field, way)?;
        let name = if way.is_empty() { field.to_owned() } else { format!("{field} {way}") };
        Ok(Parameter::theta(&name, &quantity, cx.constants())
            .unwrap_or_else(|| unreachable!("a wavenumber is an energy")))
    };
    let mut heavy = None;
    let motion = match &record.shape {
        Shape::Atom => Motion::Atom,
        Shape::Diatomic { we, wexe, be, alpha_e, spin_weights, isotopologue_mass, .. } => {
            heavy = Some(isotopologue_mass);
            let named = [(we, "ωe"), (wexe, "ωexe"), (be, "Be"), (alpha_e, "αe")];
            // Forms by nuclear spin are of one isotopologue, and stay so. By the powers of the root of the ratio of the masses by which each goes.
            let ratio = if spin_weights.is_none() { natural(cx, &substance, isotopologue_mass) } else { 1.0 };
            let root = math::sqrt(ratio);
            let constants = named
                .into_iter()
                .zip([root, ratio, ratio, ratio * root])
                .map(|((one, way), by)| {
                    Ok(leaf(one, "spectroscopic constant", way)?.times(&Parameter::exact("natural mixture", by)))
                })
                .collect::<Result<_, Fault>>()?;
            let spins = match (spin_weights, record.symmetry_number) {
                (Some([even, odd]), _) => Spins::Equilibrium { even: f64::from(*even), odd: f64::from(*odd) },
                (None, 2) => Spins::Like,
                (None, _) => Spins::Unlike,
            };
            Motion::Diatomic { constants, spins }
        }
        Shape::Polyatomic { rotational_constants, fundamentals, torsion } => Motion::Polyatomic {
            top: (rotational_constants.iter().zip(AXES))
                .map(|(one, axis)| leaf(one, "rotational constant", axis))
                .collect::<Result<_, _>>()?,
            vibrations: (fundamentals.iter().zip(NTH))
                .map(|((one, g), nth)| Ok((leaf(one, "wavenumber", nth)?, f64::from(*g))))
                .collect::<Result<_, Fault>>()?,
            torsions: match torsion {
                None => Vec::new(),
                Some(given) => vec![GivenTorsion {
                    f: leaf(&given.f, "rotational constant", "of the torsion")?,
                    cosines: vec![
                        Parameter::exact("V1", 0.0),
                        Parameter::exact("V2", 0.0),
                        leaf(&given.v3, "torsional barrier", "")?,
                    ],
                    sines: Vec::new(),
                    symmetry_number: f64::from(given.symmetry_number),
                    solved: Rc::default(),
                }],
            },
        },
    };
    let electronic = (record.electronic_levels.iter().zip(NTH))
        .map(|((one, g), nth)| {
            // The lowest level is where the others are counted from, and no figure.
            let energy = if one.value == 0.0 {
                Parameter::exact("electronic level", 0.0)
            } else {
                leaf(one, "electronic level", nth)?
            };
            Ok((energy, f64::from(*g)))
        })
        .collect::<Result<_, Fault>>()?;
    let mass = match (mass::of_atoms(cx, substance.species.entity, &substance.species.composition), heavy) {
        // Deuterium has no standard atomic weight; the record has the mass of the isotopologue.
        (Err(_), Some(own)) => isotopologue_mass(record, own)?,
        (mass, _) => mass?,
    };
    let symmetry_number = f64::from(record.symmetry_number);
    Ok(Definition {
        substance,
        mass,
        motion,
        electronic,
        symmetry_number,
        symmetry_given: true,
        by_group: record.point_group.as_ref().map(|group| (Arc::clone(group), symmetry_number)),
        distortion: None,
        lacks_delta: false,
        scale: None,
        scale_zero_point: None,
        formation: None,
        energy: None,
    })
}

/// Mass of the isotopologue that the constants are of, over that of the natural mixture, by which they are taken to the
/// mixture's mean: ωe as the root of 1/μ, ωexe and Be as 1/μ, αe as their product. Chlorine and bromine gain 0.15 J/(mol K) of
/// entropy by it. It is done for like atoms, whose ratio of masses is that of μ; of others the light atom decides μ, and the
/// lighter ones have no isotopes that matter. Source: G. Herzberg, Molecular Spectra and Molecular Structure I (1950), III.2(g)
/// (from memory).
fn natural(cx: &Cx, substance: &Substance, isotopologue: &Printed) -> f64 {
    let species = &substance.species;
    if species.composition.len() != 1 {
        return 1.0;
    }
    // Deuterium, which has no standard atomic weight, is its own isotopologue.
    let Ok(mixture) = mass::of_atoms(cx, species.entity, &species.composition) else { return 1.0 };
    1e-3 * isotopologue.value / mixture.value
}

fn key(record: &Constants, field: &'static str, way: &'static str) -> LeafKey {
    LeafKey::Datum { dataset: "molecular-constants".into(), record: record.id.clone(), field, t_bits: 0, way }
}

fn input(record: &Constants, printed: &Printed, field: &'static str, way: &'static str) -> Result<Quantity, Fault> {
    let unit = unit_parse::unit("cm^-1")?;
    let factor = unit.factor;
    let input = Input {
        digit: Some(factor * printed.digit),
        unit: Some(Arc::new(unit)),
        citation: Some(record.citation.clone()),
        ..Input::of(key(record, field, way))
    };
    Ok(Quantity::input(factor * printed.value, parameter::wavenumber(), Kind::PLAIN, input, None)?)
}

fn isotopologue_mass(record: &Constants, printed: &Printed) -> Result<Parameter, Fault> {
    let unit = unit_parse::unit("g/mol")?;
    let input = Input {
        digit: Some(unit.factor * printed.digit),
        citation: Some(record.citation.clone()),
        ..Input::of(key(record, "isotopologue mass", ""))
    };
    let quantity = Quantity::input(unit.factor * printed.value, unit.dim.clone(), Kind::PLAIN, input, None)?;
    Ok(Parameter::of("molar mass", &quantity))
}

/// The published function of the same gas, where one is shipped.
pub fn published(molecule: &Rc<Molecule>) -> Option<&crate::data::function::Function> {
    molecule.definition().substance.function.as_deref()
}

#[cfg(test)]
mod tests {
    use std::cell::Cell;

    use super::*;
    use crate::model::card::References;
    use crate::units::constants;

    #[test]
    fn every_record_makes_a_molecule_with_all_its_modes() {
        let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
        let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
        let mut seen = 0;
        for record in cx.data().molecules() {
            let molecule = molecule(&cx, &record.id).unwrap_or_else(|fault| panic!("{}: {fault}", record.id));
            let definition = molecule.definition();
            let atoms = definition.substance.species.composition.iter().map(|(_, n)| n.to_f64()).sum::<f64>();
            let modes = match &definition.motion {
                Motion::Atom => 0.0,
                Motion::Diatomic { .. } => 1.0,
                Motion::Polyatomic { vibrations, torsions, .. } => {
                    vibrations.iter().map(|(_, g)| g).sum::<f64>() + torsions.len() as f64
                }
            };
            let rotations = match &definition.motion {
                Motion::Atom => 0.0,
                Motion::Polyatomic { top, .. } if top.len() == 3 => 3.0,
                _ => 2.0,
            };
            assert_eq!(modes + rotations + 3.0, 3.0 * atoms, "{}", record.id);
            assert_eq!(definition.electronic[0].0.value, 0.0, "{}", record.id);
            seen += 1;
        }
        assert_eq!(seen, 63);
    }
}
