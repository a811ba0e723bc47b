//! Dimensions, kinds, constants and the trade's units.

pub mod constants;
pub mod dimension;
mod entity_name;
mod exponent;
pub mod kind;
mod near_miss;
pub mod parse;
pub mod preferred;
mod reader;
pub mod refused;
pub mod table;
mod terms;
pub mod unit;
mod unit_error;

pub use dimension::{Base, Dimension, Entity, Of};
pub use entity_name::entity;
pub use kind::{Kind, KindMismatch, State, What, Zero};
pub use preferred::unit_for;
pub use reader::{basis_words, reader_html, reader_latex, reader_text};
pub use unit::{Scale, Unit};
pub use unit_error::UnitError;
