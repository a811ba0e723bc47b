//! Records of published tables and where they were printed; no formulas.
//!
//! Files of `stdlib/data/` say by their schema what they hold; each is parsed typed, at first use.

pub mod dataset;
pub mod formation;
pub mod function;
mod names;
pub mod near;
mod tables;
pub mod transition;
