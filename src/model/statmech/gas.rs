//! A gas molecule as the sum of its parts, ready to be asked at any temperature.
//!
//! Cp = R (1 + Σ Cv/R)     H(T) − H(0) = RT (1 + Σ U/RT)     S° = R Σ S/R       the sums over all parts
//!
//! [`Gas`] holds numbers alone; which record or typed value each came from is the molecule's affair. The surprise:
//! harmonic vibrations stand in a list of their own, since a sweep over temperatures spends its time there.
//! Source: any text of statistical mechanics, such as J. E. Mayer, M. G. Mayer (1940), chapters 7 to 9 (from memory).

use std::rc::Rc;

use crate::model::statmech::diatomic::Diatomic;
use crate::model::statmech::hindered::Torsion;
use crate::model::statmech::levels::{self, Level};
use crate::model::statmech::rotation::{Sum, Top};
use crate::model::statmech::vibration::{self, LowModes};
use crate::model::statmech::{Change, Share, translation};
use crate::num::math;
use crate::units::constants::ConstantSet;

/// Where a heat capacity that is held at its limit starts from true values: what an analyst has from a table.
const JOINED_AT_K: f64 = 298.15;

/// One independent part of a molecule.
#[derive(Clone, Debug)]
pub enum Part {
    Rotation {
        top: Top,
        symmetry_number: f64,
        sum: Sum,
    },
    /// `degeneracy` oscillators of one wavenumber.
    Vibration {
        theta_k: f64,
        degeneracy: f64,
        low: LowModes,
    },
    Torsion(Rc<Torsion>),
    /// Vibration and rotation of a diatomic molecule together.
    Diatomic(Diatomic),
    /// Energies over k in kelvin from the lowest, with degeneracies.
    Electronic(Vec<Level>),
    /// A part whose Cv is held at its classical limit, joined at 298.15 K to its true U and S: equipartition.
    Equipartition(Box<Part>),
}

impl Part {
    pub fn share(&self, t_k: f64) -> Share {
        match self {
            Part::Rotation { top, symmetry_number, sum } => top.share(*symmetry_number, *sum, t_k),
            Part::Vibration { theta_k, degeneracy, low } => *degeneracy * vibration::share(*theta_k, *low, t_k),
            Part::Torsion(torsion) => torsion.share(t_k),
            Part::Diatomic(diatomic) => diatomic.share(t_k),
            Part::Electronic(levels) => levels::share(levels.iter().copied(), t_k),
            Part::Equipartition(part) => {
                let (limit, at_0) = (part.limit(), part.share(JOINED_AT_K));
                let u = (at_0.u * JOINED_AT_K + limit * (t_k - JOINED_AT_K)) / t_k;
                Share { cv: limit, u, s: at_0.s + limit * math::ln(t_k / JOINED_AT_K), bend: 0.0 }
            }
        }
    }

    /// Whether it is one or several oscillators, in whichever way they are taken.
    pub fn is_vibration(&self) -> bool {
        match self {
            Part::Vibration { .. } => true,
            Part::Equipartition(part) => part.is_vibration(),
            _ => false,
        }
    }

    /// Cv/R where kT is far above the spacing of the levels. That of electronic levels is 0: there are few of them.
    pub fn limit(&self) -> f64 {
        match self {
            Part::Rotation { top, .. } => top.limit(),
            Part::Vibration { degeneracy, .. } => *degeneracy,
            Part::Torsion(_) => 0.5,
            Part::Diatomic(_) => Diatomic::LIMIT,
            Part::Electronic(_) => 0.0,
            Part::Equipartition(part) => part.limit(),
        }
    }

    /// Derivatives with respect to each parameter, per kelvin: the rotational constants; the wavenumber; F, Vₖ, Wₖ; ωe, ωexe,
    /// Be, αe (and De); the energies of the levels above the lowest.
    pub fn changes(&self, t_k: f64) -> Vec<Change> {
        match self {
            Part::Rotation { top, sum, .. } => top.changes(*sum, t_k),
            Part::Vibration { theta_k, degeneracy, low } => vec![*degeneracy * vibration::change(*theta_k, *low, t_k)],
            Part::Torsion(torsion) => torsion.changes(t_k),
            Part::Diatomic(diatomic) => diatomic.changes(t_k),
            Part::Electronic(all) => {
                let count = all.len().saturating_sub(1);
                let slope = |nth: usize| (0..count).map(|k| if k + 1 == nth { 1.0 } else { 0.0 }).collect::<Vec<f64>>();
                let slopes: Vec<Vec<f64>> = (0..all.len()).map(slope).collect();
                levels::changes_of(all.iter().copied().zip(slopes.iter().map(Vec::as_slice)), count, t_k)
            }
            Part::Equipartition(part) => {
                let scaled = |change: &Change| Change { cv: 0.0, u: change.u * JOINED_AT_K / t_k, s: change.s };
                part.changes(JOINED_AT_K).iter().map(scaled).collect()
            }
        }
    }

    /// Cv/R alone, which sweeps and fits ask for.
    fn cv(&self, t_k: f64) -> f64 {
        match self {
            Part::Rotation { sum: Sum::Classical, top, .. } => top.limit(),
            Part::Vibration { theta_k, degeneracy, low: LowModes::Harmonic } => {
                degeneracy * vibration::oscillator_cv(theta_k / t_k)
            }
            _ => self.share(t_k).cv,
        }
    }
}

/// A molecule in the gas.
#[derive(Clone, Debug)]
pub struct Gas {
    pub molar_mass_kg_mol: f64,
    pub parts: Vec<Part>,
}

/// Cp, H(T) − H(0) and S° at one temperature, in J/(mol K), J/mol and J/(mol K), and dCp/dT in J/(mol K²).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Functions {
    pub cp: f64,
    pub h: f64,
    pub s: f64,
    pub cp_slope: f64,
}

impl Gas {
    /// The sum of all parts, translation included, at p° and `t_k`.
    pub fn share(&self, t_k: f64, constants: &ConstantSet) -> Share {
        let mut sum = translation::share(self.molar_mass_kg_mol, t_k, constants);
        self.parts.iter().for_each(|part| sum += part.share(t_k));
        sum
    }

    /// Cp, H and S at `t_k`.
    pub fn functions(&self, t_k: f64, constants: &ConstantSet) -> Functions {
        let (share, r) = (self.share(t_k, constants), constants.molar_gas.value);
        Functions {
            cp: r * (share.cv + 1.0),
            h: r * t_k * (share.u + 1.0),
            s: r * share.s,
            cp_slope: r * share.bend / t_k,
        }
    }

    /// Cp/R at `t_k`.
    pub fn cp(&self, t_k: f64) -> f64 {
        2.5 + self.parts.iter().map(|part| part.cv(t_k)).sum::<f64>()
    }

    /// Cp/R at each of some temperatures.
    pub fn cps(&self, t_k: &[f64]) -> Vec<f64> {
        let mut out = vec![2.5; t_k.len()];
        let inverse: Vec<f64> = t_k.iter().map(|t| 1.0 / t).collect();
        for part in &self.parts {
            match part {
                Part::Vibration { theta_k, degeneracy, low: LowModes::Harmonic } => {
                    vibration::add_oscillators(*theta_k, *degeneracy, &inverse, &mut out);
                }
                _ => out.iter_mut().zip(t_k).for_each(|(out, t)| *out += part.cv(*t)),
            }
        }
        out
    }

    /// Cp/R where every part has reached its classical limit.
    pub fn classical_limit(&self) -> f64 {
        2.5 + self.parts.iter().map(Part::limit).sum::<f64>()
    }
}
