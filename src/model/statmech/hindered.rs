//! Internal rotation: the torsion's Schrödinger equation solved in a basis of plane waves, for any Fourier potential.
//!
//! H = −F d²/dφ² + V(φ)       V(φ) = Σₖ ½ Vₖ (1 − cos kφ) + ½ Wₖ sin kφ
//!
//! | symbol | unit | meaning                                                                    |
//! |--------|------|----------------------------------------------------------------------------|
//! | F      | K    | h²/(8π² I k) of the reduced moment I of top against frame                   |
//! | Vₖ, Wₖ | K    | Fourier coefficients of the potential, k from 1; V₃ alone is a threefold barrier |
//! | σ      | 1    | symmetry number of the top, which divides q                                |
//!
//! In the real basis 1, cos mφ, sin mφ the matrix is real and symmetric; waves of m that differ by no multiple of the
//! potential's period do not meet, so it falls into blocks. Above four times the span of the potential levels are taken by
//! perturbation to second order, Fm² + ½ Σ Vₖ + Σ (Vₖ² + Wₖ²)/(8F(4m² − k²)), and added up to 40 kT. Derivatives are
//! expectation values of the derivative of H (Hellmann, Feynman).
//! F is taken as constant over the turn, and the torsion as separate from the other motions.
//! Source: K. S. Pitzer, W. D. Gwinn, J. Chem. Phys. 10, 428 (1942), for the model; levels by diagonalisation; from memory.

use nalgebra::{DMatrix, SymmetricEigen};

use crate::model::statmech::levels::{self, Level, REACH};
use crate::model::statmech::{Change, Share};
use crate::num::math;

/// One torsion.
#[derive(Clone, Debug, PartialEq)]
pub struct Potential {
    /// F
    pub f_k: f64,
    /// Vₖ and Wₖ of k = 1, 2, …
    pub cosines_k: Vec<f64>,
    pub sines_k: Vec<f64>,
}

/// Its levels with their derivatives, for one symmetry number.
#[derive(Clone, Debug)]
pub struct Torsion {
    potential: Potential,
    symmetry_number: f64,
    levels: Vec<Level>,
    /// ∂E/∂F, ∂E/∂Vₖ …, ∂E/∂Wₖ … of each level, less those of the lowest.
    slopes: Vec<Vec<f64>>,
}

/// Highest temperature that the list of levels is made for.
const HOTTEST_K: f64 = 6000.0;
/// Plane waves beyond those that the potential reaches.
const MARGIN: usize = 16;
/// Waves that are solved beyond those whose levels are kept, at least.
const EDGE: usize = 12;
/// The most waves; a rotor that wants more is a classical one.
const MOST_WAVES: usize = 4000;

impl Potential {
    /// A barrier of `v_k` with `fold` equal minima.
    pub fn barrier(f_k: f64, fold: usize, v_k: f64) -> Potential {
        let mut cosines_k = vec![0.0; fold];
        cosines_k[fold - 1] = v_k;
        Potential { f_k, cosines_k, sines_k: Vec::new() }
    }

    /// The largest k that the potential has.
    fn orders(&self) -> usize {
        self.cosines_k.len().max(self.sines_k.len())
    }

    fn cosine(&self, k: usize) -> f64 {
        self.cosines_k.get(k - 1).copied().unwrap_or(0.0)
    }

    fn sine(&self, k: usize) -> f64 {
        self.sines_k.get(k - 1).copied().unwrap_or(0.0)
    }

    /// The number of equal parts that the potential falls into; 0 for none at all.
    fn period(&self) -> usize {
        let gcd = |mut a: usize, mut b: usize| {
            while b != 0 {
                (a, b) = (b, a % b);
            }
            a
        };
        (1..=self.orders()).filter(|&k| self.cosine(k) != 0.0 || self.sine(k) != 0.0).fold(0, gcd)
    }

    fn mean(&self) -> f64 {
        0.5 * self.cosines_k.iter().sum::<f64>()
    }

    /// No potential rises or falls by more.
    fn span(&self) -> f64 {
        self.cosines_k.iter().chain(&self.sines_k).map(|v| v.abs()).sum()
    }

    /// V(φ)
    pub fn at(&self, phi: f64) -> f64 {
        (1..=self.orders())
            .map(|k| {
                let angle = k as f64 * phi;
                0.5 * self.cosine(k) * (1.0 - math::cos(angle)) + 0.5 * self.sine(k) * math::sin(angle)
            })
            .sum()
    }

    /// Energies with derivatives, in kelvin from the zero of V, not sorted.
    fn solved(&self) -> Vec<(f64, Vec<f64>)> {
        let period = self.period();
        let stiffness = math::sqrt(self.span() / self.f_k);
        let kept = if period == 0 { 0 } else { (2.0 * stiffness) as usize + MARGIN + self.orders() };
        let kept = kept.min(MOST_WAVES);
        // The highest levels of a block lack what lies beyond it: n waves further in, a level is off by the product of
        // (V/4)/(2mFj) for j up to n, squared, which is below rounding from here on. So these are solved and left out.
        let solved = kept + if period == 0 { 0 } else { EDGE + (0.2 * stiffness) as usize + 4 * self.orders() };
        let mut all = Vec::new();
        if period > 0 {
            // Waves m of one block: m or −m leaves the same remainder by the period.
            for class in 0..=period / 2 {
                let waves: Vec<i64> = (0..=solved as i64)
                    .filter(|m| {
                        let rest = *m as usize % period;
                        rest == class || (period - rest) % period == class
                    })
                    .collect();
                let within = waves.iter().map(|m| if *m as usize > kept { 0 } else { 1 + usize::from(*m > 0) }).sum();
                let mut block = self.block(&waves);
                block.sort_by(|a, b| a.0.total_cmp(&b.0));
                block.truncate(within);
                all.extend(block);
            }
        }
        let reach = REACH * HOTTEST_K + self.span();
        let first = if period == 0 { 0 } else { kept + 1 };
        for m in first..=MOST_WAVES {
            let m = m as f64;
            if self.f_k * m * m > reach {
                break;
            }
            let level = self.perturbed(m);
            if m > 0.0 {
                all.push(level.clone());
            }
            all.push(level);
        }
        all
    }

    /// One of the two levels of m far above the potential, to second order in it.
    fn perturbed(&self, m: f64) -> (f64, Vec<f64>) {
        let by = |k: usize| 1.0 / (8.0 * self.f_k * (4.0 * m * m - (k * k) as f64));
        let second = |all: &[f64]| (1..).zip(all).filter(|(_, v)| **v != 0.0).map(|(k, v)| v * v * by(k)).sum::<f64>();
        let second = second(&self.cosines_k) + second(&self.sines_k);
        let slope = |(k, v): (usize, &f64)| if *v == 0.0 { 0.0 } else { 2.0 * v * by(k) };
        let mut slopes = vec![m * m - second / self.f_k];
        slopes.extend((1..).zip(&self.cosines_k).map(|one| 0.5 + slope(one)));
        slopes.extend((1..).zip(&self.sines_k).map(slope));
        (self.f_k * m * m + self.mean() + second, slopes)
    }

    /// Eigenvalues and derivatives within one block of waves m ≥ 0, cosines before sines.
    fn block(&self, waves: &[i64]) -> Vec<(f64, Vec<f64>)> {
        let basis: Vec<(i64, bool)> =
            waves.iter().map(|m| (*m, false)).chain(waves.iter().filter(|m| **m > 0).map(|m| (*m, true))).collect();
        let n = basis.len();
        let mut h = DMatrix::zeros(n, n);
        for (row, &left) in basis.iter().enumerate() {
            for (column, &right) in basis.iter().enumerate().take(row + 1) {
                let mut element = if row == column { self.f_k * (left.0 * left.0) as f64 + self.mean() } else { 0.0 };
                for k in 1..=self.orders() {
                    element -= 0.5 * self.cosine(k) * cosine_between(left, right, k as i64);
                    element += 0.5 * self.sine(k) * sine_between(left, right, k as i64);
                }
                h[(row, column)] = element;
                h[(column, row)] = element;
            }
        }
        let solved = SymmetricEigen::new(h);
        let mut out = Vec::with_capacity(n);
        for (nth, e) in solved.eigenvalues.iter().enumerate() {
            let state = solved.eigenvectors.column(nth);
            let kinetic = basis.iter().zip(state.iter()).map(|((m, _), c)| (m * m) as f64 * c * c).sum();
            let mean = |between: fn((i64, bool), (i64, bool), i64) -> f64, k: usize| {
                let mut sum = 0.0;
                for (left, a) in basis.iter().zip(state.iter()) {
                    // Only waves that differ by k, or add up to it, meet.
                    for (right, b) in basis.iter().zip(state.iter()) {
                        if (left.0 - right.0).abs() == k as i64 || left.0 + right.0 == k as i64 {
                            sum += a * b * between(*left, *right, k as i64);
                        }
                    }
                }
                sum
            };
            let mut slopes = vec![kinetic];
            slopes.extend((1..=self.cosines_k.len()).map(|k| 0.5 - 0.5 * mean(cosine_between, k)));
            slopes.extend((1..=self.sines_k.len()).map(|k| 0.5 * mean(sine_between, k)));
            out.push((*e, slopes));
        }
        out
    }
}

/// 1/√(2π) for m = 0 and 1/√π otherwise, as factors of 1/√π.
fn norm(m: i64) -> f64 {
    if m == 0 { std::f64::consts::FRAC_1_SQRT_2 } else { 1.0 }
}

fn same(a: i64, b: i64) -> f64 {
    if a == b { 1.0 } else { 0.0 }
}

/// ∫ f cos kφ g dφ of two normalised waves; a wave is (m, whether it is a sine).
fn cosine_between((m, m_sine): (i64, bool), (n, n_sine): (i64, bool), k: i64) -> f64 {
    let parts = match (m_sine, n_sine) {
        // cos m cos n cos k: ¼ of each sign of ±m ± n ± k that vanishes, twice.
        (false, false) => same(m + n, k) + same((m - n).abs(), k) + if m == 0 && n == 0 { same(k, 0) } else { 0.0 },
        (true, true) => same((m - n).abs(), k) - same(m + n, k),
        _ => return 0.0,
    };
    // For m = 0 or n = 0 the two conditions m + n = k and |m − n| = k are one and count twice, as they should.
    0.5 * parts * norm(m) * norm(n)
}

/// ∫ f sin kφ g dφ of two normalised waves.
fn sine_between((m, m_sine): (i64, bool), (n, n_sine): (i64, bool), k: i64) -> f64 {
    let (s, c) = match (m_sine, n_sine) {
        (true, false) => (m, n),
        (false, true) => (n, m),
        _ => return 0.0,
    };
    // sin s sin k cos c = ½ [cos(s − k) − cos(s + k)] cos c
    let parts = same((s - k).abs(), c) * (if c == 0 { 2.0 } else { 1.0 }) - same(s + k, c);
    0.5 * parts * norm(c)
}

impl Torsion {
    pub fn new(potential: Potential, symmetry_number: f64) -> Torsion {
        let mut solved = potential.solved();
        solved.sort_by(|a, b| a.0.total_cmp(&b.0));
        let (lowest, lowest_slopes) = solved.first().cloned().unwrap_or((0.0, Vec::new()));
        let less = |slopes: &[f64]| slopes.iter().zip(&lowest_slopes).map(|(a, b)| a - b).collect();
        Torsion {
            potential,
            symmetry_number,
            levels: solved.iter().map(|(e, _)| Level { e_k: e - lowest, g: 1.0 }).collect(),
            slopes: solved.iter().map(|(_, slopes)| less(slopes)).collect(),
        }
    }

    pub fn potential(&self) -> &Potential {
        &self.potential
    }

    /// Energies in kelvin from the lowest level.
    pub fn levels(&self) -> &[Level] {
        &self.levels
    }

    /// Derivatives of each level with respect to F, each Vₖ and each Wₖ.
    pub fn slopes(&self) -> &[Vec<f64>] {
        &self.slopes
    }

    pub fn share(&self, t_k: f64) -> Share {
        let mut share = levels::share(self.levels.iter().copied(), t_k);
        share.s -= math::ln(self.symmetry_number);
        share
    }

    /// Derivatives with respect to F, each Vₖ and each Wₖ, per kelvin.
    pub fn changes(&self, t_k: f64) -> Vec<Change> {
        let count = 1 + self.potential.cosines_k.len() + self.potential.sines_k.len();
        let levels = self.levels.iter().copied().zip(self.slopes.iter().map(Vec::as_slice));
        levels::changes_of(levels, count, t_k)
    }

    /// The same rotor without its potential.
    pub fn free(&self) -> Torsion {
        let zero = |all: &[f64]| vec![0.0; all.len()];
        let Potential { f_k, cosines_k, sines_k } = &self.potential;
        let potential = Potential { f_k: *f_k, cosines_k: zero(cosines_k), sines_k: zero(sines_k) };
        Torsion::new(potential, self.symmetry_number)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::statmech::vibration;

    type Row = (f64, f64, &'static [f64]);

    /// F, V₃ and the seven lowest energies of A symmetry, from the characteristic values.
    const MATHIEU: &[Row] = &[
        (
            10.68,
            1024.0,
            &[
                150.591_906_995_238_05,
                438.073_125_096_353_07,
                691.835_256_814_287_5,
                930.303_901_159_397_8,
                1_034.039_378_956_760_6,
                1_415.608_109_256_099_2,
                1_419.500_755_452_679_9,
            ],
        ),
        (
            27.64,
            373.2,
            &[
                128.323_162_611_508_85,
                423.807_069_809_124_5,
                481.814_458_991_423_4,
                1_186.192_708_559_265,
                1_186.462_060_937_738_4,
                2_427.440_904_511_220_7,
                2_427.441_000_331_281,
            ],
        ),
        (
            5.0,
            50.0,
            &[
                18.795_169_221_902_92,
                68.848_718_773_007_76,
                75.038_785_088_207_48,
                205.456_748_803_913_43,
                205.471_510_401_260_96,
                430.198_484_399_569_45,
                430.198_487_264_993_73,
            ],
        ),
    ];

    /// F, V₁ and the seven lowest energies.
    const MATHIEU_ONE: &[Row] = &[
        (
            10.0,
            700.0,
            &[
                41.198_214_886_364_1,
                122.282_925_040_195_38,
                200.672_225_271_192_87,
                276.207_282_588_149_4,
                348.693_559_575_895_45,
                417.885_492_542_623_35,
                483.453_073_946_807_3,
            ],
        ),
        (
            25.0,
            60.0,
            &[
                17.366_321_036_735_293,
                52.070_961_277_568_83,
                64.531_466_550_363_32,
                131.128_032_978_901_84,
                131.301_046_158_360_5,
                255.515_094_423_59,
                255.515_254_901_657_95,
            ],
        ),
    ];

    fn energies(potential: &Potential, count: usize) -> Vec<f64> {
        let mut all: Vec<f64> = potential.solved().into_iter().map(|(e, _)| e).collect();
        all.sort_by(f64::total_cmp);
        all.truncate(count);
        all
    }

    #[test]
    fn levels_are_the_characteristic_values_of_mathieu() {
        // With z = 3φ/2, H becomes Mathieu's equation: E = (9F/4) a(q) + V₃/2 with q = V₃/(9F), where states of A symmetry have
        // a of even order, and the E pairs of characteristic exponent 2m/3. So the A states are tested on the tables of
        // a₂ₙ, b₂ₙ. Source: scipy.special.mathieu_a and mathieu_b (SciPy 1.17.1), run once for q = V₃/(9F) of each row.
        for (f, v3, published) in MATHIEU {
            let mut all =
                Potential::barrier(*f, 3, *v3).block(&[0, 3, 6, 9, 12, 15, 18, 21, 24, 27, 30, 33, 36, 39, 42, 45, 48]);
            all.sort_by(|a, b| a.0.total_cmp(&b.0));
            for (got, want) in all.iter().map(|(e, _)| e).zip(*published) {
                assert!((got - want).abs() < 1e-8 * want.abs().max(1.0), "F = {f}, V3 = {v3}: {got} {want}");
            }
        }
    }

    #[test]
    fn a_single_fold_is_mathieus_equation_as_it_stands() {
        // Pendulum, V₁ alone: E = (F/4) a₂ₙ(q), b₂ₙ(q) + V₁/2 with q = V₁/F; the routine solves it without blocks.
        for (f, v1, published) in MATHIEU_ONE {
            let got = energies(&Potential::barrier(*f, 1, *v1), published.len());
            for (got, want) in got.iter().zip(*published) {
                assert!((got - want).abs() < 1e-8 * want.abs().max(1.0), "F = {f}, V1 = {v1}: {got} {want}");
            }
        }
    }

    #[test]
    fn levels_at_the_edge_of_what_is_solved_are_those_of_a_larger_matrix() {
        for (f, v) in [(7.2, 72.0), (15.4, 1473.0), (5.0, 2000.0)] {
            let potential = Potential::barrier(f, 1, v);
            let kept = energies(&potential, 2 * (2.0 * math::sqrt(v / f)) as usize + 40);
            let mut larger = potential.block(&(0..100).collect::<Vec<i64>>());
            larger.sort_by(|a, b| a.0.total_cmp(&b.0));
            for (nth, (got, (want, _))) in kept.iter().zip(&larger).enumerate() {
                // Bound: fourth order of the perturbation that takes over, 5q⁴F/(128 r⁶) with q = V/F and r = 2m near 4√q.
                let fourth =
                    5.0 / 128.0 * v * (v / f) * (v / f) * (v / f) / f64::powi(4.0 * math::sqrt(v / f) + 32.0, 6);
                assert!((got - want).abs() < 1e-9 * want + 2.0 * fourth, "F = {f}, V = {v}, level {nth}: {got} {want}");
            }
        }
    }

    #[test]
    fn without_a_barrier_it_is_the_free_rotor_and_with_a_high_one_the_oscillator() {
        let free = Torsion::new(Potential::barrier(10.0, 3, 0.0), 3.0);
        // ∫ exp(−Fm²/kT) dm = √(πT/F): the sum over whole m equals it to exp(−π²T/F).
        let s = 0.5 + 0.5 * math::ln(std::f64::consts::PI * 300.0 / 10.0) - math::ln(3.0);
        assert!((free.share(300.0).s - s).abs() < 1e-12 && (free.share(300.0).cv - 0.5).abs() < 1e-12);
        // V ≈ V₃ · 9φ²/4 at each of three minima: hν = 3 √(F V₃). The quartic term −27 V₃ φ⁴/16 lowers each level.
        let (f, v) = (10.0, 1e5);
        let torsion = Torsion::new(Potential::barrier(f, 3, v), 3.0);
        let theta = 3.0 * math::sqrt(f * v);
        let oscillator = vibration::oscillator(theta / 300.0);
        // Bound: anharmonicity ωx = 9F/4 = 22.5 K, times what a change of θ by 2ωx does: 45/3000 of some tenths.
        let change = vibration::oscillator_change(theta, 300.0);
        assert!((torsion.share(300.0).cv - oscillator.cv).abs() < 1.2 * (45.0 * change.cv).abs());
        assert!((torsion.share(300.0).s - oscillator.s).abs() < 1.2 * (45.0 * change.s).abs());
    }

    #[test]
    fn hot_torsions_reach_the_classical_integral() {
        // Classical: Cv/R = ½ + ⟨(V/kT)²⟩ − ⟨V/kT⟩², and S by q = √(πT/F) ⟨exp(−V/kT)⟩; the mean over the turn by the midpoint rule.
        // This is the column for 1/Qf = 0 of the tables of Pitzer and Gwinn (1942).
        for potential in [
            Potential::barrier(8.0, 3, 1500.0),
            Potential { f_k: 5.0, cosines_k: vec![300.0, -200.0, 900.0], sines_k: vec![120.0, 0.0, 80.0] },
        ] {
            let t_k = 2000.0;
            let torsion = Torsion::new(potential.clone(), 1.0);
            let zero = energies(&potential, 1)[0];
            let (mut q, mut m1, mut m2) = (0.0, 0.0, 0.0);
            for nth in 0..4096 {
                let phi = (f64::from(nth) + 0.5) * std::f64::consts::TAU / 4096.0;
                let x = (potential.at(phi) - zero) / t_k;
                let w = math::exp(-x) / 4096.0;
                q += w;
                m1 += w * x;
                m2 += w * x * x;
            }
            let (m1, m2) = (m1 / q, m2 / q);
            let cv = 0.5 + m2 - m1 * m1;
            let s = math::ln(q * math::sqrt(std::f64::consts::PI * t_k / potential.f_k)) + 0.5 + m1;
            let got = torsion.share(t_k);
            // Bound: the first quantum correction, (hν/kT)²/24 with hν = 3√(FV) of 330 K: 1.1e-3 in ln q and less in Cv.
            assert!((got.cv - cv).abs() < 1.5e-3 && (got.s - s).abs() < 1.5e-3, "{got:?} {cv} {s}");
        }
    }

    #[test]
    fn the_phase_of_a_potential_does_not_matter() {
        // cos 3(φ − φ₀) is a cosine and a sine: the same levels, by other matrix elements.
        let turned = |angle: f64| Potential {
            f_k: 9.0,
            cosines_k: vec![0.0, 0.0, 700.0 * math::cos(angle)],
            sines_k: vec![0.0, 0.0, 700.0 * math::sin(angle)],
        };
        let (straight, turned) = (turned(0.0), turned(0.7));
        for (a, b) in energies(&straight, 30).iter().zip(energies(&turned, 30)) {
            let b = b - turned.mean() + straight.mean();
            assert!((a - b).abs() < 1e-9 * (1.0 + a.abs()), "{a} {b}");
        }
    }

    #[test]
    fn derivatives_agree_with_differences() {
        let base = Potential { f_k: 12.0, cosines_k: vec![150.0, 0.0, 900.0], sines_k: vec![40.0] };
        let moved = |nth: usize, by: f64| {
            let mut p = base.clone();
            match nth {
                0 => p.f_k += by,
                1..=3 => p.cosines_k[nth - 1] += by,
                _ => p.sines_k[0] += by,
            }
            Torsion::new(p, 1.0).share(350.0)
        };
        let got = Torsion::new(base.clone(), 1.0).changes(350.0);
        for (nth, change) in got.iter().enumerate() {
            let h = 1e-3;
            let (up, down) = (moved(nth, h), moved(nth, -h));
            // Bound: a step of 1e-3 K in hundreds, and the eigenvalues' rounding of 1e-13/1e-3.
            for (got, up, down) in [(change.cv, up.cv, down.cv), (change.u, up.u, down.u), (change.s, up.s, down.s)] {
                assert!((got - (up - down) / (2.0 * h)).abs() < 1e-8, "{nth}: {got} {}", (up - down) / (2.0 * h));
            }
        }
    }
}
