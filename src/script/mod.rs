//! The script language of cells: what must be known before the engine reads a text, and how it reaches its host.

pub mod host;
pub mod memory;
pub mod prepare;
pub mod token;
