//! The only door to the elementary functions: crate libm, so that every machine computes the same bits.
//!
//! The standard library's own text says that its `exp`, `ln` and `powf` may differ by platform and version;
//! a sealed value must not. `sqrt`, `abs` and the rounding functions are exact by IEEE 754 and need no door.

pub fn exp(x: f64) -> f64 {
    libm::exp(x)
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
    fn the_angle_of_a_point_takes_the_ordinate_first() {
        assert_eq!(atan2(1.0, 0.0), std::f64::consts::FRAC_PI_2);
        assert_eq!(atan2(0.0, -1.0), std::f64::consts::PI);
    }
}
