//! What a cell gives, and what it may ask for while it runs.

use crate::fault::Fault;
use crate::render::Bundle;

pub use crate::script::host::Host;

/// What one cell gave.
#[derive(Debug)]
pub struct Outcome {
    /// The value of the last expression, unless the cell ends in `;` or the value is nothing.
    pub shown: Option<Bundle>,
    pub result: Result<(), Fault>,
}

/// Whether a text is a whole cell.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Completeness {
    Complete,
    Incomplete,
    Invalid,
    Unknown,
}
