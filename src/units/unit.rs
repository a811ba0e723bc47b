//! A unit: a factor to SI, a dimension, a name as written, and whether it names a point or an interval.

use std::sync::Arc;

use crate::units::dimension::Dimension;

/// How a unit's numbers are read.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Scale {
    /// value in SI = factor × number
    Plain,
    /// A temperature point: value in kelvin = factor × (number + offset). Only degC and degF, and only standing alone.
    Point { offset: f64 },
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
            Scale::Point { offset } => self.factor * (number + offset),
        }
    }

    /// How many of these an SI value is.
    pub fn from_si(&self, si: f64) -> f64 {
        match self.scale {
            Scale::Plain => si / self.factor,
            Scale::Point { offset } => si / self.factor - offset,
        }
    }

    pub fn is_point(&self) -> bool {
        matches!(self.scale, Scale::Point { .. })
    }
}
