//! Dimensions, kinds, constants and the trade's units.

pub mod dimension;
pub mod kind;
pub mod unit;

pub use dimension::{Base, Dimension, Entity, Of};
pub use kind::{Kind, KindMismatch, State, What, Zero};
pub use unit::{Scale, Unit};
