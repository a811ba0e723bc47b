//! A crystal by its characteristic temperatures: lattice waves after Debye and Einstein, electrons, thermal expansion.
//!
//! Cv = R Σ n d(θ/T) + γT     Cp = Cv + A T Cp²     A = V α²/(κ Cp²) at the temperature where α and κ were measured,
//! or, where they are not known, A = A₀/(N Tm)
//! H(T) − H(0) = ∫₀ᵀ Cp dT     S(T) = ∫₀ᵀ Cp/T dT
//!
//! | symbol | unit         | meaning                                                                    |
//! |--------|--------------|----------------------------------------------------------------------------|
//! | n      | 1            | modes that share one θ, per formula unit; all together 3 for each atom      |
//! | d      | 1            | Debye's or Einstein's function of one mode (`statmech::debye`, `vibration`) |
//! | γ      | J/(mol K²)   | coefficient of the heat capacity of conduction electrons                   |
//! | A      | mol/J        | the relation of Nernst and Lindemann, which lets Cp − Cv die out when cold  |
//! | A₀     | K mol/J      | 0.0214 K mol/cal per mole of atoms, their own estimate for all crystals    |
//! | N, Tm  | 1, K         | atoms of the formula unit, melting point                                   |
//! | V      | m³/mol       | molar volume                                                               |
//! | α, κ   | 1/K, 1/Pa    | cubic expansivity and isothermal compressibility                           |
//!
//! [`Crystal`] holds the numbers and the inputs they came from. The surprise: H and S of Cv are closed forms, only what
//! expansion adds is integrated numerically.
//! Source: A. Einstein, Ann. Phys. 22, 180 (1907); P. Debye, Ann. Phys. 39, 789 (1912); W. Nernst, F. A. Lindemann, Z.
//! Elektrochem. 17, 817 (1911); Cp − Cv = T V α²/κ from the second law; all from memory.

pub mod answers;
pub mod claims;
pub mod error;
pub mod estimate;
pub mod fit;
pub mod read;

use std::rc::Rc;
use std::sync::Arc;

use crate::data::substance::Substance;
use crate::model::card::Call;
use crate::model::molecule::definition::GivenFormation;
use crate::model::molecule::parameter::Parameter;
use crate::model::statmech::{Share, debye, vibration};
use crate::model::terms::{Term, Terms};
use crate::num::math;
use crate::record::node::Node;
use crate::units::Entity;

/// Temperatures at which a crystal answers, K. Above, it is up to the melting point, which is not known here.
pub const RANGE_K: (f64, f64) = (0.01, 5000.0);

/// How the waves of one characteristic temperature are spread.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Spectrum {
    Debye,
    Einstein,
}

impl Spectrum {
    pub fn word(self) -> &'static str {
        match self {
            Spectrum::Debye => "Debye",
            Spectrum::Einstein => "Einstein",
        }
    }

    /// The share of one mole of modes at x = θ/T.
    pub fn share(self, x: f64) -> Share {
        match self {
            Spectrum::Debye => debye::share(x),
            Spectrum::Einstein => vibration::oscillator(x),
        }
    }
}

/// Modes that share one characteristic temperature.
#[derive(Clone)]
pub struct Modes {
    pub spectrum: Spectrum,
    pub theta: Parameter,
    /// Per formula unit.
    pub count: f64,
}

/// What tells Cp − Cv.
#[derive(Clone)]
pub enum Expansion {
    /// Thermal expansion as measured at one temperature.
    Measured {
        /// 1/K
        alpha: Parameter,
        /// 1/Pa
        kappa: Parameter,
        /// m³/mol
        volume: Parameter,
        /// Where they were measured, K.
        at_k: f64,
    },
    /// The melting point in K, from which Nernst and Lindemann estimate it.
    Melting(Parameter),
}

impl Expansion {
    fn parameters(&self) -> Vec<&Parameter> {
        match self {
            Expansion::Measured { alpha, kappa, volume, .. } => vec![alpha, kappa, volume],
            Expansion::Melting(melting) => vec![melting],
        }
    }
}

/// A₀ of Nernst and Lindemann, 0.0214 K mol/cal, in K mol/J per mole of atoms.
const MELTING_FACTOR: f64 = 0.0214 / 4.184;

/// A crystal.
pub struct Crystal {
    pub substance: Arc<Substance>,
    pub modes: Vec<Modes>,
    /// J/(mol K²)
    pub gamma: Option<Parameter>,
    pub expansion: Option<Expansion>,
    pub formation: Option<GivenFormation>,
    terms: Terms,
}

/// What a crystal has at T, per mole of it: J/(mol K) and J/mol.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Functions {
    pub cv: f64,
    pub cp: f64,
    /// H(T) − H(0)
    pub h: f64,
    pub s: f64,
    /// dCp/dT, J/(mol K²)
    pub cp_slope: f64,
}

impl Functions {
    fn times(self, by: f64) -> Functions {
        Functions { cv: by * self.cv, cp: by * self.cp, h: by * self.h, s: by * self.s, cp_slope: by * self.cp_slope }
    }

    /// (up − down)/(2 step)
    fn slope(up: Functions, down: Functions, step: f64) -> Functions {
        let gap = Functions {
            cv: up.cv - down.cv,
            cp: up.cp - down.cp,
            h: up.h - down.h,
            s: up.s - down.s,
            cp_slope: up.cp_slope - down.cp_slope,
        };
        gap.times(0.5 / step)
    }
}

/// The values of all parameters: θ of each group of modes, γ, and α, κ, V or the melting point.
type Numbers = Vec<f64>;

impl Crystal {
    pub fn new(
        substance: Arc<Substance>,
        modes: Vec<Modes>,
        gamma: Option<Parameter>,
        expansion: Option<Expansion>,
        formation: Option<GivenFormation>,
    ) -> Crystal {
        let (per, text) = (substance.species.entity, substance.id().to_owned());
        let terms = Terms::new(vec![Term::of_tables(Arc::clone(&substance), 1.0)], per, text);
        Crystal { substance, modes, gamma, expansion, formation, terms }
    }

    pub(super) fn made_by(&mut self, call: &Rc<Call>) {
        self.terms.made_by(call);
    }

    /// The same crystal, expanding otherwise.
    #[must_use]
    pub fn expanding(&self, expansion: Option<Expansion>) -> Crystal {
        let (substance, modes) = (Arc::clone(&self.substance), self.modes.clone());
        Crystal::new(substance, modes, self.gamma.clone(), expansion, self.formation.clone())
    }

    /// The crystal as a sum of species, for conditions and headings.
    pub fn terms(&self) -> &Terms {
        &self.terms
    }

    pub fn text(&self) -> &str {
        self.terms.text()
    }

    pub fn entity(&self) -> Entity {
        self.terms.per()
    }

    /// Atoms of a formula unit.
    pub fn atoms(&self) -> f64 {
        self.modes.iter().map(|modes| modes.count).sum::<f64>() / 3.0
    }

    fn parameters(&self) -> Vec<&Parameter> {
        let expansion = self.expansion.iter().flat_map(Expansion::parameters);
        self.modes.iter().map(|modes| &modes.theta).chain(&self.gamma).chain(expansion).collect()
    }

    /// Cv and its integrals, without expansion, from the values of the parameters.
    fn at_constant_volume(&self, numbers: &Numbers, t_k: f64, r: f64) -> Functions {
        let mut sum = Share::default();
        for (modes, theta) in self.modes.iter().zip(numbers) {
            sum += modes.count * modes.spectrum.share(theta / t_k);
        }
        let electrons = self.gamma.as_ref().map_or(0.0, |_| numbers[self.modes.len()] * t_k);
        let cv = r * sum.cv + electrons;
        Functions {
            cv,
            cp: cv,
            h: t_k * (r * sum.u + 0.5 * electrons),
            s: r * sum.s + electrons,
            cp_slope: (r * sum.bend + electrons) / t_k,
        }
    }

    /// A of the relation of Nernst and Lindemann, mol/J.
    fn expansion_factor(&self, numbers: &Numbers, r: f64) -> Option<f64> {
        let at_k = match self.expansion.as_ref()? {
            Expansion::Melting(_) => return Some(MELTING_FACTOR / (self.atoms() * numbers.last()?)),
            Expansion::Measured { at_k, .. } => *at_k,
        };
        let [.., alpha, kappa, volume] = numbers[..] else { return None };
        let gap = at_k * volume * alpha * alpha / kappa;
        let cp = self.at_constant_volume(numbers, at_k, r).cv + gap;
        Some(gap / (at_k * cp * cp))
    }

    /// All functions from the values of the parameters.
    fn of_numbers(&self, numbers: &Numbers, t_k: f64, r: f64) -> Functions {
        let mut at = self.at_constant_volume(numbers, t_k, r);
        let Some(a) = self.expansion_factor(numbers, r) else { return at };
        let extra = |t: f64| {
            let cv = self.at_constant_volume(numbers, t, r).cv;
            // The smaller root of A T Cp² − Cp + Cv = 0, in a form that does not cancel when A T Cv is small.
            let q = 4.0 * a * t * cv;
            if q < 1.0 { 2.0 * cv / (1.0 + math::sqrt(1.0 - q)) - cv } else { f64::NAN }
        };
        let cp = at.cv + extra(t_k);
        // From Cp = Cv + A T Cp² by T.
        at.cp_slope = (at.cp_slope + a * cp * cp) / (1.0 - 2.0 * a * t_k * cp);
        at.cp = cp;
        let (h, s) = integrals(extra, t_k);
        at.h += h;
        at.s += s;
        at
    }

    /// dCv/dT, J/(mol K²)
    fn cv_slope(&self, t_k: f64, r: f64) -> f64 {
        self.at_constant_volume(&self.numbers(), t_k, r).cp_slope
    }

    /// Derivatives of the functions with respect to R, by central differences.
    fn by_r(&self, t_k: f64, r: f64) -> Functions {
        let (numbers, step) = (self.numbers(), 1e-5 * r);
        let (up, down) = (self.of_numbers(&numbers, t_k, r + step), self.of_numbers(&numbers, t_k, r - step));
        Functions::slope(up, down, step)
    }

    fn numbers(&self) -> Numbers {
        self.parameters().iter().map(|parameter| parameter.value).collect()
    }

    /// What it has at T; `r` is R in J/(mol K). Not finite where the expansion given is too large for T.
    pub fn functions(&self, t_k: f64, r: f64) -> Functions {
        self.of_numbers(&self.numbers(), t_k, r)
    }

    /// Each input with the derivatives of the functions with respect to it, by central differences: a relative step of 1e-5
    /// leaves 1e-10 of them, and an uncertainty needs no more.
    fn derivatives(&self, t_k: f64, r: f64) -> Vec<(Rc<Node>, Functions)> {
        let base = self.numbers();
        let mut all = Vec::new();
        for (at, parameter) in self.parameters().into_iter().enumerate() {
            let step = 1e-5 * base[at];
            let moved = |by: f64| {
                let mut numbers = base.clone();
                numbers[at] += by;
                self.of_numbers(&numbers, t_k, r)
            };
            let (up, down) = (moved(step), moved(-step));
            let change = Functions::slope(up, down, step);
            all.extend(parameter.inputs.iter().map(|(node, by)| (Rc::clone(node), change.times(*by))));
        }
        all
    }
}

/// Abscissas of the Gauss-Legendre rule with sixteen points, those on one side, and their weights.
/// Source: M. Abramowitz, I. A. Stegun, NBS Applied Mathematics Series 55, table 25.4 (from memory); a test integrates powers.
const RULE: [(f64, f64); 8] = [
    (0.095_012_509_837_637_44, 0.189_450_610_455_068_5),
    (0.281_603_550_779_258_9, 0.182_603_415_044_923_6),
    (0.458_016_777_657_227_4, 0.169_156_519_395_002_54),
    (0.617_876_244_402_643_8, 0.149_595_988_816_576_73),
    (0.755_404_408_355_003, 0.124_628_971_255_533_87),
    (0.865_631_202_387_831_7, 0.095_158_511_682_492_78),
    (0.944_575_023_073_232_6, 0.062_253_523_938_647_89),
    (0.989_400_934_991_649_9, 0.027_152_459_411_754_095),
];

/// ∫₀ᵀ f dT and ∫₀ᵀ f/T dT of what expansion adds, on panels that halve towards 0, where it falls off as T⁷ at least.
fn integrals(f: impl Fn(f64) -> f64, t_k: f64) -> (f64, f64) {
    let (mut h, mut s, mut high) = (0.0, 0.0, t_k);
    for panel in 0..16 {
        let low = if panel == 15 { 0.0 } else { 0.5 * high };
        let (middle, half) = (0.5 * (low + high), 0.5 * (high - low));
        for (x, weight) in RULE {
            for t in [middle - half * x, middle + half * x] {
                let value = weight * half * f(t);
                h += value;
                s += value / t;
            }
        }
        high = low;
    }
    (h, s)
}

#[cfg(test)]
mod tests {
    use std::cell::Cell;
    use std::collections::BTreeMap;

    use super::*;
    use crate::model::card::{Cx, References, Value};
    use crate::units::constants;

    const R: f64 = 8.314_462_618;

    fn with_crystal(entries: &[(&str, &str)], work: impl FnOnce(&Crystal)) {
        let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
        let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
        let entry = |(key, text): &(&str, &str)| ((*key).to_owned(), Value::Text((*text).into()));
        let map: BTreeMap<String, Value> = entries.iter().map(entry).collect();
        work(&read::crystal(&cx, &map).unwrap());
    }

    /// Constants of copper; from memory, C. Kittel, Introduction to Solid State Physics, and handbook values.
    const COPPER: [(&str, &str); 6] = [
        ("formula", "Cu"),
        ("debye", "320 K"),
        ("electronic", "0.695 mJ/(mol K^2)"),
        ("expansivity", "4.95e-5 K^-1"),
        ("compressibility", "7.3e-12 Pa^-1"),
        ("molar_volume", "7.11 cm^3/mol"),
    ];

    #[test]
    fn the_rule_integrates_powers_as_it_should() {
        for power in [0, 1, 7, 20] {
            let (h, _) = integrals(|t| f64::powi(t, power), 2.0);
            let want = f64::powi(2.0, power + 1) / f64::from(power + 1);
            // Bound: sixteen points are exact up to the 31st power; rounding is left.
            assert!((h / want - 1.0).abs() < 1e-14, "T^{power}: {h} {want}");
        }
    }

    #[test]
    fn functions_hang_together_with_expansion_and_electrons() {
        with_crystal(&COPPER, |copper| {
            for t in [5.0, 60.0, 298.15, 1200.0] {
                let h = 1e-3 * t;
                let (at, up, down) = (copper.functions(t, R), copper.functions(t + h, R), copper.functions(t - h, R));
                let slope = |up: f64, down: f64| (up - down) / (2.0 * h);
                // Bound: a central difference over 0.2 % of T leaves 1e-6 of smooth functions, times six for T^4.
                let close = |a: f64, b: f64| assert!((a / b - 1.0).abs() < 1e-5, "{t} K: {a} {b}");
                close(slope(up.h, down.h), at.cp);
                close(t * slope(up.s, down.s), at.cp);
                close(slope(up.cp, down.cp), at.cp_slope);
                let a = copper.expansion_factor(&copper.numbers(), R).unwrap();
                assert!((at.cp - at.cv - a * t * at.cp * at.cp).abs() < 1e-12 * at.cp, "Nernst and Lindemann at {t} K");
            }
            // Cp - Cv = T V α²/κ where the expansion was measured: 0.711 J/(K mol), by hand.
            let gap = 298.15 * 7.11e-6 * 4.95e-5 * 4.95e-5 / 7.3e-12;
            let at = copper.functions(298.15, R);
            assert!((at.cp - at.cv - gap).abs() < 1e-12, "{}", at.cp - at.cv);
        });
    }

    #[test]
    fn what_is_cold_has_nothing_left() {
        with_crystal(&COPPER, |copper| {
            let at = copper.functions(0.01, R);
            assert!(at.cp > 0.0 && at.cp < 1e-5 && at.s < 1e-5 && at.h < 1e-7, "{at:?}");
            // At 1 K electrons bring 0.695 mJ/(K mol), the lattice 12π⁴/5 R/θ³.
            let lattice = 2.4 * std::f64::consts::PI.powi(4) * R / f64::powi(320.0, 3);
            let at = copper.functions(1.0, R);
            // Bound: expansion adds a part in 1e7 of Cp there.
            assert!((at.cv / (lattice + 0.695e-3) - 1.0).abs() < 1e-12 && (at.cp / at.cv - 1.0).abs() < 1e-6);
        });
    }

    #[test]
    fn the_melting_point_tells_about_what_expansion_does() {
        // Copper melts at 1357.77 K (ITS-90). By hand: A₀ T Cp²/Tm = 0.005115 · 298.15 · Cp²/1357.77 with the Cp that solves it.
        let melting = [COPPER[0], COPPER[1], COPPER[2], ("melting_point", "1357.77 K")];
        with_crystal(&melting, |copper| {
            let at = copper.functions(298.15, R);
            let gap = 0.0214 / 4.184 * 298.15 * at.cp * at.cp / 1357.77;
            assert!((at.cp - at.cv - gap).abs() < 1e-12, "{}", at.cp - at.cv);
            // The measured expansion brings 0.711; the estimate is good to some ten per cent of it (common practice, no source).
            assert!((gap - 0.711).abs() < 0.1, "{gap}");
        });
        // Per mole of atoms: a salt of two has the half of A and twice the Cp, so twice the difference at the same θ and Tm.
        with_crystal(&[("formula", "NaCl"), ("debye", "321 K"), ("melting_point", "1074 K")], |salt| {
            with_crystal(&[("formula", "Cu"), ("debye", "321 K"), ("melting_point", "1074 K")], |metal| {
                let (salt, metal) = (salt.functions(900.0, R), metal.functions(900.0, R));
                assert!((salt.cp / (2.0 * metal.cp) - 1.0).abs() < 1e-14);
            });
        });
    }

    #[test]
    fn derivatives_follow_each_input() {
        with_crystal(&COPPER, |copper| {
            let all = copper.derivatives(298.15, R);
            assert_eq!(all.len(), 5);
            // γ enters Cv as γT; α enters Cp − Cv at the temperature of its measurement as its square.
            assert!((all[1].1.cv - 298.15).abs() < 1e-6, "{}", all[1].1.cv);
            let gap = 298.15 * 7.11e-6 * 4.95e-5 * 4.95e-5 / 7.3e-12;
            assert!((all[2].1.cp * 4.95e-5 / (2.0 * gap) - 1.0).abs() < 1e-8, "{}", all[2].1.cp);
        });
    }

    #[test]
    fn modes_are_three_for_each_atom() {
        let salt = [("formula", "NaCl"), ("debye", "321 K")];
        with_crystal(&salt, |salt| {
            assert_eq!(salt.atoms(), 2.0);
            // Bound: (θ/T)²/20 of the limit is left at 3000 K.
            assert!((salt.functions(3000.0, R).cv / (6.0 * R) - 1.0).abs() < 6e-4);
        });
    }
}
