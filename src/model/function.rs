//! Heat capacity, enthalpy and entropy from the nine-constant functions, in closed form.
//!
//! Cp/R = a₁T⁻² + a₂T⁻¹ + a₃ + a₄T + a₅T² + a₆T³ + a₇T⁴
//! H/R  = −a₁T⁻¹ + a₂ ln T + a₃T + a₄T²/2 + a₅T³/3 + a₆T⁴/4 + a₇T⁵/5 + b₁     (zero: elements at 298.15 K)
//! S/R  = −a₁T⁻²/2 − a₂T⁻¹ + a₃ ln T + a₄T + a₅T²/2 + a₆T³/3 + a₇T⁴/4 + b₂
//!
//! | symbol | unit        | meaning                                                    |
//! |--------|-------------|------------------------------------------------------------|
//! | T      | K           | temperature, within the function's range                   |
//! | R      | J/(mol K)   | the gas constant that the source used, 8.314510            |
//! | Cp, S  | J/(mol K)   | standard molar heat capacity and entropy, p° = 1 bar       |
//! | H      | J/mol       | standard enthalpy, equal to ΔfH° at 298.15 K               |
//!
//! The surprise: R is the source's own, not today's, since the constants were fitted with it.
//! Source: NASA/TP-2002-211556, equations (1) to (3).

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
    let interval = interval_at(&function.intervals, t_k);
    let (a, b) = (&interval.a, &interval.b);
    let (t, inverse, ln_t) = (t_k, 1.0 / t_k, math::ln(t_k));
    let cp = a[0] * inverse * inverse + a[1] * inverse + horner(t, [a[2], a[3], a[4], a[5], a[6]]);
    let h =
        -a[0] * inverse + a[1] * ln_t + t * horner(t, [a[2], a[3] / 2.0, a[4] / 3.0, a[5] / 4.0, a[6] / 5.0]) + b[0];
    let s = -a[0] / 2.0 * inverse * inverse - a[1] * inverse
        + a[2] * ln_t
        + t * horner(t, [a[3], a[4] / 2.0, a[5] / 3.0, a[6] / 4.0, 0.0])
        + b[1];
    let r = function.r_of_source;
    Functions { cp: r * cp, h: r * h, s: r * s }
}

/// The interval that holds `t_k`; a join belongs to the lower one, where both agree within the source's rounding.
fn interval_at(intervals: &[Interval], t_k: f64) -> &Interval {
    let at = intervals.partition_point(|interval| interval.t_max < t_k);
    &intervals[at.min(intervals.len() - 1)]
}

/// dCp/dT at `t_k`, in J/(mol K²); the same range as [`evaluate`].
pub fn cp_slope(function: &Function, t_k: f64) -> f64 {
    let a = &interval_at(&function.intervals, t_k).a;
    let inverse = 1.0 / t_k;
    let negative = -(2.0 * a[0] * inverse + a[1]) * inverse * inverse;
    function.r_of_source * (negative + horner(t_k, [a[3], 2.0 * a[4], 3.0 * a[5], 4.0 * a[6], 0.0]))
}

fn horner(t: f64, c: [f64; 5]) -> f64 {
    c[0] + t * (c[1] + t * (c[2] + t * (c[3] + t * c[4])))
}
