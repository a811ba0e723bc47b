//! hessbook: a notebook engine for thermochemistry.

pub mod chem;
pub mod cli;
pub mod fault;
pub mod kernel;
pub mod num;
pub mod render;
pub mod script;
pub mod session;
pub mod source;
pub mod units;
