//! The only door to the elementary functions: crate libm, so that every machine computes the same bits.
//!
//! The standard library's own text says that its `exp`, `ln` and `powf` may differ by platform and version;
//! a sealed value must not. `sqrt`, `abs` and the rounding functions are exact by IEEE 754 and need no door.

pub fn exp(x: f64) -> f64 {
    libm::exp(x)
}

/// eˣ for x from −700 to 0 without a branch and without a call, so that a loop over many is turned into vector instructions:
/// x = k ln 2 + r, and the series of eʳ to r¹³, whose next term is below 1e-17. Within two units of the last place; below
/// −700 the value at −700, 1e-304, stands.
#[inline]
pub fn exp_of_negative(x: f64) -> f64 {
    // ln 2 in two parts, the first with zeros at its end, so that k times it is exact (Cody, Waite 1980; from memory).
    const LN_2: (f64, f64) = (6.931_471_803_691_238e-1, 1.908_214_929_270_587_7e-10);
    // Added to a number below 2⁵¹, 1.5 · 2⁵² leaves the nearest whole number in the last bits.
    const SHIFT: f64 = 6_755_399_441_055_744.0;
    const INVERSE_FACTORIALS: [f64; 13] = [
        1.0 / 479_001_600.0,
        1.0 / 39_916_800.0,
        1.0 / 3_628_800.0,
        1.0 / 362_880.0,
        1.0 / 40_320.0,
        1.0 / 5040.0,
        1.0 / 720.0,
        1.0 / 120.0,
        1.0 / 24.0,
        1.0 / 6.0,
        0.5,
        1.0,
        1.0,
    ];
    let x = if x < -700.0 { -700.0 } else { x };
    let shifted = x * std::f64::consts::LOG2_E + SHIFT;
    let k = shifted - SHIFT;
    let r = (x - k * LN_2.0) - k * LN_2.1;
    let mut series = 1.0 / 6_227_020_800.0;
    for term in INVERSE_FACTORIALS {
        series = series * r + term;
    }
    // 2ᵏ: the whole number in the last bits, moved into the exponent.
    series * f64::from_bits(shifted.to_bits().wrapping_add(1023) << 52)
}

pub fn expm1(x: f64) -> f64 {
    libm::expm1(x)
}

pub fn ln(x: f64) -> f64 {
    libm::log(x)
}

pub fn ln_1p(x: f64) -> f64 {
    libm::log1p(x)
}

pub fn log10(x: f64) -> f64 {
    libm::log10(x)
}

pub fn pow(x: f64, y: f64) -> f64 {
    libm::pow(x, y)
}

pub fn sin(x: f64) -> f64 {
    libm::sin(x)
}

pub fn cos(x: f64) -> f64 {
    libm::cos(x)
}

pub fn tan(x: f64) -> f64 {
    libm::tan(x)
}

pub fn asin(x: f64) -> f64 {
    libm::asin(x)
}

pub fn acos(x: f64) -> f64 {
    libm::acos(x)
}

pub fn atan(x: f64) -> f64 {
    libm::atan(x)
}

/// Angle of the point (x, y) from the x axis.
pub fn atan2(y: f64, x: f64) -> f64 {
    libm::atan2(y, x)
}

pub fn sinh(x: f64) -> f64 {
    libm::sinh(x)
}

pub fn cosh(x: f64) -> f64 {
    libm::cosh(x)
}

pub fn tanh(x: f64) -> f64 {
    libm::tanh(x)
}

pub fn asinh(x: f64) -> f64 {
    libm::asinh(x)
}

pub fn acosh(x: f64) -> f64 {
    libm::acosh(x)
}

pub fn atanh(x: f64) -> f64 {
    libm::atanh(x)
}

pub fn hypot(x: f64, y: f64) -> f64 {
    libm::hypot(x, y)
}

/// Logarithm to any base; 2 and 10 take the routines that are exact for their own powers.
pub fn log(x: f64, base: f64) -> f64 {
    if base == 10.0 {
        libm::log10(x)
    } else if base == 2.0 {
        libm::log2(x)
    } else {
        libm::log(x) / libm::log(base)
    }
}

/// 1 − erf(x), without the cancellation for large x.
pub fn erfc(x: f64) -> f64 {
    libm::erfc(x)
}

/// ln |Γ(x)|
pub fn ln_gamma(x: f64) -> f64 {
    libm::lgamma(x)
}

/// The square root is exact by IEEE 754, so the standard library's serves; it stands here so that a table of
/// functions can name it beside the others.
pub fn sqrt(x: f64) -> f64 {
    x.sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn logarithms_are_exact_for_powers_of_the_base_where_libm_has_a_routine() {
        assert_eq!(log(1e6, 10.0), 6.0);
        assert_eq!(log(8.0, 2.0), 3.0);
        // ln 81 / ln 3 = 4: two roundings and a division, so within three units of the last place.
        assert!((log(81.0, 3.0) - 4.0).abs() <= 3.0 * 4.0 * f64::EPSILON);
    }

    #[test]
    fn the_fast_exponential_is_within_two_units_of_the_last_place() {
        let steps = 200_000;
        for nth in 0..=steps {
            let x = -700.0 * f64::from(nth) / f64::from(steps);
            let (fast, exact) = (exp_of_negative(x), exp(x));
            assert!((fast / exact - 1.0).abs() <= 2.0 * f64::EPSILON, "{x}: {fast} {exact}");
        }
        assert_eq!(exp_of_negative(0.0), 1.0);
        assert!(exp_of_negative(-1e4) < 1e-300);
    }

    #[test]
    fn the_angle_of_a_point_takes_the_ordinate_first() {
        assert_eq!(atan2(1.0, 0.0), std::f64::consts::FRAC_PI_2);
        assert_eq!(atan2(0.0, -1.0), std::f64::consts::PI);
    }
}
