//! Debye's crystal: waves in a continuum, cut off so that there are three to every atom.
//!
//! U/(RT) = D₃(x)     S/R = 4D₃(x)/3 − ln(1 − e⁻ˣ)     Cv/R = 4D₃(x) − 3x/(eˣ − 1)     per mole of modes, x = θ/T
//!
//! D₃(x) = (3/x³) ∫₀ˣ t³/(eᵗ − 1) dt
//!
//! | symbol | unit | meaning                                             |
//! |--------|------|-----------------------------------------------------|
//! | θ      | K    | Debye temperature, hν/k of the highest wave         |
//! | U      | J/mol | energy above that of the lowest level, without the zero point |
//!
//! Below x = 2 the series in Bernoulli numbers stands, above it the series in e⁻ᵏˣ; the two agree to rounding where they
//! meet. A mole of modes has a third of the functions that are written for a mole of atoms.
//! Source: P. Debye, Ann. Phys. 39, 789 (1912) (from memory); series: M. Abramowitz, I. A. Stegun, Handbook of Mathematical
//! Functions, NBS Applied Mathematics Series 55, 27.1 (from memory).

use std::f64::consts::PI;

use crate::model::statmech::Share;
use crate::num::math;

/// Where one series takes over from the other.
const MEET: f64 = 2.0;

/// D₃(x), for x > 0.
pub fn d3(x: f64) -> f64 {
    if x < MEET { near(x) } else { far(x) }
}

/// The factors 2 (−1)ᵏ⁺¹ ζ(2k)/(2k + 3) of (x/2π)²ᵏ; at x = 2 each term is a tenth of the one before.
const NEAR: [f64; 17] = {
    let mut factors = [0.0; 17];
    let mut at = 0_usize;
    while at < 17 {
        let k = at as u32 + 1;
        let sign = if at.is_multiple_of(2) { 2.0 } else { -2.0 };
        factors[at] = sign * zeta(2 * k) / (2.0 * k as f64 + 3.0);
        at += 1;
    }
    factors
};

/// Riemann's ζ of an even number from 2: its closed form, or the sum of its terms, smallest first.
const fn zeta(n: u32) -> f64 {
    let squared = PI * PI;
    match n {
        2 => squared / 6.0,
        4 => squared * squared / 90.0,
        6 => squared * squared * squared / 945.0,
        8 => squared * squared * squared * squared / 9450.0,
        _ => {
            // What is left out beyond the sixtieth term is below 60⁻⁹/9 = 1e-17.
            let (mut sum, mut k) = (0.0, 60);
            while k > 0 {
                let (mut term, mut power) = (1.0, 0);
                while power < n {
                    term /= k as f64;
                    power += 1;
                }
                sum += term;
                k -= 1;
            }
            sum
        }
    }
}

/// 1 − 3x/8 + 3 Σ B₂ₖ x²ᵏ/[(2k)! (2k + 3)], with B₂ₖ/(2k)! = 2 (−1)ᵏ⁺¹ ζ(2k)/(2π)²ᵏ.
fn near(x: f64) -> f64 {
    let ratio = (x / (2.0 * PI)) * (x / (2.0 * PI));
    let sum = NEAR.iter().rev().fold(0.0, |sum, factor| ratio * (factor + sum));
    1.0 - 0.375 * x + 3.0 * sum
}

/// (3/x³) [π⁴/15 − Σ e⁻ᵏˣ (x³/k + 3x²/k² + 6x/k³ + 6/k⁴)]
fn far(x: f64) -> f64 {
    let e = math::exp(-x);
    let (mut sum, mut power) = (0.0, 1.0);
    for k in 1..=24 {
        power *= e;
        if power == 0.0 {
            break;
        }
        let k = f64::from(k);
        sum += power * (x * x * x + (3.0 * x * x + (6.0 * x + 6.0 / k) / k) / k) / k;
    }
    3.0 * (PI * PI * PI * PI / 15.0 - sum) / (x * x * x)
}

/// The share of one mole of modes.
pub fn share(x: f64) -> Share {
    let d = d3(x);
    let n = 1.0 / math::expm1(x);
    let cv = 4.0 * d - 3.0 * x * n;
    // −x dCv/dx, with dD₃/dx = 3/(eˣ − 1) − 3D₃/x; the small difference of large terms is a series near x = 0.
    let bend =
        if x < 0.05 { x * x * (0.1 - x * x / 140.0) } else { 12.0 * d - 9.0 * x * n - 3.0 * x * x * n * (1.0 + n) };
    Share { cv, u: d, s: 4.0 * d / 3.0 - math::ln(-math::expm1(-x)), bend }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::statmech::vibration;

    #[test]
    fn the_function_has_its_published_values() {
        let source =
            "M. Abramowitz, I. A. Stegun, NBS Applied Mathematics Series 55, table 27.1: printed to six decimals";
        for (x, printed) in [(0.1, 0.963), (1.0, 0.674_416), (10.0, 0.019_296)] {
            assert!((d3(x) - printed).abs() <= 0.6e-6, "D3({x}) = {}; {source}", d3(x));
        }
    }

    /// ∫₀ˣ t³/(eᵗ − 1) dt by Simpson's rule on so many steps.
    fn by_quadrature(x: f64) -> f64 {
        let steps = 20_000;
        let h = x / f64::from(steps);
        let f = |t: f64| if t == 0.0 { 0.0 } else { t * t * t / math::expm1(t) };
        let inner: f64 = (1..steps).map(|i| if i % 2 == 1 { 4.0 } else { 2.0 } * f(f64::from(i) * h)).sum();
        3.0 * h / 3.0 * (f(0.0) + inner + f(x)) / (x * x * x)
    }

    #[test]
    fn series_and_quadrature_agree_over_the_whole_range() {
        for nth in 0..60 {
            let x = 0.01 * f64::powi(1.17, nth);
            // Bound: Simpson's rule is off by h⁴/180 of a fourth derivative of about 1, h up to 0.006 at x = 100.
            let allowed = 1e-12 + 1e-14 * x;
            assert!((d3(x) / by_quadrature(x) - 1.0).abs() < allowed * (1.0 + x), "D3({x})");
        }
        // Where the series meet, to rounding: one loses a digit to π⁴/15.
        assert!((near(MEET) / far(MEET) - 1.0).abs() < 4e-15, "{} {}", near(MEET), far(MEET));
    }

    #[test]
    fn the_limits_are_those_of_theory() {
        // Cv = 12π⁴/5 (T/θ)³ R per mole of atoms when cold, 3R when hot.
        let cold = 3.0 * share(80.0).cv;
        assert!((cold * 80.0 * 80.0 * 80.0 / (2.4 * PI * PI * PI * PI) - 1.0).abs() < 1e-13, "{cold}");
        assert!((share(1e-4).cv - 1.0).abs() < 1e-9);
        assert!(share(1e4).cv > 0.0 && share(1e4).s < 1e-9);
        assert!((share(1e-4).bend - 1e-9).abs() < 1e-16);
    }

    #[test]
    fn shares_hang_together() {
        let t = 100.0;
        for theta in [3.0, 120.0, 400.0, 2000.0] {
            let (at, up, down) = (share(theta / t), share(theta / (t + 0.01)), share(theta / (t - 0.01)));
            // Bound: central differences over 2 × 0.01 K.
            let slope = |up: f64, down: f64| (up - down) / 0.02;
            assert!((at.cv - slope(up.u * (t + 0.01), down.u * (t - 0.01))).abs() < 1e-8, "Cv is dU/dT: {theta}");
            assert!((at.cv - t * slope(up.s, down.s)).abs() < 1e-8, "Cv is T dS/dT: {theta}");
            assert!((at.bend - t * slope(up.cv, down.cv)).abs() < 1e-7, "{theta}");
        }
    }

    #[test]
    fn a_debye_crystal_is_many_oscillators() {
        // Modes as x² between 0 and the cut-off: the middle of each of 4000 equal shares.
        let (x, n) = (3.0, 4000);
        let mode = |i: i32| x * math::pow((f64::from(i) + 0.5) / f64::from(n), 1.0 / 3.0);
        let mean = |f: fn(vibration_share: Share) -> f64| {
            (0..n).map(|i| f(vibration::oscillator(mode(i)))).sum::<f64>() / f64::from(n)
        };
        // Bound: the midpoint rule over a function whose slope at 0 is finite in x³: of the order 1/n².
        assert!((mean(|s| s.cv) - share(x).cv).abs() < 1e-5);
        assert!((mean(|s| s.s) - share(x).s).abs() < 2e-4);
    }
}
