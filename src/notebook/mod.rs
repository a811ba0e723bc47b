//! Notebook files: read leniently, run in order, written strictly.

pub mod file;
pub mod run;
