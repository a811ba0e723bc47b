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
use crate::num::{math, oscillator};
use crate::units::constants::ConstantSet;

/// Where a heat capacity that is held at its limit starts from true values: what an analyst has from a table.
const JOINED_AT_K: f64 = 298.15;

/// Temperatures that are worked on together.
const BLOCK: usize = 512;

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
    /// What rotation adds by stretching the molecule: ln q grows by ρT (`molecule/stretching.rs`).
    Stretching {
        rho_per_k: f64,
    },
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
            Part::Stretching { rho_per_k } => {
                let a = rho_per_k * t_k;
                Share { cv: 2.0 * a, u: a, s: 2.0 * a, bend: 2.0 * a }
            }
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
            Part::Stretching { .. } => 0.0,
            Part::Diatomic(_) => Diatomic::LIMIT,
            Part::Electronic(_) => 0.0,
            Part::Equipartition(part) => part.limit(),
        }
    }

    /// Derivatives with respect to each parameter, per kelvin: the rotational constants; the wavenumber; F, Vₖ, Wₖ; ρ, per
    /// 1/K; ωe, ωexe, Be, αe (and De); the energies of the levels above the lowest.
    pub fn changes(&self, t_k: f64) -> Vec<Change> {
        match self {
            Part::Rotation { top, sum, .. } => top.changes(*sum, t_k),
            Part::Vibration { theta_k, degeneracy, low } => vec![*degeneracy * vibration::change(*theta_k, *low, t_k)],
            Part::Torsion(torsion) => torsion.changes(t_k),
            Part::Stretching { .. } => vec![Change { cv: 2.0 * t_k, u: t_k, s: 2.0 * t_k }],
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
                degeneracy * oscillator::cv(theta_k * (1.0 / t_k))
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
        self.parts.iter().fold(translation::CV, |sum, part| sum + part.cv(t_k)) + 1.0
    }

    /// Cp/R at each of some temperatures: what [`Gas::cp`] gives, bit for bit, since both add in one order.
    pub fn cps(&self, t_k: &[f64]) -> Vec<f64> {
        let mut out = self.cvs(t_k);
        out.iter_mut().for_each(|out| *out += 1.0);
        out
    }

    /// Cv/R at each of some temperatures, block by block, so that what is worked on stays in the fastest memory.
    pub fn cvs(&self, t_k: &[f64]) -> Vec<f64> {
        let mut all = vec![translation::CV; t_k.len()];
        let mut inverse = [0.0; BLOCK];
        for (t_k, out) in t_k.chunks(BLOCK).zip(all.chunks_mut(BLOCK)) {
            for (inverse, t) in inverse.iter_mut().zip(t_k) {
                *inverse = 1.0 / t;
            }
            for part in &self.parts {
                match part {
                    Part::Vibration { theta_k, degeneracy, low: LowModes::Harmonic } => {
                        oscillator::add(*theta_k, *degeneracy, &inverse[..t_k.len()], out);
                    }
                    _ => out.iter_mut().zip(t_k).for_each(|(out, t)| *out += part.cv(*t)),
                }
            }
        }
        all
    }

    /// Cp/R where every part has reached its classical limit.
    pub fn classical_limit(&self) -> f64 {
        translation::CV + 1.0 + self.parts.iter().map(Part::limit).sum::<f64>()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::constants;

    #[test]
    fn a_sweep_has_the_bits_of_the_single_calls() {
        let mode = |theta_k, low| Part::Vibration { theta_k, degeneracy: 2.0, low };
        let rotation = |sum| Part::Rotation { top: Top::Linear { b_k: 2.8 }, symmetry_number: 2.0, sum };
        let gas = Gas {
            molar_mass_kg_mol: 0.044,
            parts: vec![
                rotation(Sum::Levels),
                mode(960.0, LowModes::Harmonic),
                mode(90.0, LowModes::Raised { cut_off_k: 143.9 }),
                mode(70.0, LowModes::Blended { middle_k: 143.9, average_k: 4.03 }),
                mode(3380.0, LowModes::Harmonic),
                Part::Equipartition(Box::new(mode(3380.0, LowModes::Harmonic))),
                Part::Electronic(vec![Level { e_k: 0.0, g: 2.0 }, Level { e_k: 174.0, g: 2.0 }]),
            ],
        };
        let (set, t_k) = (constants::current(), (0..1500).map(|nth| 1.0 + 3.7 * f64::from(nth)).collect::<Vec<f64>>());
        for (swept, t_k) in gas.cps(&t_k).iter().zip(&t_k) {
            assert_eq!(swept.to_bits(), gas.cp(*t_k).to_bits(), "{t_k} K");
            let together = gas.share(*t_k, set).cv + 1.0;
            assert_eq!(swept.to_bits(), together.to_bits(), "{t_k} K, with H and S");
        }
    }
}
