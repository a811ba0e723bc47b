//! Heat capacity, enthalpy and entropy from sums of powers of T, in closed form.
//!
//! The seven powers of the nine-constant form, which nearly every record has and no more:
//!
//! Cp/R = a₁T⁻² + a₂T⁻¹ + a₃ + a₄T + a₅T² + a₆T³ + a₇T⁴
//! H/R  = −a₁T⁻¹ + a₂ ln T + a₃T + a₄T²/2 + a₅T³/3 + a₆T⁴/4 + a₇T⁵/5 + b₁     (zero: elements at 298.15 K)
//! S/R  = −a₁T⁻²/2 − a₂T⁻¹ + a₃ ln T + a₄T + a₅T²/2 + a₆T³/3 + a₇T⁴/4 + b₂
//!
//! and any further power c Tⁿ of another published form, by its integrals (`num::powers`).
//!
//! | symbol | unit        | meaning                                                    |
//! |--------|-------------|------------------------------------------------------------|
//! | T      | K           | temperature, within the function's range                   |
//! | R      | J/(mol K)   | the gas constant of the source, or the unit of its Cp      |
//! | Cp, S  | J/(mol K)   | standard molar heat capacity and entropy, p° = 1 bar       |
//! | H      | J/mol       | standard enthalpy, equal to ΔfH° at 298.15 K               |
//!
//! The surprise: R is the source's own (8.314510 in the report), not today's, since the constants were fitted with it.
//! Source: NASA/TP-2002-211556, equations (1) to (3); the integrals of a power are elementary.

use crate::data::function::{Function, Interval};
use crate::num::math;

/// The temperature at which formation data are tabulated, in kelvin.
pub const T_REFERENCE: f64 = 298.15;

/// Cp, H and S of one substance at one temperature, in J/(mol K), J/mol and J/(mol K).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Functions {
    pub cp: f64,
    pub h: f64,
    pub s: f64,
}

impl Functions {
    /// Gibbs energy on the same zero as H, in J/mol.
    pub fn g(&self, t_k: f64) -> f64 {
        self.h - t_k * self.s
    }
}

/// Cp, H and S at `t_k`, which must lie within the function's range ([`Function::covers`]).
pub fn evaluate(function: &Function, t_k: f64) -> Functions {
    within(interval_at(&function.intervals, t_k), function.r_of_source, t_k)
}

/// What a function jumps by where two of its intervals join.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Jump {
    pub t_k: f64,
    /// J/mol
    pub h: f64,
    /// J/(mol K)
    pub s: f64,
}

/// The joins of a function, from low to high.
pub fn jumps(function: &Function) -> impl Iterator<Item = Jump> {
    function.intervals.windows(2).map(|pair| {
        let (t_k, r) = (pair[0].t_max, function.r_of_source);
        let (below, above) = (within(&pair[0], r, t_k), within(&pair[1], r, t_k));
        Jump { t_k, h: above.h - below.h, s: above.s - below.s }
    })
}

fn within(interval: &Interval, r: f64, t_k: f64) -> Functions {
    let (t, ln_t) = (t_k, math::ln(t_k));
    let (mut cp, mut h, mut s) = (cp_of(interval)(t), h_of(interval)(t, ln_t), s_of(interval)(t, ln_t));
    for power in &interval.more {
        cp += power.value(t);
        h += power.integral(t);
        s += power.integral_over_x(t);
    }
    Functions { cp: r * cp, h: r * h, s: r * s }
}

/// Cp/R from the seven powers of an interval. What depends on the interval alone is worked out here, once for many T.
pub(super) fn cp_of(interval: &Interval) -> impl Fn(f64) -> f64 + use<> {
    let a = interval.a;
    move |t| {
        let inverse = 1.0 / t;
        a[0] * inverse * inverse + a[1] * inverse + horner(t, [a[2], a[3], a[4], a[5], a[6]])
    }
}

/// H/R from the seven powers of an interval, of T and ln T.
pub(super) fn h_of(interval: &Interval) -> impl Fn(f64, f64) -> f64 + use<> {
    let (a, b) = (interval.a, interval.b);
    let powers = [a[2], a[3] / 2.0, a[4] / 3.0, a[5] / 4.0, a[6] / 5.0];
    move |t, ln_t| -a[0] * (1.0 / t) + a[1] * ln_t + t * horner(t, powers) + b[0]
}

/// S/R from the seven powers of an interval, of T and ln T.
pub(super) fn s_of(interval: &Interval) -> impl Fn(f64, f64) -> f64 + use<> {
    let (a, b) = (interval.a, interval.b);
    let (half, powers) = (-a[0] / 2.0, [a[3], a[4] / 2.0, a[5] / 3.0, a[6] / 4.0, 0.0]);
    move |t, ln_t| {
        let inverse = 1.0 / t;
        half * inverse * inverse - a[1] * inverse + a[2] * ln_t + t * horner(t, powers) + b[1]
    }
}

/// The interval that holds `t_k`; a join belongs to the lower one, where both agree within the source's rounding.
fn interval_at(intervals: &[Interval], t_k: f64) -> &Interval {
    let at = intervals.partition_point(|interval| interval.t_max < t_k);
    &intervals[at.min(intervals.len() - 1)]
}

/// dCp/dT at `t_k`, in J/(mol K²); the same range as [`evaluate`].
pub fn cp_slope(function: &Function, t_k: f64) -> f64 {
    let interval = interval_at(&function.intervals, t_k);
    let a = &interval.a;
    let inverse = 1.0 / t_k;
    let negative = -(2.0 * a[0] * inverse + a[1]) * inverse * inverse;
    let mut slope = negative + horner(t_k, [a[3], 2.0 * a[4], 3.0 * a[5], 4.0 * a[6], 0.0]);
    for power in &interval.more {
        slope += power.slope(t_k);
    }
    function.r_of_source * slope
}

fn horner(t: f64, c: [f64; 5]) -> f64 {
    c[0] + t * (c[1] + t * (c[2] + t * (c[3] + t * c[4])))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::data::dataset::DatasetId;
    use crate::data::form;
    use crate::data::function::{Stated, Zero};
    use crate::num::powers::Power;
    use crate::source::Citation;

    /// The sum of powers as it stands in a file, with nothing taken out of the general list.
    fn of(interval: Interval) -> Function {
        Function {
            dataset: DatasetId::new("invented"),
            id: "X(cr)".into(),
            name: "invented".into(),
            formula: "X".into(),
            cas: None,
            t_min: interval.t_min,
            t_max: interval.t_max,
            intervals: [interval].into(),
            r_of_source: 8.314_51,
            dhf_298: 0.0,
            zero: Zero { enthalpy: true, entropy: true },
            stated: Stated::default(),
            h298_minus_h0: None,
            warnings: Box::default(),
            is_reference_element: false,
            original_references: "".into(),
            p_standard_pa: 1e5,
            citation: Citation::new("invented for this test", ""),
        }
    }

    #[test]
    fn further_powers_are_added_as_the_seven_are() {
        // The same invented sum twice: with the powers -0.5 and 6 in the list, and the seven by their own places.
        let all = [(-2.0, 1e4), (-1.0, 50.0), (0.0, 3.0), (1.0, 1e-3), (4.0, 1e-13), (-0.5, 20.0), (6.0, 1e-19)];
        let powers = all.map(|(exponent, factor)| Power { exponent, factor });
        let function = of(form::of_powers((200.0, 1500.0), powers, 1.0));
        for t_k in [200.0, 298.15, 777.7, 1500.0] {
            let at = evaluate(&function, t_k);
            let (h, s) = function.intervals[0].h_and_s(t_k);
            let cp: f64 = powers.iter().map(|power| power.value(t_k)).sum();
            let slope: f64 = powers.iter().map(|power| power.slope(t_k)).sum();
            // Bound: the two add in another order.
            let close = |got: f64, want: f64| assert!((got - want).abs() <= 1e-13 * want.abs(), "{got} {want}");
            close(at.cp, 8.314_51 * cp);
            close(at.h, 8.314_51 * h);
            close(at.s, 8.314_51 * s);
            close(cp_slope(&function, t_k), 8.314_51 * slope);
        }
    }
}
