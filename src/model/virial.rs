//! The second virial coefficient of a gas and its derivatives with respect to temperature, in closed form.
//!
//! From a fit on record where it holds, else by corresponding states:
//!
//! B p_c/(R T_c) = f₀(T_r) + ω f₁(T_r),   T_r = T/T_c
//! f₀ = 0.1445 − 0.330/T_r − 0.1385/T_r² − 0.0121/T_r³ − 0.000607/T_r⁸
//! f₁ = 0.0637 + 0.331/T_r² − 0.423/T_r³ − 0.008/T_r⁸
//!
//! | symbol   | unit   | meaning                              |
//! |----------|--------|--------------------------------------|
//! | B        | m³/mol | second virial coefficient            |
//! | T_c, p_c | K, Pa  | critical temperature and pressure    |
//! | ω        | 1      | acentric factor                      |
//!
//! The surprise: the estimate is refused for gases that do not correspond: strongly polar ones (dipole above 1 D; common
//! practice, no source), associating ones and quantum gases. The refusal is a reason in words, kept for the register.
//! Source: C. Tsonopoulos, AIChE J. 20, 263 (1974) (from memory; agrees with fits of measured B within what the tests say).

use std::fmt;

use crate::data::critical::{Apart, CriticalTemperature};
use crate::data::pressure::{Constants, Virial, VirialForm};
use crate::num::math;
use crate::source::Citation;

/// B, dB/dT, d²B/dT² and d³B/dT³, in m³/mol and powers of kelvin.
pub type Derivatives = [f64; 4];

/// Above this a gas counts as strongly polar, debye. Common practice, no source.
const POLAR_DEBYE: f64 = 1.0;
/// Below this reduced temperature measured coefficients of simple gases leave the estimate: benzene by 13 % at 0.53, against
/// the fit of the CRC Handbook.
const LOWEST_REDUCED: f64 = 0.6;

const TSONOPOULOS: &str = "C. Tsonopoulos, AIChE J. 20, 263 (1974)";

/// A coefficient, with where it comes from.
#[derive(Clone, Debug)]
pub struct Second {
    pub at_t: Derivatives,
    /// Whether it was estimated by corresponding states.
    pub estimated: bool,
    /// The fit, or the constants that scale it.
    pub citation: Citation,
}

/// Why no coefficient is at hand.
#[derive(Clone, Debug, PartialEq)]
pub enum NoVirial {
    Quantum,
    Associating,
    Polar {
        debye: f64,
    },
    TooCold {
        t_r: f64,
    },
    /// A constant that corresponding states need.
    Lacks {
        what: &'static str,
    },
}

impl fmt::Display for NoVirial {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            NoVirial::Quantum => f.write_str("a quantum gas does not follow corresponding states"),
            NoVirial::Associating => f.write_str("the vapour associates and does not follow corresponding states"),
            NoVirial::Polar { debye } => {
                write!(f, "with a dipole of {debye} D the gas is too polar for corresponding states")
            }
            NoVirial::TooCold { t_r } => {
                write!(f, "at {t_r:.2} of the critical temperature corresponding states are not to be trusted")
            }
            NoVirial::Lacks { what } => write!(f, "no {what} is on record"),
        }
    }
}

/// B and its derivatives of a gas at `t_k`.
///
/// # Errors
/// No fit holds there, and corresponding states are refused or lack a constant.
pub fn second(constants: &Constants, t_k: f64, r: f64) -> Result<Second, NoVirial> {
    if let Some(fit) = constants.virial.as_ref().filter(|fit| fit.covers(t_k)) {
        return Ok(Second { at_t: fitted(fit, t_k), estimated: false, citation: fit.citation.clone() });
    }
    match &constants.critical {
        Some(critical) => estimated(critical, t_k, r),
        None => Err(NoVirial::Lacks { what: "critical constant" }),
    }
}

/// By the fit; outside its range it means nothing.
pub fn fitted(fit: &Virial, t_k: f64) -> Derivatives {
    match &fit.form {
        VirialForm::InverseTemperature(a) => {
            // With x = T₀/T − 1: dx/dT = −T₀/T².
            let (x, scale) = (298.15 / t_k - 1.0, 298.15 / t_k);
            let mut d = [0.0; 4]; // Derivatives with respect to x.
            for coefficient in a.iter().rev() {
                d = [d[0] * x + coefficient, d[1] * x + d[0], d[2] * x + 2.0 * d[1], d[3] * x + 3.0 * d[2]];
            }
            let s = scale / t_k;
            [
                d[0],
                -d[1] * s,
                (d[2] * scale + 2.0 * d[1]) * s / t_k,
                -(d[3] * scale * scale + 6.0 * d[2] * scale + 6.0 * d[1]) * s / (t_k * t_k),
            ]
        }
        VirialForm::Exponential { a, b, c_k } => {
            let (e, y) = (b * math::exp(c_k / t_k), c_k / t_k);
            let t2 = t_k * t_k;
            [a - e, e * y / t_k, -e * y * (y + 2.0) / t2, e * y * (y * y + 6.0 * y + 6.0) / (t2 * t_k)]
        }
        VirialForm::Powers { terms, t0_k } => powers(terms.iter().copied(), t_k, *t0_k),
    }
}

/// Σ a (T/T₀)^b with its derivatives.
fn powers(terms: impl Iterator<Item = (f64, f64)>, t_k: f64, t0_k: f64) -> Derivatives {
    let mut sum = [0.0; 4];
    for (a, b) in terms {
        let mut term = a * math::pow(t_k / t0_k, b);
        for (order, slot) in sum.iter_mut().enumerate() {
            *slot += term;
            term *= (b - order as f64) / t_k;
        }
    }
    sum
}

/// By corresponding states.
///
/// # Errors
/// The gas does not correspond, or a constant is missing.
pub fn estimated(critical: &CriticalTemperature, t_k: f64, r: f64) -> Result<Second, NoVirial> {
    match critical.apart {
        Some(Apart::Quantum) => return Err(NoVirial::Quantum),
        Some(Apart::Associating) => return Err(NoVirial::Associating),
        None => {}
    }
    match &critical.dipole_debye {
        None => return Err(NoVirial::Lacks { what: "dipole moment" }),
        Some((debye, _)) if *debye > POLAR_DEBYE => return Err(NoVirial::Polar { debye: *debye }),
        Some(_) => {}
    }
    let p_pa = critical.p_pa.ok_or(NoVirial::Lacks { what: "critical pressure" })?;
    let (omega, _) = critical.acentric.as_ref().ok_or(NoVirial::Lacks { what: "acentric factor" })?;
    if t_k < LOWEST_REDUCED * critical.t_k {
        return Err(NoVirial::TooCold { t_r: t_k / critical.t_k });
    }
    let terms = [
        (0.1445 + 0.0637 * omega, 0.0),
        (-0.330, -1.0),
        (-0.1385 + 0.331 * omega, -2.0),
        (-0.0121 - 0.423 * omega, -3.0),
        (-0.000_607 - 0.008 * omega, -8.0),
    ];
    let scale = r * critical.t_k / p_pa;
    let at_t = powers(terms.iter().map(|(a, b)| (a * scale, *b)), t_k, critical.t_k);
    let obtained =
        format!("from memory; critical constants: {}, {}", critical.citation.source, critical.citation.obtained);
    Ok(Second { at_t, estimated: true, citation: Citation::new(TSONOPOULOS, obtained) })
}

/// The vapour pressure by which a gas counts as saturated where no equation of its liquid is on record: the straight line of
/// ln p over 1/T through the critical point and the point that defines the acentric factor, p_r = 10^(−1−ω) at T_r = 0.7.
pub fn saturation_estimate(critical: &CriticalTemperature, t_k: f64) -> Option<f64> {
    let (p_pa, (omega, _)) = (critical.p_pa?, critical.acentric.as_ref()?);
    if t_k >= critical.t_k {
        return None;
    }
    let lg = -(7.0 / 3.0) * (1.0 + omega) * (critical.t_k / t_k - 1.0);
    Some(p_pa * math::exp(lg * std::f64::consts::LN_10))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::data::catalog::Catalog;

    const R: f64 = 8.314_462_618_153_24;

    fn constants(id: &str) -> Constants {
        Catalog::shipped().find(id).unwrap().pressure.clone()
    }

    #[test]
    fn derivatives_are_those_of_differences() {
        for id in ["CO2(g)", "O2(g)", "H2(g)", "benzene(g)", "H2O(g)", "NH3(g)", "SF6(g)", "propane(g)", "C2H4(g)"] {
            let at = |t: f64| second(&constants(id), t, R).unwrap().at_t;
            let (t, h) = (390.0, 0.02);
            let (below, here, above) = (at(t - h), at(t), at(t + h));
            for order in 1..4 {
                let difference = (above[order - 1] - below[order - 1]) / (2.0 * h);
                // Bound: h²/6 of the derivative two orders on, some (10/T)² of this one, and rounding 1e-16/h.
                let allowed = 1e-6 * difference.abs() + 1e-16 * here[order - 1].abs() / h;
                assert!((here[order] - difference).abs() <= allowed, "{id} {order}: {} {difference}", here[order]);
            }
        }
    }

    #[test]
    fn the_estimate_comes_near_the_fits_of_gases_that_correspond() {
        // Against the shipped fits of measured coefficients. Bound: 10 cm3/mol, or 5 % where that is more, is what the source of
        // the estimate claims of simple gases (from memory).
        for (id, t) in [
            ("N2(g)", 298.15),
            ("O2(g)", 298.15),
            ("Ar(g)", 298.15),
            ("CO2(g)", 298.15),
            ("CH4(g)", 298.15),
            ("C2H6(g)", 298.15),
            ("CO(g)", 298.15),
            ("benzene(g)", 400.0),
            ("CO2(g)", 600.0),
        ] {
            let constants = constants(id);
            let fit = fitted(constants.virial.as_ref().unwrap(), t)[0];
            let estimate = estimated(constants.critical.as_ref().unwrap(), t, R).unwrap().at_t[0];
            assert!((estimate - fit).abs() < 1e-5_f64.max(0.05 * fit.abs()), "{id}: {estimate} {fit}");
        }
    }

    #[test]
    fn what_does_not_correspond_is_refused_with_the_reason() {
        let refused = |id: &str, t| second(&constants(id), t, R).unwrap_err();
        assert_eq!(refused("He(g)", 300.0), NoVirial::Quantum);
        assert_eq!(refused("H2(g)", 700.0), NoVirial::Quantum); // Beyond its fit.
        assert_eq!(refused("methanol(g)", 400.0), NoVirial::Associating);
        assert_eq!(refused("SO2(g)", 400.0), NoVirial::Polar { debye: 1.63 });
        assert!(matches!(refused("C2H4(g)", 150.0), NoVirial::TooCold { .. }));
        assert!(matches!(refused("HCN(g)", 300.0), NoVirial::Lacks { .. }));
        assert!(refused("methanol(g)", 400.0).to_string().contains("associates"));
    }

    #[test]
    fn the_saturation_estimate_meets_vapour_pressures() {
        // Normal boiling points: n-hexane 341.87 K, benzene 353.2 K (Poling, Prausnitz, O'Connell, 5th ed., Antoine). Bound:
        // the line leaves measured vapour pressures by some 10 % between 0.6 and 1 of the critical temperature.
        for (id, t) in [("n-hexane(g)", 341.87), ("benzene(g)", 353.2)] {
            let p = saturation_estimate(constants(id).critical.as_ref().unwrap(), t).unwrap();
            assert!((p / 101_325.0 - 1.0).abs() < 0.1, "{id}: {p}");
        }
    }
}
