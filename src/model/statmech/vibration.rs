//! A harmonic oscillator, and what is done about one whose wavenumber is so low that it is none.
//!
//! U/RT = x/(eˣ − 1)     S/R = x/(eˣ − 1) − ln(1 − e⁻ˣ)     Cv/R = x² eˣ/(eˣ − 1)²     x = θ/T,  θ = hcν/k
//!
//! Low modes: all wavenumbers below a cut-off raised to it (Truhlar and co-workers), or oscillator and free rotor
//! blended (Grimme):
//!
//! S = w S(oscillator) + (1 − w) S(free rotor)     w = 1/(1 + (ν₀/ν)⁴)
//! S(free rotor)/R = 1/2 + ln √(π T/θ')     θ' = θ + θ(B_av)
//!
//! | symbol | unit | meaning                                                                                   |
//! |--------|------|-------------------------------------------------------------------------------------------|
//! | ν, ν₀  | m⁻¹  | wavenumber of the mode, and of the middle of the blend or the cut-off                      |
//! | θ'     | K    | h²/(8π² k µ') of a rotor whose moment µ' = µB_av/(µ + B_av) has the oscillator's h/(8π²cν) as µ |
//! | B_av   | kg m² | 1e-44, which keeps the moment of very low modes finite                                    |
//!
//! The blend is applied to U and Cv as well, with U = RT/2 of a free rotor, so that Cv = dU/dT = T dS/dT holds.
//! Source: A. Einstein, Ann. Phys. 22, 180 (1907); R. F. Ribeiro, A. V. Marenich, C. J. Cramer, D. G. Truhlar, J. Phys.
//! Chem. B 115, 14556 (2011); S. Grimme, Chem. Eur. J. 18, 9955 (2012); the blended energy after Y.-P. Li, J. Gomes, S.
//! Mallikarjun Sharada, A. T. Bell, M. Head-Gordon, J. Phys. Chem. C 119, 1840 (2015); all from memory.

use std::f64::consts::PI;

use crate::model::statmech::{Change, Share};
use crate::num::math;
use crate::num::oscillator::{self, falling};

/// Below this x the closed form of x coth(x/2) is its series to better than 1e-15.
const SMALL: f64 = 1e-3;

/// The share of one harmonic oscillator of x = θ/T; x must be positive.
pub fn oscillator(x: f64) -> Share {
    let (e, d) = falling(x);
    let u = x * e / d;
    let cv = oscillator::cv(x);
    // ln(1 − e⁻ˣ) from whichever of the two is the small one, so that S keeps its digits at both ends.
    let ln_d = if x < 1.0 { math::ln(d) } else { math::ln_1p(-e) };
    Share { cv, u, s: u - ln_d, bend: cv * (x_coth(x, e, d) - 2.0) }
}

/// x coth(x/2)
fn x_coth(x: f64, e: f64, d: f64) -> f64 {
    if x < SMALL { 2.0 + x * x / 6.0 } else { x * (1.0 + e) / d }
}

/// Derivatives with respect to θ, per kelvin.
pub fn oscillator_change(theta_k: f64, t_k: f64) -> Change {
    let share = oscillator(theta_k / t_k);
    (1.0 / theta_k) * Change { cv: -share.bend, u: share.u - share.cv, s: -share.cv }
}

/// How modes of low wavenumber are taken.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum LowModes {
    /// As harmonic oscillators, like all others.
    Harmonic,
    /// Raised to this temperature of a wavenumber.
    Raised { cut_off_k: f64 },
    /// Blended with a free rotor, half and half at `middle_k`; `average_k` is h²/(8π² k B_av).
    Blended { middle_k: f64, average_k: f64 },
}

/// x = θ/T as a sweep has it, which takes 1/T once for all modes.
fn at(theta_k: f64, t_k: f64) -> f64 {
    theta_k * (1.0 / t_k)
}

/// The share of a mode at `t_k`, low or not.
pub fn share(theta_k: f64, low: LowModes, t_k: f64) -> Share {
    match low {
        LowModes::Harmonic => oscillator(at(theta_k, t_k)),
        LowModes::Raised { cut_off_k } => oscillator(at(theta_k.max(cut_off_k), t_k)),
        LowModes::Blended { middle_k, average_k } => {
            let w = weight(theta_k, middle_k);
            w * oscillator(at(theta_k, t_k)) + (1.0 - w) * rotor(theta_k + average_k, t_k)
        }
    }
}

fn weight(theta_k: f64, middle_k: f64) -> f64 {
    let ratio = middle_k / theta_k;
    1.0 / (1.0 + ratio * ratio * ratio * ratio)
}

/// A free rotor about one axis, of θ' = h²/(8π² k I), classical.
fn rotor(theta_k: f64, t_k: f64) -> Share {
    Share { cv: 0.5, u: 0.5, s: 0.5 + 0.5 * math::ln(PI * t_k / theta_k), bend: 0.0 }
}

/// Derivatives of [`share`] with respect to θ, per kelvin.
pub fn change(theta_k: f64, low: LowModes, t_k: f64) -> Change {
    match low {
        LowModes::Harmonic => oscillator_change(theta_k, t_k),
        LowModes::Raised { cut_off_k } if theta_k < cut_off_k => Change::default(),
        LowModes::Raised { .. } => oscillator_change(theta_k, t_k),
        LowModes::Blended { middle_k, average_k } => {
            let w = weight(theta_k, middle_k);
            let by_w = 4.0 * w * (1.0 - w) / theta_k;
            let (one, other) = (oscillator(theta_k / t_k), rotor(theta_k + average_k, t_k));
            let own = oscillator_change(theta_k, t_k);
            Change {
                cv: w * own.cv + by_w * (one.cv - other.cv),
                u: w * own.u + by_w * (one.u - other.u),
                s: w * own.s - (1.0 - w) * 0.5 / (theta_k + average_k) + by_w * (one.s - other.s),
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::statmech::levels::{self, Level};

    const BLENDED: LowModes = LowModes::Blended { middle_k: 143.9, average_k: 4.03 };

    #[test]
    fn closed_forms_agree_with_the_sum_over_levels() {
        for x in [0.2, 1.0, 3.0, 12.0] {
            let levels = (0..400).map(|v| Level { e_k: f64::from(v) * x, g: 1.0 });
            let (sum, closed) = (levels::share(levels, 1.0), oscillator(x));
            // Bound: the sum ends at 40 kT, whose weight times x³ is 1e-12 of the total.
            for (a, b) in [(sum.cv, closed.cv), (sum.u, closed.u), (sum.s, closed.s), (sum.bend, closed.bend)] {
                assert!((a - b).abs() < 1e-10, "x = {x}: {a} {b}");
            }
        }
    }

    #[test]
    fn both_limits_are_reached() {
        let (hot, cold) = (oscillator(1e-6), oscillator(600.0));
        // Cv/R = 1 − x²/12 + …, so (T/R) dCv/dT = x²/6; the latter to the rounding of 2 + x²/6.
        assert!((hot.cv - 1.0).abs() < 1e-12 && (hot.bend - 1e-12 / 6.0).abs() < 4.5e-16, "{hot:?}");
        assert!(cold.cv < 1e-250 && cold.s < 1e-250);
        // What is left when cold: S = (x + 1) e⁻ˣ, to rounding, and not x e⁻ˣ, which 1 − e⁻ˣ = 1 would give.
        assert!((oscillator(60.0).s / (61.0 * math::exp(-60.0)) - 1.0).abs() < 1e-14);
    }

    #[test]
    fn derivatives_agree_with_differences_for_each_treatment() {
        let (theta, t, h) = (120.0, 298.15, 1e-3);
        for low in
            [LowModes::Harmonic, BLENDED, LowModes::Raised { cut_off_k: 100.0 }, LowModes::Raised { cut_off_k: 150.0 }]
        {
            let (up, down) = (share(theta + h, low, t), share(theta - h, low, t));
            let got = change(theta, low, t);
            // Bound: a central difference of smooth functions over 1e-3 K, and rounding of 1e-16/1e-3.
            for (got, up, down) in [(got.cv, up.cv, down.cv), (got.u, up.u, down.u), (got.s, up.s, down.s)] {
                assert!((got - (up - down) / (2.0 * h)).abs() < 1e-11, "{low:?}: {got}");
            }
            let (warm, cool) = (share(theta, low, t + h), share(theta, low, t - h));
            let at = share(theta, low, t);
            assert!((at.cv - t * (warm.s - cool.s) / (2.0 * h)).abs() < 1e-8, "{low:?}: Cv is T dS/dT");
            assert!((at.bend - t * (warm.cv - cool.cv) / (2.0 * h)).abs() < 1e-8, "{low:?}");
        }
    }

    #[test]
    fn a_blended_mode_is_half_rotor_in_the_middle_and_an_oscillator_far_above() {
        let middle = share(143.9, BLENDED, 300.0);
        let half = 0.5 * oscillator(143.9 / 300.0) + 0.5 * rotor(143.9 + 4.03, 300.0);
        assert!((middle.s - half.s).abs() < 1e-15);
        assert!((share(4000.0, BLENDED, 300.0).cv - oscillator(4000.0 / 300.0).cv).abs() < 2e-6);
    }
}
