//! Thermodynamic functions of the ideal gas from the energy levels of one molecule: plain numerics, no records.
//!
//! A molecule's levels are sums of independent parts, and so are ln q and all that follows from it. Each part of a
//! [`gas::Gas`] answers with a [`Share`]; the crystal's oscillators are the same ones. The surprise: a wavenumber enters
//! as its temperature θ = hcν/k, so that no unit is left in any formula but kelvin.

pub mod debye;
pub mod diatomic;
pub mod gas;
pub mod hindered;
pub mod levels;
pub mod powers;
pub mod rotation;
pub mod translation;
pub mod vibration;

use std::ops::{Add, AddAssign, Mul};

/// What one part contributes at T, in units of R.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Share {
    /// Cv/R
    pub cv: f64,
    /// [U(T) − U of the lowest level]/(RT)
    pub u: f64,
    /// S/R
    pub s: f64,
    /// (T/R) dCv/dT
    pub bend: f64,
}

impl Add for Share {
    type Output = Share;

    fn add(self, other: Share) -> Share {
        Share { cv: self.cv + other.cv, u: self.u + other.u, s: self.s + other.s, bend: self.bend + other.bend }
    }
}

impl AddAssign for Share {
    fn add_assign(&mut self, other: Share) {
        *self = *self + other;
    }
}

/// A share `factor` times: a degenerate mode, or a weight in a mean.
impl Mul<Share> for f64 {
    type Output = Share;

    fn mul(self, share: Share) -> Share {
        Share { cv: self * share.cv, u: self * share.u, s: self * share.s, bend: self * share.bend }
    }
}

/// Derivatives of a share with respect to one parameter, per unit of it: kelvin for θ, kg/mol for a molar mass.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Change {
    pub cv: f64,
    pub u: f64,
    pub s: f64,
}

impl Mul<Change> for f64 {
    type Output = Change;

    fn mul(self, change: Change) -> Change {
        Change { cv: self * change.cv, u: self * change.u, s: self * change.s }
    }
}
