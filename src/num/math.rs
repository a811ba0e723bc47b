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
