//! Plain numerics, with no nouns of the field.

pub mod cholesky;
pub mod edits;
pub mod lsq;
pub mod math;
pub mod oscillator;
pub mod pchip;
pub mod powers;
pub mod random;
pub mod rational;
pub mod root;
pub mod student;
