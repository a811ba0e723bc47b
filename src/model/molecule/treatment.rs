//! How a molecule's motions are taken: exact where it can be, or by an approximation that is then priced.
//!
//! [`Treatment`] is read from the words of the options below; [`Treatment::default`] is the best there is for each kind of
//! molecule, short of a sum over the levels of a nonlinear top, which differs by less than 1e-4 R at room temperature.

use crate::model::card::{Arg, Default as Given, Takes};
use crate::model::molecule::parameter::theta_of_per_cm;
use crate::model::statmech::diatomic::Spins;
use crate::model::statmech::rotation::Sum;
use crate::model::statmech::vibration::LowModes;
use crate::units::constants;

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum VibrationAs {
    /// Diatomics by the sum over all levels, others as harmonic oscillators.
    Levels,
    Harmonic,
    /// Every vibration and torsion at its classical limit.
    Equipartition,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TorsionAs {
    Hindered,
    Free,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LowAs {
    Harmonic,
    /// Raised to the cut-off, after Truhlar and co-workers.
    Raised,
    /// Blended with a free rotor, after Grimme.
    Blended,
}

/// How each motion is taken.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Treatment {
    pub vibration: VibrationAs,
    /// `None`: level by level for linear molecules, classical for others.
    pub rotation: Option<Sum>,
    pub torsion: TorsionAs,
    pub low: LowAs,
    /// Cut-off or middle of the blend, as a temperature.
    pub cut_off_k: f64,
    /// Whether rotation stretches the molecule, where distortion constants were given.
    pub stretched: bool,
    /// Whether the two forms of like nuclei keep the proportion of high temperature.
    pub frozen: bool,
}

/// 100 cm⁻¹, of both published treatments of low modes.
pub const CUT_OFF_PER_CM: f64 = 100.0;
/// h/(8π²c) of Grimme's average moment of 1e-44 kg m², in kelvin over k: h²/(8π² k 1e-44).
fn average_k() -> f64 {
    let set = constants::current();
    let (h, k) = (set.planck.value, set.boltzmann.value);
    h / (8.0 * std::f64::consts::PI * std::f64::consts::PI * k) * (h / 1e-44)
}

impl Default for Treatment {
    fn default() -> Self {
        Treatment {
            vibration: VibrationAs::Levels,
            rotation: None,
            torsion: TorsionAs::Hindered,
            low: LowAs::Harmonic,
            cut_off_k: theta_of_per_cm(CUT_OFF_PER_CM, constants::current()),
            stretched: true,
            frozen: false,
        }
    }
}

/// Options by which a treatment is chosen, beside the cut-off, which is a wavenumber.
pub const OPTIONS: &[Arg] = &[
    Arg {
        name: "vibration",
        takes: Takes::Word(&["levels", "harmonic", "equipartition"]),
        default: Given::Absent,
        doc: "diatomics by all their levels, or every vibration harmonic, or at its classical limit",
    },
    Arg {
        name: "rotation",
        takes: Takes::Word(&["levels", "classical"]),
        default: Given::Absent,
        doc: "sum over levels, or the classical formula",
    },
    Arg {
        name: "stretching",
        takes: Takes::Word(&["given", "rigid"]),
        default: Given::Absent,
        doc: "rotation stretches the molecule by the distortion constants that were given, or it is rigid",
    },
    Arg {
        name: "torsion",
        takes: Takes::Word(&["hindered", "free"]),
        default: Given::Absent,
        doc: "internal rotation in its potential, or free",
    },
    Arg {
        name: "low_modes",
        takes: Takes::Word(&["harmonic", "truhlar", "grimme"]),
        default: Given::Absent,
        doc: "vibrations of low wavenumber as all others, raised to the cut-off, or blended with a free rotor",
    },
    Arg {
        name: "nuclear_spin",
        takes: Takes::Word(&["equilibrium", "frozen"]),
        default: Given::Absent,
        doc: "forms of like nuclei in equilibrium, or in the proportion of high temperature",
    },
    Arg {
        name: "cut_off",
        takes: Takes::Any,
        default: Given::Absent,
        doc: "wavenumber of the cut-off or the middle of the blend; 100 cm^-1 unless given",
    },
];

impl Treatment {
    /// This with one of [`OPTIONS`] set to one of its words; `false` where it has no such word.
    pub fn set(&mut self, option: &str, word: &str) -> bool {
        match (option, word) {
            ("vibration", "levels") => self.vibration = VibrationAs::Levels,
            ("vibration", "harmonic") => self.vibration = VibrationAs::Harmonic,
            ("vibration", "equipartition") => self.vibration = VibrationAs::Equipartition,
            ("rotation", "levels") => self.rotation = Some(Sum::Levels),
            ("rotation", "classical") => self.rotation = Some(Sum::Classical),
            ("stretching", "given") => self.stretched = true,
            ("stretching", "rigid") => self.stretched = false,
            ("torsion", "hindered") => self.torsion = TorsionAs::Hindered,
            ("torsion", "free") => self.torsion = TorsionAs::Free,
            ("low_modes", "harmonic") => self.low = LowAs::Harmonic,
            ("low_modes", "truhlar") => self.low = LowAs::Raised,
            ("low_modes", "grimme") => self.low = LowAs::Blended,
            ("nuclear_spin", "equilibrium") => self.frozen = false,
            ("nuclear_spin", "frozen") => self.frozen = true,
            _ => return false,
        }
        true
    }

    pub(super) fn rotation_of(&self, linear: bool) -> Sum {
        self.rotation.unwrap_or(if linear { Sum::Levels } else { Sum::Classical })
    }

    /// How a vibration of this temperature is taken.
    pub(super) fn low(&self, theta_k: f64) -> LowModes {
        match self.low {
            LowAs::Harmonic => LowModes::Harmonic,
            LowAs::Raised if theta_k >= self.cut_off_k => LowModes::Harmonic,
            LowAs::Raised => LowModes::Raised { cut_off_k: self.cut_off_k },
            LowAs::Blended => LowModes::Blended { middle_k: self.cut_off_k, average_k: average_k() },
        }
    }

    /// How the forms of like nuclei are taken, given what their nuclei are.
    pub(super) fn spins(&self, spins: Spins) -> Spins {
        match spins {
            Spins::Equilibrium { even, odd } if self.frozen => Spins::Frozen { even, odd },
            other => other,
        }
    }
}
