//! Records of published tables and where they were printed; no formulas.
//!
//! Files of `stdlib/data/` say by their schema what they hold; each is parsed typed, at first use.

pub mod catalog;
pub mod checkup;
pub mod critical;
pub mod dataset;
pub mod doctor;
pub mod form;
pub mod formation;
pub mod function;
pub mod lookup;
pub mod molecule;
mod names;
pub mod near;
pub mod overlay;
pub mod own;
pub mod own_fault;
mod own_reader;
pub mod pressure;
pub mod records;
pub mod revision;
mod roughness;
pub mod substance;
mod tables;
pub mod transition;
pub mod tree;
