//! Coverage factors: two-sided quantiles of the normal distribution and of Student's t.
//!
//! k(p) solves P(|X| ≤ k) = p. For t with ν degrees of freedom (any real ν > 0) the tail is the incomplete beta function,
//! 1 − p = I(ν/(ν + k²); ν/2, 1/2), by its continued fraction; the equation is solved by Newton's method in ln k, where the
//! tail is concave, so that it converges from every start.
//! Source: M. Abramowitz, I. A. Stegun, Handbook of Mathematical Functions, 1964, 26.2.23 (start), 26.5.8 (continued
//! fraction), 26.7.1 and 26.7.5 (t and its expansion for large ν) (from memory).

use std::f64::consts::{FRAC_1_SQRT_2, PI};

use crate::num::math;

/// Above this the expansion in 1/ν is exact to the last digits, while the continued fraction grows long.
const LARGE: f64 = 1e5;

/// k with P(|Z| ≤ k) = `level` for the standard normal distribution. `level` is between 0 and 1, both excluded.
pub fn normal_factor(level: f64) -> f64 {
    let tail = 1.0 - level;
    // The start is within 4.5e-4 of the root, and each step of Halley's method triples the digits.
    let t = (-2.0 * math::ln(0.5 * tail)).sqrt();
    let mut k =
        t - (2.515_517 + t * (0.802_853 + t * 0.010_328)) / (1.0 + t * (1.432_788 + t * (0.189_269 + t * 0.001_308)));
    for _ in 0..3 {
        let density = (2.0 / PI).sqrt() * math::exp(-0.5 * k * k);
        let step = (math::erfc(k * FRAC_1_SQRT_2) - tail) / density;
        k += step / (1.0 - 0.5 * k * step);
    }
    k.max(0.0)
}

/// k with P(|T| ≤ k) = `level` for Student's t with `dof` degrees of freedom. `level` is between 0 and 1, both excluded;
/// `dof` is positive.
pub fn student_factor(level: f64, dof: f64) -> f64 {
    let z = normal_factor(level);
    if z == 0.0 {
        return 0.0;
    }
    if dof > LARGE {
        let (square, over) = (z * z, 1.0 / dof);
        let second = (3.0 + square * (16.0 + square * 5.0)) / 96.0;
        let third = (-15.0 + square * (17.0 + square * (19.0 + square * 3.0))) / 384.0;
        return z + z * over * ((1.0 + square) / 4.0 + over * (second + over * third));
    }
    let ln_tail = math::ln(1.0 - level);
    let mut ln_k = math::ln(z);
    for _ in 0..200 {
        let k = math::exp(ln_k);
        let tail = student_tail(k, dof);
        let slope = -2.0 * k * student_density(k, dof) / tail;
        let step = (math::ln(tail) - ln_tail) / slope;
        ln_k -= step;
        if step.abs() <= 4.0 * f64::EPSILON {
            break;
        }
    }
    math::exp(ln_k)
}

/// P(|T| > t), t > 0.
fn student_tail(t: f64, dof: f64) -> f64 {
    let (a, b) = (0.5 * dof, 0.5);
    let (x, rest) = (dof / (dof + t * t), t * t / (dof + t * t));
    // x^a (1 − x)^b / B(a, b), shared by both forms; x^a from ln(1 + t²/ν), since x itself is near 1 for large ν.
    let front = math::exp(ln_gamma_step(a) - a * math::ln_1p(t * t / dof)) * (rest / PI).sqrt();
    if x < (a + 1.0) / (a + b + 2.0) {
        front * continued_fraction(x, a, b) / a
    } else {
        1.0 - front * continued_fraction(rest, b, a) / b
    }
}

fn student_density(t: f64, dof: f64) -> f64 {
    let ln_power = -0.5 * (dof + 1.0) * math::ln_1p(t * t / dof);
    math::exp(ln_gamma_step(0.5 * dof) + ln_power) / (dof * PI).sqrt()
}

/// ln[Γ(a + 1/2)/Γ(a)], without the cancellation of two large logarithms.
fn ln_gamma_step(a: f64) -> f64 {
    if a < 30.0 {
        return math::ln_gamma(a + 0.5) - math::ln_gamma(a);
    }
    // Asymptotic series; at a = 30 the first term left out is below 1e-16.
    let (over, square) = (1.0 / a, 1.0 / (a * a));
    0.5 * math::ln(a) + over * (-1.0 / 8.0 + square * (1.0 / 192.0 + square * (-1.0 / 640.0 + square * 17.0 / 14336.0)))
}

/// The continued fraction of the incomplete beta function, by Lentz's method; converges fast for x < (a + 1)/(a + b + 2).
fn continued_fraction(x: f64, a: f64, b: f64) -> f64 {
    let away_from_zero = |y: f64| if y.abs() < 1e-300 { 1e-300 } else { y };
    let mut c = 1.0;
    let mut d = 1.0 / away_from_zero(1.0 - (a + b) * x / (a + 1.0));
    let mut value = d;
    for m in 1..20_000 {
        let m = f64::from(m);
        let even = m * (b - m) * x / ((a + 2.0 * m - 1.0) * (a + 2.0 * m));
        d = 1.0 / away_from_zero(1.0 + even * d);
        c = away_from_zero(1.0 + even / c);
        value *= d * c;
        let odd = -(a + m) * (a + b + m) * x / ((a + 2.0 * m) * (a + 2.0 * m + 1.0));
        d = 1.0 / away_from_zero(1.0 + odd * d);
        c = away_from_zero(1.0 + odd / c);
        let factor = d * c;
        value *= factor;
        if (factor - 1.0).abs() <= f64::EPSILON {
            break;
        }
    }
    value
}

#[cfg(test)]
mod tests {
    use super::*;

    /// JCGM 100:2008, table G.2 (from memory): degrees of freedom, then t for p = 68.27, 90, 95, 95.45, 99 and 99.73 %.
    const TABLE_G2: [(f64, [f64; 6]); 17] = [
        (1.0, [1.84, 6.31, 12.71, 13.97, 63.66, 235.80]),
        (2.0, [1.32, 2.92, 4.30, 4.53, 9.92, 19.21]),
        (3.0, [1.20, 2.35, 3.18, 3.31, 5.84, 9.22]),
        (4.0, [1.14, 2.13, 2.78, 2.87, 4.60, 6.62]),
        (5.0, [1.11, 2.02, 2.57, 2.65, 4.03, 5.51]),
        (6.0, [1.09, 1.94, 2.45, 2.52, 3.71, 4.90]),
        (7.0, [1.08, 1.89, 2.36, 2.43, 3.50, 4.53]),
        (8.0, [1.07, 1.86, 2.31, 2.37, 3.36, 4.28]),
        (9.0, [1.06, 1.83, 2.26, 2.32, 3.25, 4.09]),
        (10.0, [1.05, 1.81, 2.23, 2.28, 3.17, 3.96]),
        (16.0, [1.03, 1.75, 2.12, 2.17, 2.92, 3.54]),
        (18.0, [1.03, 1.73, 2.10, 2.15, 2.88, 3.48]),
        (20.0, [1.03, 1.72, 2.09, 2.13, 2.85, 3.42]),
        (25.0, [1.02, 1.71, 2.06, 2.11, 2.79, 3.33]),
        (50.0, [1.01, 1.68, 2.01, 2.05, 2.68, 3.16]),
        (100.0, [1.005, 1.660, 1.984, 2.025, 2.626, 3.077]),
        (1e9, [1.000, 1.645, 1.960, 2.000, 2.576, 3.000]),
    ];

    #[test]
    fn factors_are_those_of_table_g2() {
        // The columns 68.27, 95.45 and 99.73 % are, as the table's note says, those of 1, 2 and 3 standard deviations.
        let normal = |k: f64| 1.0 - math::erfc(k * FRAC_1_SQRT_2);
        let levels = [normal(1.0), 0.90, 0.95, normal(2.0), 0.99, normal(3.0)];
        let misses: Vec<String> = TABLE_G2
            .iter()
            .flat_map(|(dof, row)| levels.iter().zip(row).map(move |(level, want)| (*dof, *level, *want)))
            .filter(|&(dof, level, want)| {
                // Half a unit of the last digit printed: two decimals, three from 100 degrees of freedom on.
                let digit = if dof < 100.0 { 0.01 } else { 0.001 };
                (student_factor(level, dof) - want).abs() > 0.5 * digit + 1e-9
            })
            .map(|(dof, level, want)| format!("t({level}, {dof}) = {}, printed {want}", student_factor(level, dof)))
            .collect();
        assert!(misses.is_empty(), "{}", misses.join("\n"));
    }

    #[test]
    fn factors_agree_with_the_closed_forms_of_one_and_two_degrees_of_freedom() {
        // ν = 1: p = (2/π) arctan k; ν = 2: p = k/√(2 + k²). Bound: 1 − p is what is solved for, and its last bit moves k by
        // about ε/(1 − p).
        for level in [0.01, 0.3, 0.5, 0.9, 0.95, 0.99, 0.9973, 0.999_99] {
            let allowed = 8.0 * f64::EPSILON / (1.0 - level) + 1e-13;
            let one = math::tan(0.5 * PI * level);
            let two = level * (2.0 / (1.0 - level * level)).sqrt();
            assert!((student_factor(level, 1.0) / one - 1.0).abs() < allowed, "{level}");
            assert!((student_factor(level, 2.0) / two - 1.0).abs() < allowed, "{level}");
        }
    }

    #[test]
    fn the_normal_factor_solves_its_equation_to_the_last_digits() {
        for level in [1e-6, 0.1, 0.5, 0.6827, 0.95, 0.99, 0.999_999, 1.0 - 1e-12] {
            let back = math::erfc(normal_factor(level) * FRAC_1_SQRT_2);
            assert!((back - (1.0 - level)).abs() < 4.0 * f64::EPSILON, "{level}: {back}");
        }
        // Abramowitz and Stegun, table 26.1 (from memory): 1.959963984540054 encloses 95 %.
        assert!((normal_factor(0.95) - 1.959_963_984_540_054).abs() < 1e-14);
    }

    #[test]
    fn the_two_routes_for_many_degrees_of_freedom_meet() {
        // The expansion's next term is below 1e-16 here; the continued fraction has hundreds of steps, each rounded.
        for level in [0.5, 0.95, 0.9973] {
            let (below, above) = (student_factor(level, LARGE), student_factor(level, LARGE * (1.0 + 1e-12)));
            assert!((below / above - 1.0).abs() < 1e-12, "{level}: {below} {above}");
        }
    }
}
