//! Dimensions, kinds, constants and the trade's units.

pub mod dimension;
pub mod unit;

pub use dimension::{Base, Dimension, Entity, Of};
pub use unit::{Scale, Unit};
