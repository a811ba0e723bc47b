//! Elements, formulas, species, equations.
//!
//! Reading order: `element`, `composition`, `formula`, `species`, then `equation_text` (the text alone), `balance` (whole
//! numbers by elimination) and `equation`. No records are known here: who reads an equation says what a name means.

pub mod balance;
pub mod composition;
pub mod element;
pub mod equation;
pub mod equation_text;
pub mod formula;
mod formula_reader;
pub mod species;
