//! The heat capacity of a quantised oscillator, (x/(1 − e⁻ˣ))² e⁻ˣ, for one x and for many at once.
//!
//! Sweeps over temperatures spend their time here, so the exponential is written without branch and call, and the loop is
//! built twice: for any processor, and for one with vectors of four numbers, which is asked for when the program runs. The
//! surprise: both give the same bits, since each number goes through the same sums and products, rounded one by one, in
//! either; nothing is fused, and a vector is only several of them side by side.
//! Source: A. Einstein, Ann. Phys. 22, 180 (1907) (from memory); reduction of the argument: W. J. Cody, W. Waite, Software
//! Manual for the Elementary Functions (1980) (from memory); the series is Taylor's.

use std::f64::consts::LOG2_E;

/// Beyond this x the value is below 1e-300 and taken as 0, so that no number loses digits by being too small.
const LAST: f64 = 708.0;

/// e⁻ˣ and 1 − e⁻ˣ of an x > 0, each within three units of its last place; 0 and 1 above 708.
///
/// −x = k ln 2 + r with |r| ≤ ln 2/2; eʳ − 1 = r + r²/2 + … + r¹³/13!, whose next term is below 1.3e-17 of r. Then e⁻ˣ is
/// 2ᵏ + 2ᵏ(eʳ − 1) and 1 − e⁻ˣ is (1 − 2ᵏ) − 2ᵏ(eʳ − 1), where k = 0 leaves the small difference alone and nothing cancels.
#[inline(always)]
pub fn falling(x: f64) -> (f64, f64) {
    // ln 2 in two parts, the first with zeros at its end, so that k times it is exact.
    const LN_2: (f64, f64) = (6.931_471_803_691_238e-1, 1.908_214_929_270_587_7e-10);
    // Added to a number below 2⁵¹, 1.5 · 2⁵² leaves the nearest whole number in the last bits.
    const SHIFT: f64 = 6_755_399_441_055_744.0;
    // 1/13! to 1/2!.
    const INVERSE_FACTORIALS: [f64; 12] = [
        1.0 / 6_227_020_800.0,
        1.0 / 479_001_600.0,
        1.0 / 39_916_800.0,
        1.0 / 3_628_800.0,
        1.0 / 362_880.0,
        1.0 / 40_320.0,
        1.0 / 5040.0,
        1.0 / 720.0,
        1.0 / 120.0,
        1.0 / 24.0,
        1.0 / 6.0,
        0.5,
    ];
    let kept = if x < LAST { x } else { LAST };
    let shifted = SHIFT - kept * LOG2_E;
    let k = shifted - SHIFT;
    let r = (-kept - k * LN_2.0) - k * LN_2.1;
    let mut series = INVERSE_FACTORIALS[0];
    for factor in &INVERSE_FACTORIALS[1..] {
        series = series * r + factor;
    }
    let above = r + r * r * series;
    // 2ᵏ: the whole number in the last bits, moved into the exponent.
    let power = f64::from_bits(shifted.to_bits().wrapping_add(1023) << 52);
    let scaled = power * above;
    let e = if x < LAST { power + scaled } else { 0.0 };
    (e, (1.0 - power) - scaled)
}

/// Cv/R of one oscillator at x = hν/kT, which must be above 0.
#[inline(always)]
pub fn cv(x: f64) -> f64 {
    let (e, d) = falling(x);
    let ratio = x / d;
    ratio * ratio * e
}

/// Adds Cv/R of `degeneracy` oscillators of θ at each 1/T to what is in `out`: the bits of [`cv`] of each x.
pub fn add(theta_k: f64, degeneracy: f64, inverse_t: &[f64], out: &mut [f64]) {
    #[cfg(target_arch = "x86_64")]
    if std::arch::is_x86_feature_detected!("avx2") {
        // SAFETY: the processor has what the function is built for, as was just asked.
        unsafe { add_in_vectors(theta_k, degeneracy, inverse_t, out) };
        return;
    }
    add_one_by_one(theta_k, degeneracy, inverse_t, out);
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2")]
fn add_in_vectors(theta_k: f64, degeneracy: f64, inverse_t: &[f64], out: &mut [f64]) {
    add_one_by_one(theta_k, degeneracy, inverse_t, out);
}

#[inline(always)]
fn add_one_by_one(theta_k: f64, degeneracy: f64, inverse_t: &[f64], out: &mut [f64]) {
    for (out, inverse) in out.iter_mut().zip(inverse_t) {
        *out += degeneracy * cv(theta_k * inverse);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::num::math;

    /// x from 1e-7 to 707, evenly in its logarithm.
    fn many() -> impl Iterator<Item = f64> {
        let steps = 100_000;
        (0..=steps).map(move |nth| 1e-7 * math::pow(7.07e9, f64::from(nth) / f64::from(steps)))
    }

    #[test]
    fn the_exponential_and_its_complement_agree_with_those_of_the_library() {
        let (mut worst_e, mut worst_d) = (0.0_f64, 0.0_f64);
        for x in many() {
            let (e, d) = falling(x);
            worst_e = worst_e.max((e / math::exp(-x) - 1.0).abs());
            worst_d = worst_d.max((d / -math::expm1(-x) - 1.0).abs());
        }
        // Bound: three units of the last place here, one there.
        assert!(worst_e <= 4.0 * f64::EPSILON && worst_d <= 4.0 * f64::EPSILON, "{worst_e:e} {worst_d:e}");
        assert_eq!(falling(709.0), (0.0, 1.0));
        assert_eq!(cv(1e9), 0.0);
    }

    #[test]
    fn the_heat_capacity_agrees_with_the_library_over_the_whole_range() {
        for x in many() {
            let half = x / (2.0 * math::sinh(0.5 * x));
            // Bound: a dozen roundings on both sides, and sinh's own.
            assert!((cv(x) / (half * half) - 1.0).abs() < 4e-15, "{x}: {} {}", cv(x), half * half);
        }
    }

    #[test]
    fn many_at_once_have_the_bits_of_one_by_one() {
        for theta in [0.7, 210.0, 4_321.0, 90_000.0] {
            // Not a multiple of four, so that the rest behind the last vector is seen too.
            let inverse: Vec<f64> = (0..1003).map(|nth| 1.0 / (1.0 + 5.9 * f64::from(nth))).collect();
            let mut swept = vec![0.25; inverse.len()];
            add(theta, 3.0, &inverse, &mut swept);
            for (swept, inverse) in swept.iter().zip(&inverse) {
                assert_eq!(swept.to_bits(), (0.25 + 3.0 * cv(theta * inverse)).to_bits(), "{theta} {inverse}");
            }
        }
    }
}
