//! Plain numerics, with no nouns of the field.

pub mod math;
pub mod rational;
