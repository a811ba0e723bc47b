//! H(T) − H(298.15 K) of one substance by a second route: quadrature of Cp over pieces of the test's own, and the recorded
//! enthalpies of the transitions that lie between.
//!
//! Nothing here calls what the program evaluates or integrates with; only the constants of the records are shared. The
//! surprise: neighbouring intervals of one function are printed with enthalpies that differ by up to 1 J/mol where they join,
//! which no integral of Cp can see. [`Heating::joins`] is what those steps add up to, from the constants themselves.

use std::sync::Arc;

use hessbook::data::catalog::Catalog;
use hessbook::data::function::{Function, Interval};
use hessbook::data::substance::Substance;
use hessbook::data::transition::Transition;

pub const T_0: f64 = 298.15;

/// Cp/R = a₁T⁻² + a₂T⁻¹ + a₃ + … + a₇T⁴ (NASA/TP-2002-211556, equation 1), term by term.
pub fn cp_over_r(interval: &Interval, t_k: f64) -> f64 {
    interval.a.iter().zip(-2..).map(|(a, power): (&f64, i32)| a * t_k.powi(power)).sum()
}

/// The same integrated, H/R (equation 2), term by term.
fn h_over_r(interval: &Interval, t_k: f64) -> f64 {
    let [a1, a2, a3, a4, a5, a6, a7] = interval.a;
    let powers = [a3, a4 / 2.0, a5 / 3.0, a6 / 4.0, a7 / 5.0];
    let sum: f64 = powers.iter().zip(1..).map(|(a, power): (&f64, i32)| a * t_k.powi(power)).sum();
    -a1 / t_k + a2 * t_k.ln() + sum + interval.b[0]
}

/// Abscissae and weights of the Gauss–Legendre rule with ten points on [−1, 1], the positive half: Abramowitz and Stegun,
/// Handbook of Mathematical Functions, table 25.4 (from memory; the test below holds them to the moments they must have).
const GAUSS: [(f64, f64); 5] = [
    (0.148_874_338_981_631_21, 0.295_524_224_714_752_87),
    (0.433_395_394_129_247_2, 0.269_266_719_309_996_36),
    (0.679_409_568_299_024_4, 0.219_086_362_515_982_04),
    (0.865_063_366_688_984_5, 0.149_451_349_150_580_6),
    (0.973_906_528_517_171_7, 0.066_671_344_308_688_14),
];

pub fn gauss(from: f64, to: f64, f: impl Fn(f64) -> f64) -> f64 {
    let (middle, half) = (0.5 * (from + to), 0.5 * (to - from));
    half * GAUSS.iter().map(|(x, w)| w * (f(middle - half * x) + f(middle + half * x))).sum::<f64>()
}

/// What one phase takes up between two temperatures, J/mol.
#[derive(Clone, Copy, Debug, Default)]
pub struct Heating {
    /// ∫Cp dT
    pub integral: f64,
    /// The steps at the joins of its intervals, which belong to the record and not to its heat capacity.
    pub joins: f64,
    pub joins_passed: usize,
}

/// `cuts` are further ends of pieces. A piece is no wider than 1.1 to 1 in T, where ten points integrate every power of the
/// function to the last bit: the error of the rule falls with (0.05)²⁰.
pub fn heating(function: &Function, from_k: f64, to_k: f64, cuts: &[f64]) -> Heating {
    assert!(from_k <= to_k, "{from_k} K and {to_k} K");
    let r = function.r_of_source;
    let mut out = Heating::default();
    for (at, interval) in function.intervals.iter().enumerate() {
        let (from, to) = (interval.t_min.max(from_k), interval.t_max.min(to_k));
        if from < to {
            let mut ends: Vec<f64> = cuts.iter().copied().filter(|cut| from < *cut && *cut < to).collect();
            ends.push(to);
            ends.sort_by(f64::total_cmp);
            let mut start = from;
            for end in ends {
                while start < end {
                    let stop = (1.1 * start).min(end);
                    out.integral += r * gauss(start, stop, |t| cp_over_r(interval, t));
                    start = stop;
                }
            }
        }
        // The program gives a join to the lower interval, so the step is taken where T lies above it.
        if let Some(next) = function.intervals.get(at + 1)
            && from_k <= interval.t_max
            && interval.t_max < to_k
        {
            out.joins += r * (h_over_r(next, interval.t_max) - h_over_r(interval, interval.t_max));
            out.joins_passed += 1;
        }
    }
    out
}

/// The transition out of a phase, where one is recorded, and the phase it leads to.
pub fn next(data: &Catalog, phase: &Substance) -> Option<(Arc<Transition>, Arc<Substance>)> {
    let leads = |transition: &&Arc<Transition>| *transition.from == *phase.id() && transition.from != transition.to;
    let transition = data.transitions_of(phase).iter().find(leads)?.clone();
    let to = data.find(&transition.to).unwrap();
    Some((transition, to))
}

/// H(T) − H(298.15 K), over changes of phase: the heatings and the transitions passed.
pub fn increment(
    data: &Catalog,
    written: &Arc<Substance>,
    t_k: f64,
    cuts: &[f64],
) -> (Vec<Heating>, Vec<Arc<Transition>>) {
    let (mut heatings, mut passed) = (Vec::new(), Vec::new());
    let (mut phase, mut from_k) = (written.clone(), T_0);
    loop {
        let function = phase.function.clone().unwrap();
        if t_k <= function.t_max {
            if t_k < from_k {
                let cooling = heating(&function, t_k, from_k, cuts);
                heatings.push(Heating { integral: -cooling.integral, joins: -cooling.joins, ..cooling });
            } else {
                heatings.push(heating(&function, from_k, t_k, cuts));
            }
            return (heatings, passed);
        }
        let (transition, to) = next(data, &phase).unwrap_or_else(|| panic!("{} ends below {t_k} K", phase.id()));
        heatings.push(heating(&function, from_k, transition.t_k, cuts));
        from_k = transition.t_k;
        passed.push(transition);
        phase = to;
    }
}

#[test]
fn the_rule_integrates_every_power_it_is_made_for() {
    // A rule with ten points is exact to the power 19. Bound: rounding of a sum of ten terms.
    for power in 0..20 {
        let got = gauss(0.0, 1.0, |x| x.powi(power));
        assert!((got - 1.0 / f64::from(power + 1)).abs() < 4e-16, "x^{power}: {got}");
    }
}
