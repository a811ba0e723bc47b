//! Translation of an ideal gas, after Sackur and Tetrode.
//!
//! S/R = 5/2 + ln[(2π m kT/h²)^(3/2) kT/p°] with the 5/2 that belongs to constant pressure; Cv/R = 3/2
//!
//! | symbol | unit   | meaning                                |
//! |--------|--------|----------------------------------------|
//! | m      | kg     | mass of one molecule, M/N_A            |
//! | k, h   | J/K, J s | Boltzmann and Planck constant        |
//! | p°     | Pa     | standard pressure, 1 bar               |
//!
//! Assumes an ideal gas without quantum degeneracy (the mean distance of molecules far above their thermal wavelength).
//! Source: O. Sackur, Ann. Phys. 36, 958 (1911); H. Tetrode, Ann. Phys. 38, 434 (1912); from memory.

use std::f64::consts::PI;

use crate::model::statmech::{Change, Share};
use crate::num::math;
use crate::units::constants::{ConstantSet, STANDARD_PRESSURE};

/// Cv/R
pub const CV: f64 = 1.5;

/// The share of translation at `t_k` and p°, for a molar mass in kg/mol.
pub fn share(molar_mass_kg_mol: f64, t_k: f64, constants: &ConstantSet) -> Share {
    let (k, h) = (constants.boltzmann.value, constants.planck.value);
    let mass_kg = molar_mass_kg_mol / constants.avogadro.value;
    let kt = k * t_k;
    // Wavelengths first: the cube of h is out of the range in which doubles are exact to the last digit.
    let per_metre = math::sqrt(2.0 * PI * mass_kg * kt) / h;
    let s = 2.5 + 3.0 * math::ln(per_metre) + math::ln(kt / STANDARD_PRESSURE.value);
    Share { cv: CV, u: 1.5, s, bend: 0.0 }
}

/// Derivative with respect to the molar mass, per kg/mol.
pub fn change(molar_mass_kg_mol: f64) -> Change {
    Change { cv: 0.0, u: 0.0, s: 1.5 / molar_mass_kg_mol }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::constants;

    #[test]
    fn entropy_of_argon_is_that_of_codata() {
        // CODATA Key Values for Thermodynamics (1989), table at the CODATA site: S°(Ar, 298.15 K) = 154.846 ± 0.003
        // J/(mol K). Bound: half a unit of the last digit.
        let r = constants::current().molar_gas.value;
        let s = r * share(0.039948, 298.15, constants::current()).s;
        assert!((s - 154.846).abs() < 0.0005, "{s}");
    }

    #[test]
    fn the_sackur_tetrode_constant_is_that_of_codata() {
        // CODATA 2018 and 2022, Sackur-Tetrode constant at 1 K, 100 kPa, for one atomic mass unit: -1.151 707 534 96(47)
        // (2022; from memory) in units of R. Bound: its u.
        let set = constants::current();
        let s = share(set.atomic_mass.value * set.avogadro.value, 1.0, set).s;
        assert!((s + 1.151_707_534_96).abs() < 4.7e-10, "{s}");
    }
}
