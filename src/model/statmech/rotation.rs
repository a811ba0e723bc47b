//! Rotation of a rigid molecule: the classical formula, the sum over levels, and the expansion that joins them.
//!
//! linear: q = T/(σθ) classically, (1/σ) Σ (2J + 1) exp(−J(J + 1) θ/T) in full
//! nonlinear: q = √(π T³/(θ_A θ_B θ_C))/σ classically; in full the sum over the levels of the rigid top
//!
//! | symbol  | unit | meaning                                                                  |
//! |---------|------|--------------------------------------------------------------------------|
//! | θ       | K    | hcB/k of a rotational constant                                           |
//! | σ       | 1    | symmetry number                                                          |
//!
//! At high temperature ln q = ln q(classical) + y/3 + y²/90 + 8y³/2835 + 59y⁴/56700 + … of a linear molecule, y = θ/T, which
//! is used below y = 1/30, where the next term is under 1e-10. For nonlinear ones the first term,
//! (2A + 2B + 2C − BC/A − CA/B − AB/C)/12T, moves U alone; it is used above 40 θ, where the next is below 2e-5 in ln q. The
//! symmetry number stands for the nuclear spins, so that levels are not thinned out one by one; where that fails, at a few
//! kelvin and for H2, see `diatomic.rs`. Centrifugal stretching is neglected (`rigid-rotor`).
//! Source: H. P. Mulholland, Proc. Camb. Phil. Soc. 24, 280 (1928); C. C. Stripp, J. G. Kirkwood, J. Chem. Phys. 19,
//! 1131 (1951); levels of the asymmetric top: S. C. Wang, Phys. Rev. 34, 243 (1929); all from memory. The coefficients of
//! the linear expansion are those of the logarithm of Mulholland's series.

use std::f64::consts::PI;

use nalgebra::{DMatrix, SymmetricEigen};

use crate::model::statmech::levels::{self, Level, REACH};
use crate::model::statmech::{Change, Share};
use crate::num::math;

/// A rigid top by its rotational constants, as temperatures in kelvin.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Top {
    Linear { b_k: f64 },
    Nonlinear { abc_k: [f64; 3] },
}

/// How its rotation is summed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sum {
    /// The integral, right at high temperature.
    Classical,
    /// Level by level where it matters, by the expansion above.
    Levels,
}

/// Above this T/θ of the largest constant the expansion of a nonlinear top serves.
const HOT: f64 = 40.0;
/// Above this T/θ the expansion of a linear one does.
const HOT_LINEAR: f64 = 30.0;
/// Levels of asymmetric tops are found up to this J; beyond it the expansion has to do.
const MOST_J: usize = 120;

impl Top {
    /// 1 for a linear molecule, 3/2 for others: Cv/R and U/RT in the classical limit.
    pub fn limit(&self) -> f64 {
        match self {
            Top::Linear { .. } => 1.0,
            Top::Nonlinear { .. } => 1.5,
        }
    }

    /// The largest rotational constant.
    pub fn largest_k(&self) -> f64 {
        match self {
            Top::Linear { b_k } => *b_k,
            Top::Nonlinear { abc_k } => abc_k.iter().copied().fold(0.0, f64::max),
        }
    }

    /// The share of rotation at `t_k`.
    pub fn share(&self, symmetry_number: f64, sum: Sum, t_k: f64) -> Share {
        let mut share = match (self, sum) {
            (Top::Linear { b_k }, Sum::Classical) => Share { cv: 1.0, u: 1.0, s: 1.0 + math::ln(t_k / b_k), bend: 0.0 },
            (Top::Linear { b_k }, Sum::Levels) if t_k > HOT_LINEAR * b_k => linear_expansion(b_k / t_k),
            (Top::Linear { b_k }, Sum::Levels) => levels::share(linear_levels(*b_k, t_k), t_k),
            (Top::Nonlinear { abc_k: [a, b, c] }, Sum::Classical) => {
                let ln_q = 0.5 * (math::ln(PI * t_k / a) + math::ln(t_k / b) + math::ln(t_k / c));
                Share { cv: 1.5, u: 1.5, s: 1.5 + ln_q, bend: 0.0 }
            }
            (Top::Nonlinear { abc_k }, Sum::Levels) => match top_levels(*abc_k, t_k) {
                Some(levels) => levels::share(levels, t_k),
                None => {
                    let classical = self.share(1.0, Sum::Classical, t_k);
                    let [a, b, c] = *abc_k;
                    let first = (2.0 * (a + b + c) - b * c / a - c * a / b - a * b / c) / 12.0;
                    Share { u: classical.u - first / t_k, ..classical }
                }
            },
        };
        share.s -= math::ln(symmetry_number);
        share
    }

    /// Derivatives with respect to each rotational constant, per kelvin; those of a nonlinear top are the classical ones,
    /// which is what they are to first order at any temperature where a rigid top has its symmetry number.
    pub fn changes(&self, sum: Sum, t_k: f64) -> Vec<Change> {
        match self {
            Top::Linear { b_k } if sum == Sum::Classical || t_k > HOT_LINEAR * b_k => {
                vec![Change { cv: 0.0, u: 0.0, s: -1.0 / b_k }]
            }
            Top::Linear { b_k } => {
                let slopes = linear_levels(*b_k, t_k).map(|level| (level, [level.e_k / b_k]));
                levels::changes(slopes, t_k).to_vec()
            }
            Top::Nonlinear { abc_k } => abc_k.iter().map(|theta| Change { cv: 0.0, u: 0.0, s: -0.5 / theta }).collect(),
        }
    }
}

fn linear_expansion(y: f64) -> Share {
    let (c2, c3, c4) = (y * y / 90.0, 8.0 * y * y * y / 2835.0, 59.0 * y * y * y * y / 56700.0);
    let ln_q = -math::ln(y) + y / 3.0 + c2 + c3 + c4;
    // U/RT = −y d ln q/dy, and Cv/R = U/RT − y d(U/RT)/dy.
    let u = 1.0 - (y / 3.0 + 2.0 * c2 + 3.0 * c3 + 4.0 * c4);
    let cv = 1.0 + 2.0 * c2 + 6.0 * c3 + 12.0 * c4;
    Share { cv, u, s: ln_q + u, bend: -(4.0 * c2 + 18.0 * c3 + 48.0 * c4) }
}

fn linear_levels(b_k: f64, t_k: f64) -> impl Iterator<Item = Level> + Clone {
    let level = move |j: u32| Level { e_k: f64::from(j) * f64::from(j + 1) * b_k, g: f64::from(2 * j + 1) };
    (0..).map(level).take_while(move |level| level.e_k <= REACH * t_k)
}

/// All levels of a rigid top that matter at `t_k`, with K and M degeneracy; `None` where it is hot enough for the expansion.
fn top_levels(abc_k: [f64; 3], t_k: f64) -> Option<Vec<Level>> {
    let mut sorted = abc_k;
    sorted.sort_by(|x, y| y.total_cmp(x));
    let [a, b, c] = sorted;
    let most = math::sqrt(REACH * t_k / c) as usize + 2;
    let symmetric = nearly(a, b) || nearly(b, c);
    if t_k > HOT * a || (!symmetric && most > MOST_J) {
        return None;
    }
    let mut levels = Vec::new();
    for j in 0..=most {
        let (jf, m) = (j as f64, (2 * j + 1) as f64);
        if symmetric {
            let (unique, double) = if nearly(a, b) { (c, 0.5 * (a + b)) } else { (a, 0.5 * (b + c)) };
            levels.extend((0..=j).map(|k| Level {
                e_k: double * jf * (jf + 1.0) + (unique - double) * (k * k) as f64,
                g: if k == 0 { m } else { 2.0 * m },
            }));
        } else {
            levels.extend(asymmetric(sorted, j).into_iter().map(|e_k| Level { e_k, g: m }));
        }
    }
    levels.retain(|level| level.e_k <= REACH * t_k);
    Some(levels)
}

fn nearly(a: f64, b: f64) -> bool {
    (a - b).abs() <= 1e-9 * (a + b)
}

/// Energies of the 2J + 1 levels of an asymmetric top in the basis of the prolate symmetric one, K along the axis of A.
fn asymmetric([a, b, c]: [f64; 3], j: usize) -> Vec<f64> {
    let jj = (j * (j + 1)) as f64;
    let mut energies = Vec::with_capacity(2 * j + 1);
    // K and K ± 2 are coupled, so even and odd K are two blocks.
    for start in [-(j as i64), 1 - j as i64] {
        let ks: Vec<i64> = (start..=j as i64).step_by(2).collect();
        if ks.is_empty() {
            continue;
        }
        let mut h = DMatrix::zeros(ks.len(), ks.len());
        for (at, &k) in ks.iter().enumerate() {
            let kk = (k * k) as f64;
            h[(at, at)] = 0.5 * (b + c) * (jj - kk) + a * kk;
            if at + 1 < ks.len() {
                let (k0, k1) = (k as f64, (k + 1) as f64);
                let up = math::sqrt((jj - k0 * k1) * (jj - k1 * (k1 + 1.0)));
                h[(at + 1, at)] = 0.25 * (b - c) * up;
                h[(at, at + 1)] = h[(at + 1, at)];
            }
        }
        energies.extend(SymmetricEigen::new(h).eigenvalues.iter());
    }
    energies
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_linear_expansion_joins_the_sum() {
        let top = Top::Linear { b_k: 2.9 };
        let (below, above) = (top.share(1.0, Sum::Levels, 30.0 * 2.9), linear_expansion(1.0 / 30.0));
        // Bound: the first term left out, of order y⁵ with a coefficient under 1e-3, times 20 in Cv.
        for (a, b) in [(below.cv, above.cv), (below.u, above.u), (below.s, above.s), (below.bend, above.bend)] {
            assert!((a - b).abs() < 3e-9, "{a} {b}");
        }
    }

    #[test]
    fn levels_of_the_asymmetric_top_are_those_of_wang_for_j_of_one_and_two() {
        // Closed forms: J = 1: A + B, A + C, B + C; J = 2: 4A + B + C, A + 4B + C, A + B + 4C and 2S ± 2√(S² − 3P) with
        // S = A + B + C, P = AB + BC + CA. Source: S. C. Wang (1929), from memory.
        let [a, b, c] = [27.877, 14.512, 9.285];
        let (s, p) = (a + b + c, a * b + b * c + c * a);
        let root = 2.0 * math::sqrt(s * s - 3.0 * p);
        let closed = [
            vec![b + c, a + c, a + b],
            vec![a + b + 4.0 * c, a + 4.0 * b + c, 4.0 * a + b + c, 2.0 * s - root, 2.0 * s + root],
        ];
        for (j, mut want) in (1..).zip(closed) {
            let mut got = asymmetric([a, b, c], j);
            got.sort_by(f64::total_cmp);
            want.sort_by(f64::total_cmp);
            // Bound: rounding of a small eigenproblem at 1e2.
            assert!(got.iter().zip(&want).all(|(g, w)| (g - w).abs() < 1e-11), "{got:?} {want:?}");
        }
    }

    #[test]
    fn nonlinear_sums_approach_the_classical_formula_and_freeze_out() {
        for abc_k in [[40.1, 20.9, 13.4], [14.3, 14.3, 8.9], [7.5, 7.5, 7.5]] {
            let top = Top::Nonlinear { abc_k };
            let t_k = 0.99 * HOT * top.largest_k();
            let (sum, classical) = (top.share(2.0, Sum::Levels, t_k), top.share(2.0, Sum::Classical, t_k));
            let expanded = top.share(2.0, Sum::Levels, 1.01 * HOT * top.largest_k());
            // Bound: the second term of the expansion, at most 2e-5 in ln q and a few times that in its derivatives.
            assert!(
                (sum.cv - classical.cv).abs() < 1e-4 && (sum.s - classical.s).abs() < 1e-4,
                "{sum:?} {classical:?}"
            );
            assert!((sum.u * 0.99 - expanded.u * 1.01 + 1.5 * 0.02).abs() < 1e-4, "{sum:?} {expanded:?}");
            assert!(top.share(2.0, Sum::Levels, 0.02 * top.largest_k()).cv < 1e-3);
        }
    }

    #[test]
    fn a_linear_sum_changes_with_its_constant_as_its_differences_say() {
        for t_k in [20.0, 88.0, 400.0] {
            let h = 1e-4;
            let at = |b_k| Top::Linear { b_k }.share(2.0, Sum::Levels, t_k);
            let got = Top::Linear { b_k: 10.0 }.changes(Sum::Levels, t_k)[0];
            let slope = |f: fn(&Share) -> f64| (f(&at(10.0 + h)) - f(&at(10.0 - h))) / (2.0 * h);
            // Above 30 θ the derivative is the classical one: off by the first quantum term, y/3 of it in U.
            let allowed = if t_k > 300.0 { 0.04 / 10.0 } else { 1e-8 };
            assert!((got.s - slope(|s| s.s)).abs() < allowed && (got.cv - slope(|s| s.cv)).abs() < allowed, "{t_k} K");
        }
    }
}
