//! Pictures as SVG: one file for each kind. No fonts and no files are read, and one input gives the same bytes everywhere.

pub mod curve;
pub mod ladder;
