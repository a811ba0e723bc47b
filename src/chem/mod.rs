//! Elements, formulas, equations.
