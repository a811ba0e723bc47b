//! Pseudo-random numbers for the propagation of distributions: the same seed gives the same numbers on every machine.
//!
//! The generator is ChaCha with 8 rounds (D. J. Bernstein, 2008), of a library that keeps its streams from version to
//! version. [`Generator`] gives deviates of mean 0 whose scale is the standard uncertainty an input states.

use std::f64::consts::PI;

use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::{RngCore, SeedableRng};

use crate::num::math;

/// A stream of numbers that its seed determines.
pub struct Generator {
    stream: ChaCha8Rng,
    /// The polar method makes two normal deviates at a time.
    spare: Option<f64>,
}

impl Generator {
    pub fn new(seed: u64) -> Self {
        Generator { stream: ChaCha8Rng::seed_from_u64(seed), spare: None }
    }

    /// Uniform between 0 and 1, both excluded: the middle of one of 2^53 equal steps.
    pub fn uniform(&mut self) -> f64 {
        ((self.stream.next_u64() >> 11) as f64 + 0.5) / 9_007_199_254_740_992.0
    }

    /// Standard normal (G. E. P. Box, M. E. Muller, Ann. Math. Stat. 29, 610, 1958).
    pub fn normal(&mut self) -> f64 {
        if let Some(spare) = self.spare.take() {
            return spare;
        }
        let (radius, angle) = ((-2.0 * math::ln(self.uniform())).sqrt(), 2.0 * PI * self.uniform());
        self.spare = Some(radius * math::sin(angle));
        radius * math::cos(angle)
    }

    /// Student's t with any positive number of degrees of freedom; its standard deviation is √(ν/(ν − 2)), where it has one
    /// (R. W. Bailey, Math. Comp. 62, 779, 1994).
    pub fn student(&mut self, dof: f64) -> f64 {
        // U^(−2/ν) − 1 by expm1, which stays exact for large ν.
        let radius = (dof * math::expm1(-2.0 / dof * math::ln(self.uniform()))).sqrt();
        radius * math::cos(2.0 * PI * self.uniform())
    }

    /// Uniform between −√3 and √3: standard deviation 1.
    pub fn rectangular(&mut self) -> f64 {
        3.0_f64.sqrt() * (2.0 * self.uniform() - 1.0)
    }

    /// Triangular between −√6 and √6: standard deviation 1.
    pub fn triangular(&mut self) -> f64 {
        6.0_f64.sqrt() * (self.uniform() + self.uniform() - 1.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::num::student::{normal_factor, student_factor};

    const DRAWS: usize = 40_000;

    /// The share of draws within ±k, which the distribution says is `level`. The allowance is four standard deviations of
    /// a binomial share; the seed is fixed, so the test always sees the same numbers.
    fn encloses(mut draw: impl FnMut(&mut Generator) -> f64, k: f64, level: f64) {
        let mut generator = Generator::new(20_080_101);
        let inside = (0..DRAWS).filter(|_| draw(&mut generator).abs() <= k).count() as f64 / DRAWS as f64;
        let allowed = 4.0 * (level * (1.0 - level) / DRAWS as f64).sqrt();
        assert!((inside - level).abs() < allowed, "{inside} within {k}, expected {level}");
    }

    #[test]
    fn each_distribution_encloses_what_its_quantiles_say() {
        for level in [0.2, 0.5, 0.95, 0.99] {
            encloses(Generator::normal, normal_factor(level), level);
            for dof in [1.0, 2.5, 4.0, 18.0] {
                encloses(|generator| generator.student(dof), student_factor(level, dof), level);
            }
            // Within ±k of half-width a: k/a, and 1 − (1 − k/a)².
            encloses(Generator::rectangular, 3.0_f64.sqrt() * level, level);
            encloses(Generator::triangular, 6.0_f64.sqrt() * (1.0 - (1.0 - level).sqrt()), level);
        }
    }

    #[test]
    fn signs_are_even_and_spreads_are_one() {
        let moments = |draw: fn(&mut Generator) -> f64| {
            let mut generator = Generator::new(7);
            let all: Vec<f64> = (0..DRAWS).map(|_| draw(&mut generator)).collect();
            let mean = all.iter().sum::<f64>() / DRAWS as f64;
            (mean, all.iter().map(|x| (x - mean) * (x - mean)).sum::<f64>() / (DRAWS - 1) as f64)
        };
        for draw in [Generator::normal, Generator::rectangular, Generator::triangular] {
            let (mean, variance) = moments(draw);
            // Four standard deviations of a mean, 1/√n, and of a variance, at most √(2/n).
            assert!(mean.abs() < 4.0 / (DRAWS as f64).sqrt(), "{mean}");
            assert!((variance - 1.0).abs() < 4.0 * (2.0 / DRAWS as f64).sqrt(), "{variance}");
        }
    }

    #[test]
    fn a_seed_gives_its_stream_again_and_another_seed_another() {
        let first = |seed| (0..8).map(|_| Generator::new(seed).uniform()).collect::<Vec<_>>();
        assert_eq!(first(1), first(1));
        assert_ne!(first(1), first(2));
        // Kept: a recorded seed must give its draws again in a later version.
        let mut generator = Generator::new(1);
        let bits: Vec<u64> = (0..3).map(|_| generator.uniform().to_bits()).collect();
        assert_eq!(bits, PINNED);
    }

    const PINNED: [u64; 3] = [4_600_922_157_057_517_827, 4_590_456_677_328_490_124, 4_603_548_555_962_400_992];
}
