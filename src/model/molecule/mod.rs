//! A gas molecule by its constants: what the analyst gave or the shipped record says, and how it is to be taken.
//!
//! A [`Molecule`] holds its [`Definition`], its [`Treatment`] and the [`Gas`] that follows from the two; each parameter
//! of the gas knows the inputs it came from, so that every answer has their uncertainty. The surprise: another treatment
//! is another molecule, which is how an approximation is priced.

pub mod answers;
pub mod claims;
pub mod definition;
pub mod error;
pub mod formation;
pub mod limits;
pub mod parameter;
pub mod point_group;
pub mod power_fit;
pub mod read;
pub mod shares;
pub mod shipped;
pub mod stretching;
pub mod table;
pub mod torsion_levels;
pub mod treatment;

use std::rc::Rc;

use crate::model::card::Call;
use crate::model::statmech::diatomic::{Constants, Diatomic};
use crate::model::statmech::gas::{Gas, Part};
use crate::model::statmech::levels::Level;
use crate::model::statmech::rotation::{Sum, Top};
use crate::model::statmech::vibration::LowModes;
use crate::model::statmech::{Change, translation};
use crate::model::terms::{Term, Terms};
use crate::record::node::Node;
use crate::source::Citation;
use crate::units::Entity;

use definition::{Definition, Motion};
use parameter::Parameter;
use treatment::{TorsionAs, Treatment, VibrationAs};

/// Temperatures at which a molecule answers, K: below, gases are none, and above, electrons and chemistry take over.
pub const RANGE_K: (f64, f64) = (1.0, 6000.0);

/// A molecule of an ideal gas.
pub struct Molecule {
    definition: Definition,
    treatment: Treatment,
    gas: Gas,
    described: Vec<Described>,
    terms: Terms,
}

/// What a part of the gas is called, and where its parameters came from, in the order of the part's derivatives.
pub struct Described {
    pub name: String,
    parameters: Vec<Parameter>,
}

impl Molecule {
    pub fn new(definition: Definition, treatment: Treatment) -> Molecule {
        let mut built = Built { parts: Vec::new(), described: Vec::new() };
        built.motion(&definition, &treatment);
        built.electrons(&definition);
        let (per, text) = (definition.substance.species.entity, definition.substance.id().to_owned());
        let terms = Terms::new(vec![Term::of_tables(definition.substance.clone(), 1.0)], per, text);
        let gas = Gas { molar_mass_kg_mol: definition.mass.value, parts: built.parts };
        Molecule { definition, treatment, gas, described: built.described, terms }
    }

    pub(super) fn made_by(&mut self, call: &Rc<Call>) {
        self.terms.made_by(call);
    }

    /// The same molecule taken in another way.
    #[must_use]
    pub fn taken(&self, treatment: Treatment) -> Molecule {
        Molecule::new(self.definition.clone(), treatment)
    }

    pub fn definition(&self) -> &Definition {
        &self.definition
    }

    pub fn treatment(&self) -> &Treatment {
        &self.treatment
    }

    pub fn gas(&self) -> &Gas {
        &self.gas
    }

    /// Name of each part of the gas.
    pub fn names(&self) -> impl Iterator<Item = &str> {
        self.described.iter().map(|described| described.name.as_str())
    }

    /// The source of each part's constants, where it is a published one.
    pub(super) fn citations(&self) -> impl Iterator<Item = Option<&Citation>> {
        self.described.iter().map(|described| described.parameters.iter().find_map(Parameter::citation))
    }

    /// The molecule as a sum of species, for conditions and headings.
    pub fn terms(&self) -> &Terms {
        &self.terms
    }

    pub fn text(&self) -> &str {
        self.terms.text()
    }

    pub fn entity(&self) -> Entity {
        self.terms.per()
    }

    /// Each input with the derivatives of the sum of all shares at `t_k` with respect to it, per SI unit.
    fn derivatives(&self, t_k: f64) -> Vec<(Rc<Node>, Change)> {
        let mass = &self.definition.mass;
        let mut all = weighted(mass, translation::change(mass.value));
        for (part, described) in self.gas.parts.iter().zip(&self.described) {
            for (parameter, change) in described.parameters.iter().zip(part.changes(t_k)) {
                all.extend(weighted(parameter, change));
            }
        }
        all
    }
}

fn weighted(parameter: &Parameter, change: Change) -> Vec<(Rc<Node>, Change)> {
    parameter.inputs.iter().map(|(node, by)| (Rc::clone(node), *by * change)).collect()
}

/// Parts being gathered.
struct Built {
    parts: Vec<Part>,
    described: Vec<Described>,
}

impl Built {
    fn add(&mut self, part: Part, name: impl Into<String>, parameters: Vec<Parameter>) {
        self.parts.push(part);
        self.described.push(Described { name: name.into(), parameters });
    }

    fn motion(&mut self, definition: &Definition, treatment: &Treatment) {
        match &definition.motion {
            Motion::Atom => {}
            Motion::Diatomic { constants, spins } if treatment.vibration == VibrationAs::Levels => {
                let [we, wexe, be, alpha_e] = [0, 1, 2, 3].map(|at| constants[at].value);
                let de = constants.get(4).map(|de| de.value);
                let diatomic = Diatomic::new(Constants { we, wexe, be, alpha_e, de }, treatment.spins(*spins));
                self.add(Part::Diatomic(diatomic), "rotation and vibration", constants.clone());
            }
            Motion::Diatomic { constants, .. } => {
                // The fundamental and the constant of the lowest level, which is what a harmonic, rigid molecule would show.
                let [we, wexe, be, alpha_e] = [0, 1, 2, 3].map(|at| &constants[at]);
                let fundamental = we.plus(-2.0, wexe, &we.name);
                let lowest = be.plus(-0.5, alpha_e, &be.name);
                self.rotation(&[lowest], definition.symmetry_number, treatment.rotation_of(true));
                self.vibration(&fundamental, 1.0, treatment);
            }
            Motion::Polyatomic { top, vibrations, torsions } => {
                self.rotation(top, definition.symmetry_number, treatment.rotation_of(top.len() == 1));
                if let Some(rho) = definition.distortion.as_ref().filter(|_| treatment.stretched) {
                    let part = Part::Stretching { rho_per_k: rho.value };
                    self.add(part, stretching::NAME, vec![rho.clone()]);
                }
                for (wavenumber, degeneracy) in vibrations {
                    let scaled = definition.scale.as_ref().map_or_else(|| wavenumber.clone(), |s| wavenumber.times(s));
                    self.vibration(&scaled, *degeneracy, treatment);
                }
                for torsion in torsions {
                    let free = treatment.torsion == TorsionAs::Free || !torsion.has_barrier();
                    let solved = torsion.torsion();
                    let part = if free { Rc::new(solved.free()) } else { Rc::clone(solved) };
                    let parameters = [std::slice::from_ref(&torsion.f), &torsion.cosines, &torsion.sines].concat();
                    let kind = if free { "free torsion" } else { "torsion" };
                    let name = format!("{kind}, F = {}", parameter::per_cm(torsion.f.value));
                    self.add(equipartition(Part::Torsion(part), treatment), name, parameters);
                }
            }
        }
    }

    fn rotation(&mut self, constants: &[Parameter], symmetry_number: f64, sum: Sum) {
        let top = match constants {
            [a, b, c] => Top::Nonlinear { abc_k: [a.value, b.value, c.value] },
            _ => Top::Linear { b_k: constants[0].value },
        };
        self.add(Part::Rotation { top, symmetry_number, sum }, "rotation", constants.to_vec());
    }

    fn vibration(&mut self, wavenumber: &Parameter, degeneracy: f64, treatment: &Treatment) {
        let low = treatment.low(wavenumber.value);
        let part = Part::Vibration { theta_k: wavenumber.value, degeneracy, low };
        let taken = match low {
            LowModes::Raised { cut_off_k } if wavenumber.value < cut_off_k => ", raised",
            LowModes::Blended { .. } => ", blended",
            _ => "",
        };
        let times = if degeneracy == 1.0 { String::new() } else { format!(", {degeneracy} times") };
        let name = format!("vibration {}{times}{taken}", parameter::per_cm(wavenumber.value));
        self.add(equipartition(part, treatment), name, vec![wavenumber.clone()]);
    }

    fn electrons(&mut self, definition: &Definition) {
        let levels = &definition.electronic;
        if levels.iter().map(|(_, g)| g).sum::<f64>() == 1.0 {
            return;
        }
        let part = levels.iter().map(|(energy, g)| Level { e_k: energy.value, g: *g }).collect();
        let parameters = levels.iter().skip(1).map(|(energy, _)| energy.clone()).collect();
        self.add(Part::Electronic(part), "electronic levels", parameters);
    }
}

fn equipartition(part: Part, treatment: &Treatment) -> Part {
    if treatment.vibration == VibrationAs::Equipartition { Part::Equipartition(Box::new(part)) } else { part }
}
