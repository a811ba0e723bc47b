//! Elements, formulas, equations.

pub mod balance;
pub mod composition;
pub mod element;
pub mod equation_text;
pub mod formula;
mod formula_reader;
pub mod species;
