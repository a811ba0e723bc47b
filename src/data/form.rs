//! The forms in which heat capacities are published, and how each is written as a sum of powers of T.
//!
//! | form           | equation                                                                            |
//! |----------------|-------------------------------------------------------------------------------------|
//! | `maier-kelley` | Cp = a + b T + c T⁻² + d T²                                                         |
//! | `five-term`    | Cp = a1 + a2 T + a3 T⁻² + a4 T^(−1/2) + a5 T²                                       |
//! | `shomate`      | Cp = A + B t + C t² + D t³ + E t⁻², t = T/1000 K, with constants F and G of H and S |
//! | `cubic-T100`   | Cp/R = A1 + A2 (T/100 K) + A3 (T/100 K)² + A4 (T/100 K)³                            |
//! | `quartic`      | Cp/R = a0 + a1 T + a2 T² + a3 T³ + a4 T⁴                                            |
//! | `nine`         | Cp/R = a1 T⁻² + a2 T⁻¹ + a3 + a4 T + a5 T² + a6 T³ + a7 T⁴, constants b1 and b2     |
//! | `powers`       | Cp = Σ c Tⁿ, each with its own real exponent n                                      |
//!
//! The surprise: a form says nothing about its zero of H and S unless it has constants of its own; where it has none,
//! [`anchored`] sets them from the enthalpy and entropy at one temperature.

use crate::num::math;
use crate::num::powers::Power;

use super::function::Interval;

/// A published form.
#[derive(Debug)]
pub struct Form {
    /// As a file names it.
    pub word: &'static str,
    pub equation: &'static str,
    /// Names of the coefficients with their powers of T/`scale_k`.
    pub terms: &'static [(&'static str, f64)],
    /// Names of the constants of integration of H and S, where the form has them. In units of the coefficients times
    /// `scale_k` kelvin, and in units of the coefficients.
    pub constants: Option<(&'static str, &'static str)>,
    /// K
    pub scale_k: f64,
    /// Whether it gives Cp/R.
    pub over_r: bool,
}

pub const FORMS: &[Form] = &[
    Form {
        word: "maier-kelley",
        equation: "Cp = a + b T + c T^-2 + d T^2",
        terms: &[("a", 0.0), ("b", 1.0), ("c", -2.0), ("d", 2.0)],
        constants: None,
        scale_k: 1.0,
        over_r: false,
    },
    Form {
        word: "five-term",
        equation: "Cp = a1 + a2 T + a3 T^-2 + a4 T^-0.5 + a5 T^2",
        terms: &[("a1", 0.0), ("a2", 1.0), ("a3", -2.0), ("a4", -0.5), ("a5", 2.0)],
        constants: None,
        scale_k: 1.0,
        over_r: false,
    },
    Form {
        word: "shomate",
        equation: "Cp = A + B t + C t^2 + D t^3 + E t^-2, t = T/1000 K",
        terms: &[("A", 0.0), ("B", 1.0), ("C", 2.0), ("D", 3.0), ("E", -2.0)],
        constants: Some(("F", "G")),
        scale_k: 1000.0,
        over_r: false,
    },
    Form {
        word: "cubic-T100",
        equation: "Cp/R = A1 + A2 (T/100 K) + A3 (T/100 K)^2 + A4 (T/100 K)^3",
        terms: &[("A1", 0.0), ("A2", 1.0), ("A3", 2.0), ("A4", 3.0)],
        constants: None,
        scale_k: 100.0,
        over_r: true,
    },
    Form {
        word: "quartic",
        equation: "Cp/R = a0 + a1 T + a2 T^2 + a3 T^3 + a4 T^4",
        terms: &[("a0", 0.0), ("a1", 1.0), ("a2", 2.0), ("a3", 3.0), ("a4", 4.0)],
        constants: None,
        scale_k: 1.0,
        over_r: true,
    },
    Form {
        word: "nine",
        equation: "Cp/R = a1 T^-2 + a2 T^-1 + a3 + a4 T + a5 T^2 + a6 T^3 + a7 T^4",
        terms: &[("a1", -2.0), ("a2", -1.0), ("a3", 0.0), ("a4", 1.0), ("a5", 2.0), ("a6", 3.0), ("a7", 4.0)],
        constants: Some(("b1", "b2")),
        scale_k: 1.0,
        over_r: true,
    },
];

/// The form whose terms bring their own exponents.
pub const POWERS: &str = "powers";

impl Form {
    pub fn named(word: &str) -> Option<&'static Form> {
        FORMS.iter().find(|form| form.word == word)
    }

    /// The range with these coefficients, in the order of `terms`, and with the constants where they are given.
    pub fn interval(&self, range_k: (f64, f64), coefficients: &[f64], constants: Option<(f64, f64)>) -> Interval {
        let powers = self.terms.iter().zip(coefficients).map(|(&(_, exponent), &factor)| Power { exponent, factor });
        let mut interval = of_powers(range_k, powers, self.scale_k);
        if let Some((of_h, of_s)) = constants {
            let constant_term: f64 =
                self.terms.iter().zip(coefficients).filter(|(t, _)| t.1 == 0.0).map(|(_, c)| c).sum();
            // A ln(T/scale) of the form is A ln T - A ln(scale).
            interval.b = [of_h * self.scale_k, of_s - constant_term * math::ln(self.scale_k)];
        }
        interval
    }
}

/// A range from powers of T/`scale_k`, without constants of integration.
pub fn of_powers(range_k: (f64, f64), powers: impl IntoIterator<Item = Power>, scale_k: f64) -> Interval {
    let (mut a, mut more) = ([0.0; 7], Vec::new());
    for Power { exponent, factor } in powers {
        let factor =
            if scale_k == 1.0 { factor } else { factor * Power { exponent, factor: 1.0 }.value(1.0 / scale_k) };
        let place = exponent + 2.0;
        if place.fract() == 0.0 && (0.0..7.0).contains(&place) {
            a[place as usize] += factor;
        } else if factor != 0.0 {
            more.push(Power { exponent, factor });
        }
    }
    Interval { t_min: range_k.0, t_max: range_k.1, a, b: [0.0; 2], more: more.into() }
}

impl Interval {
    /// All its terms.
    pub fn powers(&self) -> impl Iterator<Item = Power> {
        let seven = (0..7).map(|place| Power { exponent: place as f64 - 2.0, factor: self.a[place] });
        seven.chain(self.more.iter().copied())
    }

    /// H and S at a temperature, in the unit of the coefficients times K and in that unit, by the plain sum of powers.
    pub fn h_and_s(&self, t_k: f64) -> (f64, f64) {
        let h: f64 = self.powers().map(|power| power.integral(t_k)).sum();
        let s: f64 = self.powers().map(|power| power.integral_over_x(t_k)).sum();
        (h + self.b[0], s + self.b[1])
    }
}

/// The ranges with their constants set so that H and S have these values at `t_k`, in the unit of the coefficients times
/// kelvin and in that unit, and join at the ends. `t_k` must lie within one of them.
pub fn anchored(mut intervals: Vec<Interval>, t_k: f64, h: f64, s: f64) -> Vec<Interval> {
    let Some(home) = intervals.iter().position(|one| one.t_min <= t_k && t_k <= one.t_max) else { return intervals };
    let set = |interval: &mut Interval, t_k: f64, (h, s): (f64, f64)| {
        let (h_now, s_now) = interval.h_and_s(t_k);
        interval.b = [interval.b[0] + (h - h_now), interval.b[1] + (s - s_now)];
    };
    set(&mut intervals[home], t_k, (h, s));
    for at in home + 1..intervals.len() {
        let join = intervals[at].t_min;
        let met = intervals[at - 1].h_and_s(join);
        set(&mut intervals[at], join, met);
    }
    for at in (0..home).rev() {
        let join = intervals[at].t_max;
        let met = intervals[at + 1].h_and_s(join);
        set(&mut intervals[at], join, met);
    }
    intervals
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Cp by the published equation, written out.
    fn cp(interval: &Interval, t_k: f64) -> f64 {
        interval.powers().map(|power| power.value(t_k)).sum()
    }

    /// Composite Simpson rule with 400 steps.
    fn quadrature(f: impl Fn(f64) -> f64, from: f64, to: f64) -> f64 {
        let step = (to - from) / 400.0;
        let at = |n: usize| f(from + n as f64 * step) * if n == 0 || n == 400 { 1.0 } else { [2.0, 4.0][n % 2] };
        (0..=400).map(at).sum::<f64>() * step / 3.0
    }

    fn form(word: &str, range_k: (f64, f64), coefficients: &[f64], constants: Option<(f64, f64)>) -> Interval {
        Form::named(word).unwrap().interval(range_k, coefficients, constants)
    }

    #[test]
    fn each_form_is_its_published_equation() {
        const R: f64 = 8.314_462_618_153_24;
        // PbO(cr), cal_th/(mol K): Perry's Chemical Engineers' Handbook, 8th ed., Table 2-151 (after K. K. Kelley, U.S. Bureau
        // of Mines Bulletin 371, 1934); from a machine-readable copy.
        let lead = form("maier-kelley", (273.0, 544.0), &[10.33, 0.00318, 0.0, 0.0], None);
        assert!((4.184 * cp(&lead, 400.0) - 4.184 * (10.33 + 0.00318 * 400.0)).abs() < 1e-12);
        // Calcite, J/(mol K): Robie, Hemingway, USGS Bulletin 1452 (1978) or 2131 (1995), from memory; Cp at 298.15 K is
        // 83.47 J/(mol K) by the same (from memory). Bound: half a unit of the last digit.
        let calcite =
            form("five-term", (298.15, 1200.0), &[-184.79, 0.32322, -3_688_200.0, 3883.7, -0.000_129_74], None);
        assert_eq!(calcite.more.len(), 1);
        assert!((cp(&calcite, 298.15) - 83.47).abs() < 0.005, "{}", cp(&calcite, 298.15));
        // Methanol(l), Cp/R: Zábranský, Růžička, Majer, Domalski (1996), J. Phys. Chem. Ref. Data Monograph 6, from a
        // machine-readable copy; the CRC Handbook (2014) has 81.1 J/(mol K) at 298.15 K. Bound: 0.2 % between the two.
        let methanol = form("cubic-T100", (180.0, 300.0), &[10.2627, -1.46311, 0.024_761_5, 0.137_299], None);
        assert!((R * cp(&methanol, 298.15) - 81.1).abs() < 0.16, "{}", R * cp(&methanol, 298.15));
        // Chloroethane(g), Cp/R: Poling, Prausnitz, O'Connell, The Properties of Gases and Liquids, 5th ed. (2001), Appendix
        // A, from a machine-readable copy.
        let c = [3.029, 0.009_885, 2.967e-05, -4.55e-08, 1.871e-11];
        let chloroethane = form("quartic", (200.0, 1000.0), &c, None);
        let t: f64 = 350.0;
        let by_hand = c[0] + c[1] * t + c[2] * t * t + c[3] * t * t * t + c[4] * t * t * t * t;
        assert!((cp(&chloroethane, t) - by_hand).abs() < 1e-12);
    }

    #[test]
    fn a_form_with_constants_keeps_its_own_zero() {
        // Water(l): Chase, NIST-JANAF Thermochemical Tables, 4th ed. (1998), as a fit (from memory; A to E equal to a
        // machine-readable copy). At 298.15 K: Cp 75.375, S 69.954 J/(mol K), H = -285.8304 kJ/mol within 1.4 J/mol.
        let a_to_e = [-203.606, 1523.29, -3196.413, 2474.455, 3.855_326];
        let water = form("shomate", (298.0, 500.0), &a_to_e, Some((-256.5478, -488.7163)));
        let (h, s) = water.h_and_s(298.15);
        assert!((cp(&water, 298.15) - 75.375).abs() < 0.0005);
        assert!((h - (-285_830.4 + 1.4)).abs() < 0.06, "{h}");
        assert!((s - 69.954).abs() < 0.0005, "{s}");
    }

    #[test]
    fn integrals_agree_with_quadrature_across_a_join_and_meet_the_anchor() {
        let low = of_powers((200.0, 500.0), [(0.0, 30.0), (-0.5, 120.0), (1.3, 1e-3)].map(power), 1.0);
        let high = of_powers((500.0, 900.0), [(-1.0, 900.0), (0.0, 28.0), (5.0, 1e-15), (1.0, 0.01)].map(power), 1.0);
        let both = anchored(vec![low, high], 298.15, -50_000.0, 120.0);
        let (h_0, s_0) = both[0].h_and_s(298.15);
        assert!((h_0 + 50_000.0).abs() < 1e-9 && (s_0 - 120.0).abs() < 1e-12);
        let at = |t: f64| cp(&both[usize::from(t > 500.0)], t);
        let (h, s) = both[1].h_and_s(800.0);
        let by = |f: &dyn Fn(f64) -> f64| quadrature(f, 298.15, 500.0) + quadrature(f, 500.0 + 1e-12, 800.0);
        // Bound: the fourth-order rule over steps of about 1 K, and rounding of sums near 5e4.
        assert!((h + 50_000.0 - by(&at)).abs() < 1e-6, "{h}");
        assert!((s - 120.0 - by(&|t| at(t) / t)).abs() < 1e-9, "{s}");
    }

    fn power((exponent, factor): (f64, f64)) -> Power {
        Power { exponent, factor }
    }
}
