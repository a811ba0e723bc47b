//! hessbook: a notebook engine for thermochemistry.

pub mod chem;
pub mod cli;
pub mod data;
pub mod fault;
pub mod kernel;
pub mod model;
pub mod notebook;
pub mod num;
pub mod quantity;
pub mod record;
pub mod render;
pub mod script;
pub mod session;
pub mod source;
pub mod units;
