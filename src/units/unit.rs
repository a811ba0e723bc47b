//! A unit: a factor to SI, a dimension, a name as written, and whether it names a point or an interval.

use std::sync::Arc;

use crate::units::dimension::Dimension;

/// 0 degC in kelvin (SI Brochure, 9th ed., section 2.3.1, from memory).
const ICE_POINT: f64 = 273.15;

/// How a unit's numbers are read.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Scale {
    /// value in SI = factor × number
    Plain,
    /// A temperature point: value in kelvin = (number - ice) / degrees + 273.15. Only degC and degF, and only standing
    /// alone. By way of the ice point, so that 25 degC and 77 degF are 298.15 K to the last bit.
    Point { ice: f64, degrees: f64 },
}

/// A unit as someone wrote it, or as the program chose to print it.
#[derive(Clone, Debug, PartialEq)]
pub struct Unit {
    /// SI value of one of these.
    pub factor: f64,
    pub dim: Dimension,
    pub scale: Scale,
    /// Machine text: `kJ/mol[rxn]`. Parses back to an equal unit.
    pub text: Arc<str>,
}

impl Unit {
    /// SI value of `number` of these.
    pub fn to_si(&self, number: f64) -> f64 {
        match self.scale {
            Scale::Plain => self.factor * number,
            Scale::Point { ice, degrees } => (number - ice) / degrees + ICE_POINT,
        }
    }

    /// How many of these an SI value is.
    pub fn from_si(&self, si: f64) -> f64 {
        match self.scale {
            Scale::Plain => si / self.factor,
            Scale::Point { ice, degrees } => (si - ICE_POINT) * degrees + ice,
        }
    }

    pub fn is_point(&self) -> bool {
        matches!(self.scale, Scale::Point { .. })
    }
}
