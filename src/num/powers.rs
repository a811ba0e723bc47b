//! Sums of powers of one variable, with their integrals in closed form.
//!
//! | of c xⁿ       | is                                                |
//! |---------------|---------------------------------------------------|
//! | ∫ c xⁿ dx     | c xⁿ⁺¹/(n+1); c ln x for n = −1                   |
//! | ∫ c xⁿ⁻¹ dx   | c xⁿ/n; c ln x for n = 0                          |
//!
//! The surprise: the integrals are antiderivatives without a constant, so only their differences have a meaning.

use crate::num::math;

/// c xⁿ, for any real n.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Power {
    pub exponent: f64,
    pub factor: f64,
}

impl Power {
    pub fn value(self, x: f64) -> f64 {
        self.factor * raised(x, self.exponent)
    }

    /// The derivative.
    pub fn slope(self, x: f64) -> f64 {
        if self.exponent == 0.0 { 0.0 } else { self.factor * self.exponent * raised(x, self.exponent - 1.0) }
    }

    /// ∫ c xⁿ dx
    pub fn integral(self, x: f64) -> f64 {
        self.factor * integrated(x, self.exponent + 1.0)
    }

    /// ∫ c xⁿ/x dx
    pub fn integral_over_x(self, x: f64) -> f64 {
        self.factor * integrated(x, self.exponent)
    }
}

/// ∫ x^(n−1) dx
fn integrated(x: f64, n: f64) -> f64 {
    if n == 0.0 { math::ln(x) } else { raised(x, n) / n }
}

/// xⁿ; small whole and half powers without the logarithm.
pub fn raised(x: f64, n: f64) -> f64 {
    const MOST: f64 = 8.0;
    if n.abs() > MOST || (2.0 * n).fract() != 0.0 {
        return math::pow(x, n);
    }
    let size = n.abs();
    let mut product = if size.fract() == 0.0 { 1.0 } else { math::sqrt(x) };
    for _ in 0..size as u32 {
        product *= x;
    }
    if n < 0.0 { 1.0 / product } else { product }
}

#[cfg(test)]
mod tests {
    use super::*;

    const EXPONENTS: [f64; 11] = [-3.0, -2.0, -1.0, -0.5, 0.0, 0.5, 1.0, 1.7, 2.0, 3.0, 10.0];

    #[test]
    fn small_powers_agree_with_the_general_one() {
        for n in EXPONENTS {
            let (got, want) = (raised(1.7, n), math::pow(1.7, n));
            // Bound: one rounding per product, at most eight.
            assert!((got / want - 1.0).abs() < 1e-15, "{n}: {got} {want}");
        }
    }

    #[test]
    fn integrals_have_the_integrand_as_their_slope() {
        let (x, step) = (1.7, 1e-5);
        for exponent in EXPONENTS {
            let power = Power { exponent, factor: 2.5 };
            let central = |f: &dyn Fn(f64) -> f64| (f(x + step) - f(x - step)) / (2.0 * step);
            // Bound: step² times a third derivative below 1e5, and rounding over the step.
            let close = |got: f64, want: f64| assert!((got - want).abs() < 1e-7 * (1.0 + want.abs()), "{exponent}");
            close(central(&|x| power.integral(x)), power.value(x));
            close(central(&|x| power.integral_over_x(x)), power.value(x) / x);
            close(central(&|x| power.value(x)), power.slope(x));
        }
    }
}
