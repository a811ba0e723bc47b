//! What is known of one molecule, before it is decided how to take it.

use std::cell::OnceCell;
use std::rc::Rc;
use std::sync::Arc;

use crate::chem::composition::Composition;
use crate::chem::species::{Phase, Species, State};
use crate::data::pressure::Constants;
use crate::data::substance::Substance;
use crate::model::molecule::parameter::Parameter;
use crate::model::statmech::diatomic::Spins;
use crate::model::statmech::hindered::{Potential, Torsion};
use crate::quantity::Quantity;
use crate::units::Entity;

/// The constants of a molecule, with their inputs.
#[derive(Clone)]
pub struct Definition {
    /// The species: on record, or made up of name and formula.
    pub substance: Arc<Substance>,
    pub mass: Parameter,
    pub motion: Motion,
    /// Energies above the lowest level and degeneracies; the lowest is 0.
    pub electronic: Vec<(Parameter, f64)>,
    pub symmetry_number: f64,
    /// Whether someone gave it, or a point group; else it is a 1 of convenience.
    pub symmetry_given: bool,
    /// The symmetry number of the point group, with its symbol.
    pub by_group: Option<(Arc<str>, f64)>,
    /// ρ of `stretching.rs`, 1/K, where distortion constants were given.
    pub distortion: Option<Parameter>,
    /// Whether δ_J and δ_K of a top with no two rotational constants alike are not in it.
    pub lacks_delta: bool,
    /// Factor on all wavenumbers of vibrations, for the thermal functions.
    pub scale: Option<Parameter>,
    /// Factor for the zero-point energy.
    pub scale_zero_point: Option<Parameter>,
    pub formation: Option<GivenFormation>,
    /// Total electronic energy, per particle or per mole.
    pub energy: Option<Quantity>,
}

/// What moves besides the electrons.
#[derive(Clone)]
pub enum Motion {
    Atom,
    /// ωe, ωexe, Be, αe, and De where it is given.
    Diatomic {
        constants: Vec<Parameter>,
        spins: Spins,
    },
    Polyatomic {
        /// One constant of a linear molecule, else three.
        top: Vec<Parameter>,
        vibrations: Vec<(Parameter, f64)>,
        torsions: Vec<GivenTorsion>,
    },
}

/// A torsion as given.
#[derive(Clone)]
pub struct GivenTorsion {
    pub f: Parameter,
    pub cosines: Vec<Parameter>,
    pub sines: Vec<Parameter>,
    pub symmetry_number: f64,
    /// Solved at first need, once for all treatments of the molecule.
    pub solved: Rc<OnceCell<Rc<Torsion>>>,
}

impl GivenTorsion {
    /// Whether a potential was given at all.
    pub fn has_barrier(&self) -> bool {
        self.cosines.iter().chain(&self.sines).any(|v| v.value != 0.0)
    }

    /// The torsion with its levels.
    pub fn torsion(&self) -> &Rc<Torsion> {
        self.solved.get_or_init(|| {
            let values = |all: &[Parameter]| all.iter().map(|one| one.value).collect::<Vec<f64>>();
            let potential =
                Potential { f_k: self.f.value, cosines_k: values(&self.cosines), sines_k: values(&self.sines) };
            Rc::new(Torsion::new(potential, self.symmetry_number))
        })
    }
}

/// A formation enthalpy as given, and the temperature it belongs to.
#[derive(Clone)]
pub struct GivenFormation {
    pub value: Quantity,
    pub at_zero: bool,
}

/// A phase that no table knows, made up of its name and formula.
pub fn made_up(base: &str, composition: &Composition, charge: i32, state: State) -> Substance {
    let phase = Phase::of(state);
    Substance {
        species: Species {
            id: format!("{base}({})", state.symbol()).into(),
            entity: Entity::named(base),
            composition: composition.clone(),
            charge,
            phase,
        },
        name: None,
        cas: None,
        function: None,
        pressure: Constants::default(),
        formations: Vec::new(),
    }
}

impl Definition {
    /// ½ Σ g θ of the vibrations with the factor for the zero point, in kelvin, with its inputs; for a diatomic molecule
    /// ½ωe − ¼ωexe.
    pub fn zero_point(&self) -> Parameter {
        let name = "zero-point energy";
        let mut sum = Parameter::exact(name, 0.0);
        match &self.motion {
            Motion::Atom => {}
            Motion::Diatomic { constants, .. } => {
                sum = sum.plus(0.5, &constants[0], name).plus(-0.25, &constants[1], name);
            }
            Motion::Polyatomic { vibrations, .. } => {
                for (wavenumber, degeneracy) in vibrations {
                    sum = sum.plus(0.5 * degeneracy, wavenumber, name);
                }
                if let Some(scale) = self.scale_zero_point.as_ref().or(self.scale.as_ref()) {
                    sum = sum.times(scale);
                }
            }
        }
        sum
    }
}
