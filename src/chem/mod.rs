//! Elements, formulas, equations.

pub mod composition;
pub mod element;
