//! Sums over energy levels, and what a small change of the levels does to them.
//!
//! q = Σ gᵢ exp(−xᵢ)     S/R = ln q + ⟨x⟩     U/RT = ⟨x⟩     Cv/R = ⟨x²⟩ − ⟨x⟩²     (T/R) dCv/dT = κ₃ − 2κ₂
//!
//! | symbol | unit | meaning                                                     |
//! |--------|------|-------------------------------------------------------------|
//! | xᵢ     | 1    | Eᵢ/kT, counted from the lowest level                        |
//! | gᵢ     | 1    | degeneracy, or a weight                                     |
//! | ⟨ ⟩    |      | mean over the levels with the weights gᵢ exp(−xᵢ)           |
//! | κ₂, κ₃ | 1    | second and third cumulant of x                              |
//!
//! With y = ∂x/∂λ for a parameter λ: ∂S/R = −cov(x, y), ∂(U/RT) = ⟨y⟩ − cov(x, y), ∂Cv/R = 2 cov(x, y) − κ(x, x, y).
//! Source: Boltzmann's distribution; the derivatives follow by differentiating the means.

use crate::model::statmech::{Change, Share};
use crate::num::math;

/// One level: its energy over k in kelvin, from the lowest level, and its degeneracy.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Level {
    pub e_k: f64,
    pub g: f64,
}

/// Beyond this many kT a level carries less than 1e-17 of the weight of the lowest one.
pub const REACH: f64 = 40.0;

/// The share of some levels at `t_k`. There must be one at least, and the lowest energy must be 0.
pub fn share(levels: impl IntoIterator<Item = Level>, t_k: f64) -> Share {
    let inverse = 1.0 / t_k;
    let (mut q, mut m1, mut m2, mut m3) = (0.0, 0.0, 0.0, 0.0);
    for level in levels {
        let x = level.e_k * inverse;
        if x > REACH {
            continue;
        }
        let p = level.g * math::exp(-x);
        q += p;
        m1 += p * x;
        m2 += p * x * x;
        m3 += p * x * x * x;
    }
    let (m1, m2, m3) = (m1 / q, m2 / q, m3 / q);
    let second = m2 - m1 * m1;
    let third = m3 - 3.0 * m1 * m2 + 2.0 * m1 * m1 * m1;
    Share { cv: second, u: m1, s: math::ln(q) + m1, bend: third - 2.0 * second }
}

/// Derivatives of the share with respect to the parameters of the levels. Each level comes with ∂E/∂θ for each.
pub fn changes<const N: usize>(levels: impl IntoIterator<Item = (Level, [f64; N])>, t_k: f64) -> [Change; N] {
    let mut all = Vec::new();
    all.extend(levels.into_iter().map(|(level, slopes)| (level, slopes.to_vec())));
    let found = changes_of(all.iter().map(|(level, slopes)| (*level, slopes.as_slice())), N, t_k);
    let mut out = [Change::default(); N];
    out.copy_from_slice(&found);
    out
}

/// The same for a number of parameters that is known only when it runs.
pub fn changes_of<'a>(levels: impl IntoIterator<Item = (Level, &'a [f64])>, count: usize, t_k: f64) -> Vec<Change> {
    let inverse = 1.0 / t_k;
    let (mut q, mut m1, mut m2) = (0.0, 0.0, 0.0);
    // ⟨y⟩, ⟨xy⟩ and ⟨x²y⟩ of each parameter.
    let mut sums = vec![[0.0; 3]; count];
    for (level, slopes) in levels {
        let x = level.e_k * inverse;
        if x > REACH {
            continue;
        }
        let p = level.g * math::exp(-x);
        q += p;
        m1 += p * x;
        m2 += p * x * x;
        for (sum, slope) in sums.iter_mut().zip(slopes) {
            let y = p * slope * inverse;
            *sum = [sum[0] + y, sum[1] + x * y, sum[2] + x * x * y];
        }
    }
    let (m1, m2) = (m1 / q, m2 / q);
    let change = |sum: &[f64; 3]| {
        let [y, xy, xxy] = sum.map(|sum| sum / q);
        let covariance = xy - m1 * y;
        let third = xxy - m2 * y - 2.0 * m1 * covariance;
        Change { cv: 2.0 * covariance - third, u: y - covariance, s: -covariance }
    };
    sums.iter().map(change).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_levels_give_the_schottky_function() {
        // Cv/R = g x² e^-x / (1 + g e^-x)², the closed form for two levels of degeneracy 1 and g.
        let at = |t_k| share([Level { e_k: 0.0, g: 1.0 }, Level { e_k: 300.0, g: 2.0 }], t_k);
        for t_k in [30.0, 100.0, 300.0, 3000.0] {
            let x = 300.0 / t_k;
            let w = 2.0 * math::exp(-x);
            let (cv, s) = (w * x * x / (1.0 + w) / (1.0 + w), math::ln(1.0 + w) + w * x / (1.0 + w));
            // Bound: a dozen roundings of numbers near 1.
            assert!((at(t_k).cv - cv).abs() < 1e-14 && (at(t_k).s - s).abs() < 1e-14, "{t_k} K");
        }
    }

    #[test]
    fn derivatives_agree_with_differences() {
        // E₁ = θ and E₂ = 3 θ; bound: a central difference over a relative step h is off by h²/6 of a third derivative.
        let levels = |theta: f64| [(0.0, 1.0), (theta, 3.0), (3.0 * theta, 2.0)].map(|(e_k, g)| Level { e_k, g });
        let (t_k, theta, h) = (250.0, 400.0, 1e-4);
        let [change] = changes(levels(theta).map(|level| (level, [level.e_k / theta])), t_k);
        let (up, down) = (share(levels(theta * (1.0 + h)), t_k), share(levels(theta * (1.0 - h)), t_k));
        let slope = |f: fn(&Share) -> f64| (f(&up) - f(&down)) / (2.0 * h * theta);
        for (got, difference) in [(change.cv, slope(|s| s.cv)), (change.u, slope(|s| s.u)), (change.s, slope(|s| s.s))]
        {
            assert!((got / difference - 1.0).abs() < 1e-6, "{got} {difference}");
        }
        let (up, down) = (share(levels(theta), t_k * (1.0 + h)), share(levels(theta), t_k * (1.0 - h)));
        let bend = share(levels(theta), t_k).bend;
        assert!((bend / ((up.cv - down.cv) / (2.0 * h)) - 1.0).abs() < 1e-6, "{bend}");
    }
}
