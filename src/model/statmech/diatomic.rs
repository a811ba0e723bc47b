//! A diatomic molecule by the direct sum over its levels, vibration and rotation together.
//!
//! E(v, J) = ωe(v + ½) − ωexe(v + ½)² + [Be − αe(v + ½)] J(J + 1) − De J²(J + 1)² + He J³(J + 1)³
//! counted from v = 0, J = 0
//!
//! | symbol  | unit | meaning                                                                    |
//! |---------|------|----------------------------------------------------------------------------|
//! | ωe, ωexe | K   | harmonic wavenumber and first anharmonic constant, as temperatures         |
//! | Be, αe  | K    | rotational constant at the minimum, and its fall with v                    |
//! | De      | K    | centrifugal constant; where none is given 4Be³/ωe², after Kratzer          |
//! | He      | K    | its correction, 2De(12Be² − αeωe)/(3ωe²): without it the ladder of H2 bends over at J = 25 |
//!
//! The sum ends at dissociation: at the v where the vibrational levels stop rising, at the energy ωe²/(4ωexe) of a Morse
//! oscillator above the minimum, and at the J where the rotational ladder turns. A molecule of two like nuclei has its
//! levels of even and odd J weighted by their nuclear spins; weights are divided by their sum, so that the spins add
//! nothing to S, as in tables. Frozen, the two forms keep the proportion of high temperature and do not convert.
//! Source: G. Herzberg, Molecular Spectra and Molecular Structure I, Spectra of Diatomic Molecules, 2nd ed. (1950),
//! chapters III and VIII; A. Kratzer, Z. Phys. 3, 289 (1920); J. E. Mayer, M. G. Mayer, Statistical Mechanics (1940),
//! chapter 7, for the forms of hydrogen; all from memory.

use crate::model::statmech::levels::{self, Level, REACH};
use crate::model::statmech::{Change, Share};

/// Constants of a diatomic molecule, as temperatures in kelvin, in the order of its parameters.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Constants {
    pub we: f64,
    pub wexe: f64,
    pub be: f64,
    pub alpha_e: f64,
    /// `None`: by Kratzer's relation.
    pub de: Option<f64>,
}

impl Constants {
    pub fn centrifugal(&self) -> f64 {
        self.de.unwrap_or(4.0 * self.be * self.be * self.be / (self.we * self.we))
    }

    /// He
    fn correction(&self) -> f64 {
        2.0 * self.centrifugal() * (12.0 * self.be * self.be - self.alpha_e * self.we) / (3.0 * self.we * self.we)
    }

    /// Energy from the minimum of the curve.
    fn term(&self, v: u32, j: u32) -> f64 {
        let (half, jj) = (f64::from(v) + 0.5, f64::from(j) * f64::from(j + 1));
        self.we * half - self.wexe * half * half + (self.be - self.alpha_e * half) * jj
            - jj * jj * (self.centrifugal() - jj * self.correction())
    }
}

/// Weights of the levels of even and odd J.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Spins {
    /// Unlike nuclei: every level once.
    Unlike,
    /// Like nuclei of which the forms are not told apart: every level half.
    Like,
    /// Like nuclei in equilibrium between the two forms.
    Equilibrium { even: f64, odd: f64 },
    /// The two forms in the proportion of high temperature, kept.
    Frozen { even: f64, odd: f64 },
}

/// The most levels that are kept: the heaviest shipped molecule has a tenth of it.
const MOST_LEVELS: usize = 2_000_000;
/// Highest temperature that the list of levels is made for.
const HOTTEST_K: f64 = 6000.0;

/// One level with its quantum numbers.
#[derive(Clone, Copy, Debug)]
struct Rovibronic {
    e_k: f64,
    g: f64,
    v: u32,
    j: u32,
}

/// The levels of one diatomic molecule, ready to be summed.
#[derive(Clone, Debug)]
pub struct Diatomic {
    constants: Constants,
    spins: Spins,
    levels: Vec<Rovibronic>,
}

impl Diatomic {
    pub fn new(constants: Constants, spins: Spins) -> Diatomic {
        let lowest = constants.term(0, 0);
        // The Morse oscillator's depth; without anharmonicity there is none, and the reach of the sum ends it.
        let depth =
            if constants.wexe > 0.0 { 0.25 * constants.we * constants.we / constants.wexe } else { f64::INFINITY };
        let highest = (depth - lowest).min(REACH * HOTTEST_K);
        let mut levels = Vec::new();
        let mut last_v = f64::NEG_INFINITY;
        for v in 0.. {
            let bottom = constants.term(v, 0);
            if bottom <= last_v || bottom - lowest > highest || levels.len() > MOST_LEVELS {
                break;
            }
            last_v = bottom;
            let mut last = f64::NEG_INFINITY;
            for j in 0.. {
                let e_k = constants.term(v, j) - lowest;
                if e_k > highest || e_k <= last || levels.len() > MOST_LEVELS {
                    break;
                }
                last = e_k;
                levels.push(Rovibronic { e_k, g: f64::from(2 * j + 1), v, j });
            }
        }
        Diatomic { constants, spins, levels }
    }

    /// 2: one for rotation and one for vibration.
    pub const LIMIT: f64 = 2.0;

    fn weight(&self, j: u32) -> f64 {
        match self.spins {
            Spins::Unlike => 1.0,
            Spins::Like => 0.5,
            Spins::Equilibrium { even, odd } | Spins::Frozen { even, odd } => {
                (if j.is_multiple_of(2) { even } else { odd }) / (even + odd)
            }
        }
    }

    /// Cv, U, S of vibration and rotation at `t_k`.
    pub fn share(&self, t_k: f64) -> Share {
        match self.spins {
            Spins::Frozen { even, odd } => {
                let total = even + odd;
                even / total * self.form(false, t_k) + odd / total * self.form(true, t_k)
            }
            _ => levels::share(self.weighted(), t_k),
        }
    }

    fn weighted(&self) -> impl Iterator<Item = Level> + '_ {
        self.levels.iter().map(|level| Level { e_k: level.e_k, g: level.g * self.weight(level.j) })
    }

    /// One form alone, by the parity of J. Its energy is counted from the lowest level of all, so that U of the frozen mixture
    /// and of the equilibrium one have the same zero.
    fn form(&self, odd: bool, t_k: f64) -> Share {
        let own = self.levels.iter().filter(|level| (level.j % 2 == 1) == odd);
        let lowest = own.clone().map(|level| level.e_k).fold(f64::INFINITY, f64::min);
        let mut share = levels::share(own.map(|level| Level { e_k: level.e_k - lowest, g: level.g }), t_k);
        share.u += lowest / t_k;
        share
    }

    /// Derivatives with respect to ωe, ωexe, Be and αe, and De where it was given, per kelvin.
    pub fn changes(&self, t_k: f64) -> Vec<Change> {
        let Constants { we, be, alpha_e, de, .. } = self.constants;
        let d = self.constants.centrifugal();
        // De by ωe, Be and itself, which is Kratzer's where it was not given, and He by all four.
        let (d_we, d_be) = if de.is_some() { (0.0, 0.0) } else { (-2.0 * d / we, 3.0 * d / be) };
        let per_d = 2.0 * (12.0 * be * be - alpha_e * we) / (3.0 * we * we);
        let h_we = per_d * d_we - 2.0 * d * alpha_e / (3.0 * we * we) - 2.0 * per_d * d / we;
        let h_be = per_d * d_be + 16.0 * d * be / (we * we);
        let h_alpha = -2.0 * d / (3.0 * we);
        let slopes = |level: &Rovibronic| {
            let (half, jj) = (f64::from(level.v) + 0.5, f64::from(level.j) * f64::from(level.j + 1));
            let (squared, cubed) = (jj * jj, jj * jj * jj);
            let mut slopes = vec![
                half - 0.5 - d_we * squared + h_we * cubed,
                0.25 - half * half,
                jj - d_be * squared + h_be * cubed,
                -half * jj + h_alpha * cubed,
            ];
            if de.is_some() {
                slopes.push(-squared + per_d * cubed);
            }
            slopes
        };
        // The list runs through J for each v, so that levels within reach come again after one that is not.
        let within = self.levels.iter().filter(|level| level.v == 0 || level.e_k <= REACH * t_k);
        let all: Vec<(&Rovibronic, Vec<f64>)> = within.map(|level| (level, slopes(level))).collect();
        let count = if de.is_some() { 5 } else { 4 };
        let of = |keep: &dyn Fn(u32) -> bool, offset: f64| {
            let levels = all.iter().filter(|(level, _)| keep(level.j)).map(|(level, slopes)| {
                (Level { e_k: level.e_k - offset, g: level.g * self.weight(level.j) }, slopes.as_slice())
            });
            levels::changes_of(levels, count, t_k)
        };
        match self.spins {
            Spins::Frozen { even, odd } => {
                let first = self.levels.iter().find(|level| level.j == 1).map_or(0.0, |level| level.e_k);
                let (even, odd) = (even / (even + odd), odd / (even + odd));
                let (of_even, of_odd) = (of(&|j| j.is_multiple_of(2), 0.0), of(&|j| j % 2 == 1, first));
                let mean = |(a, b): (&Change, &Change)| Change {
                    cv: even * a.cv + odd * b.cv,
                    u: even * a.u + odd * b.u,
                    s: even * a.s + odd * b.s,
                };
                of_even.iter().zip(&of_odd).map(mean).collect()
            }
            _ => of(&|_| true, 0.0),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::statmech::rotation::{Sum, Top};
    use crate::model::statmech::vibration;
    use crate::units::constants;

    fn kelvin(per_cm: f64) -> f64 {
        per_cm * 100.0 * constants::current().second_radiation.value
    }

    fn hydrogen(spins: Spins) -> Diatomic {
        // H2: Huber and Herzberg (1979), from memory.
        let [we, wexe, be, alpha_e] = [4401.21, 121.34, 60.853, 3.062].map(kelvin);
        Diatomic::new(Constants { we, wexe, be, alpha_e, de: None }, spins)
    }

    #[test]
    fn without_coupling_the_sum_is_rotor_and_oscillator() {
        let [we, be] = [2169.8, 1.93].map(kelvin);
        let stiff = Diatomic::new(Constants { we, wexe: 0.0, be, alpha_e: 0.0, de: Some(0.0) }, Spins::Unlike);
        for t_k in [50.0, 298.15, 1500.0] {
            let parts = Top::Linear { b_k: be }.share(1.0, Sum::Levels, t_k) + vibration::oscillator(we / t_k);
            let sum = stiff.share(t_k);
            // Bound: the reach of the sum, 40 kT, cuts 1e-14 of x² weights.
            assert!((sum.cv - parts.cv).abs() < 1e-9 && (sum.s - parts.s).abs() < 1e-9, "{t_k} K: {sum:?} {parts:?}");
        }
    }

    #[test]
    fn forms_of_hydrogen_differ_in_the_cold_and_agree_when_hot() {
        let (even, odd) = (1.0, 3.0);
        let (equilibrium, frozen) = (hydrogen(Spins::Equilibrium { even, odd }), hydrogen(Spins::Frozen { even, odd }));
        // At 10 K all is para in equilibrium and a quarter of it when frozen: U differs by 3/4 of the energy of J = 1, to the
        // equilibrium share of J = 1, 9 exp(-17).
        let gap = (frozen.share(10.0).u - equilibrium.share(10.0).u) * 10.0;
        let first = frozen.levels.iter().find(|level| level.j == 1).unwrap().e_k;
        assert!((gap / (0.75 * first) - 1.0).abs() < 1e-6, "{gap} K");
        assert!((frozen.share(1000.0).s - equilibrium.share(1000.0).s).abs() < 1e-6);
        assert!(equilibrium.share(60.0).cv > 1.3 && frozen.share(60.0).cv < 0.1, "the peak of conversion");
    }

    #[test]
    fn derivatives_agree_with_differences() {
        let [we, wexe, be, alpha_e] = [4401.21, 121.34, 60.853, 3.062].map(kelvin);
        let base = [we, wexe, be, alpha_e];
        for spins in [Spins::Unlike, Spins::Frozen { even: 1.0, odd: 3.0 }] {
            let at = |c: [f64; 4], t_k| {
                let constants = Constants { we: c[0], wexe: c[1], be: c[2], alpha_e: c[3], de: None };
                Diatomic::new(constants, spins).share(t_k)
            };
            for t_k in [150.0, 1200.0] {
                let got = hydrogen(spins).changes(t_k);
                for (nth, change) in got.iter().enumerate() {
                    let h = 1e-5 * base[nth];
                    let moved = |by: f64| {
                        let mut c = base;
                        c[nth] += by;
                        at(c, t_k)
                    };
                    let (up, down) = (moved(h), moved(-h));
                    // Bound: a step of 1e-5 leaves 1e-10 of curvature and 1e-11 of rounding, relative to the share.
                    let close = |got: f64, up: f64, down: f64| {
                        assert!((got * base[nth] - (up - down) / 2e-5).abs() < 2e-8, "{nth} at {t_k} K: {got}");
                    };
                    close(change.cv, up.cv, down.cv);
                    close(change.u, up.u, down.u);
                    close(change.s, up.s, down.s);
                }
            }
        }
    }
}
