//! A parameter of a molecule as a temperature, with the inputs it came from.
//!
//! Wavenumbers, frequencies, energies per particle or per mole and moments of inertia all become θ in kelvin: hcν/k, hf/k,
//! E/k, E/R and h²/(8π²kI). Source: definitions; IUPAC Green Book, 3rd ed., section 2.6 (from memory).

use std::f64::consts::PI;
use std::rc::Rc;

use smallvec::SmallVec;

use crate::quantity::{Quantity, round};
use crate::record::node::Node;
use crate::source::Citation;
use crate::units::constants::{self, ConstantSet};
use crate::units::{Base, Dimension, Entity};

/// A number with the inputs it rests on: kelvin for energies, kg/mol for a molar mass, 1 for a scale factor.
#[derive(Clone)]
pub struct Parameter {
    pub name: String,
    pub value: f64,
    /// Each with the derivative of `value` with respect to it, per SI unit.
    pub inputs: SmallVec<[(Rc<Node>, f64); 2]>,
}

/// What may stand for an energy, as the exponents of length, mass, time and the like tell.
enum Sort {
    Wavenumber,
    Frequency,
    Energy,
    MolarEnergy,
    Moment,
}

fn sort(dim: &Dimension) -> Option<Sort> {
    let energy = Dimension::whole([2, 1, -2, 0, 0, 0]);
    let plain = dim.without_basis();
    let molar = *dim != plain;
    if plain == energy {
        return Some(if molar { Sort::MolarEnergy } else { Sort::Energy });
    }
    if molar {
        return None;
    }
    [
        (Dimension::whole([-1, 0, 0, 0, 0, 0]), Sort::Wavenumber),
        (Dimension::whole([0, 0, -1, 0, 0, 0]), Sort::Frequency),
        (Dimension::whole([2, 1, 0, 0, 0, 0]), Sort::Moment),
    ]
    .into_iter()
    .find(|(known, _)| known == dim)
    .map(|(_, sort)| sort)
}

impl Parameter {
    /// An exact number, such as a lowest level of 0.
    pub fn exact(name: &str, value: f64) -> Parameter {
        Parameter { name: name.to_owned(), value, inputs: SmallVec::new() }
    }

    /// A value as it is, in SI units.
    pub fn of(name: &str, quantity: &Quantity) -> Parameter {
        let inputs = SmallVec::from_iter([(Rc::clone(quantity.node()), 1.0)]);
        Parameter { name: name.to_owned(), value: quantity.si(), inputs }
    }

    /// θ of a wavenumber, a frequency, an energy or a moment of inertia; `None` for what is none of these.
    pub fn theta(name: &str, quantity: &Quantity, set: &ConstantSet) -> Option<Parameter> {
        let (k, h) = (set.boltzmann.value, set.planck.value);
        let si = quantity.si();
        let (value, by) = match sort(quantity.dim())? {
            Sort::Wavenumber => (set.second_radiation.value * si, set.second_radiation.value),
            Sort::Frequency => (h / k * si, h / k),
            Sort::Energy => (si / k, 1.0 / k),
            Sort::MolarEnergy => (si / set.molar_gas.value, 1.0 / set.molar_gas.value),
            Sort::Moment => {
                let theta = h / (8.0 * PI * PI * k) * (h / si);
                (theta, -theta / si)
            }
        };
        let inputs = SmallVec::from_iter([(Rc::clone(quantity.node()), by)]);
        Some(Parameter { name: name.to_owned(), value, inputs })
    }

    /// Where it was printed, if it was.
    pub fn citation(&self) -> Option<&Citation> {
        self.inputs.iter().find_map(|(node, _)| node.input()?.citation.as_ref())
    }

    /// This times a factor that has inputs of its own.
    pub fn times(&self, factor: &Parameter) -> Parameter {
        let own = self.inputs.iter().map(|(node, by)| (Rc::clone(node), by * factor.value));
        let others = factor.inputs.iter().map(|(node, by)| (Rc::clone(node), by * self.value));
        Parameter { name: self.name.clone(), value: self.value * factor.value, inputs: own.chain(others).collect() }
    }

    /// This plus `times` another.
    pub fn plus(&self, times: f64, other: &Parameter, name: &str) -> Parameter {
        let others = other.inputs.iter().map(|(node, by)| (Rc::clone(node), times * by));
        let inputs = self.inputs.iter().cloned().chain(others).collect();
        Parameter { name: name.to_owned(), value: self.value + times * other.value, inputs }
    }
}

/// A temperature of a wavenumber as the wavenumber, for people: `667 cm⁻¹`.
pub fn per_cm(theta_k: f64) -> String {
    let per_cm = theta_k / (100.0 * constants::current().second_radiation.value);
    format!("{} cm⁻¹", round::shortest(round::significant(per_cm, 6).parse().unwrap_or(per_cm)))
}

/// θ of so many cm⁻¹.
pub fn theta_of_per_cm(per_cm: f64, set: &ConstantSet) -> f64 {
    100.0 * per_cm * set.second_radiation.value
}

/// The dimension of a wavenumber, and of a molar mass of nothing in particular.
pub fn wavenumber() -> Dimension {
    Dimension::whole([-1, 0, 0, 0, 0, 0])
}

/// Molar energy over temperature of an entity.
pub fn molar_capacity(per: Entity) -> Dimension {
    Dimension::whole([2, 1, -2, 0, 0, 0]).over(&Dimension::amount(per)).over(&Dimension::base(Base::Kelvin))
}
